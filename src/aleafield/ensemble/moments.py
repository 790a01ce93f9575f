"""Running sums of fields, independent of how samples are cut into chunks up to far below rounding."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import BoolArray, FloatArray


def two_sum(a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Sum and its rounding error, exactly (Knuth 1969, The Art of Computer Programming 2, section 4.2.2)."""
    total = a + b
    part = total - a
    return total, (a - (total - part)) + (b - part)


def accurate_sum(values: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Sum over the first axis as an unevaluated pair (high, low), by a tree of exact two-sums."""
    high = values
    low = np.zeros_like(values)
    while len(high) > 1:
        if len(high) % 2:
            pad = np.zeros((1, *high.shape[1:]))
            high, low = np.concatenate([high, pad]), np.concatenate([low, pad])
        total, error = two_sum(high[0::2], high[1::2])
        low = low[0::2] + low[1::2] + error
        high = total
    return two_sum(high[0], low[0])


@dataclass
class FieldMoments:
    """Sums of u and u^2 over samples, each as a pair (high, low) of shape (K, n), and the count of samples."""

    count: int
    first: tuple[FloatArray, FloatArray]
    second: tuple[FloatArray, FloatArray]

    @staticmethod
    def of(fields: FloatArray, valid: BoolArray) -> FieldMoments:
        """Moments of the valid rows of fields (S, K, n), time by time so that the work stays in cache."""
        sums = np.empty((4, *fields.shape[1:]))
        with np.errstate(all="ignore"):  # the square of a huge finite field is infinite
            for k in range(fields.shape[1]):
                kept = np.where(valid[:, None], fields[:, k], 0.0)
                sums[0, k], sums[1, k] = accurate_sum(kept)
                sums[2, k], sums[3, k] = accurate_sum(kept**2)
        return FieldMoments(int(valid.sum()), (sums[0], sums[1]), (sums[2], sums[3]))

    def __add__(self, other: FieldMoments) -> FieldMoments:
        return FieldMoments(
            self.count + other.count,
            _pair_sum(self.first, other.first),
            _pair_sum(self.second, other.second),
        )

    @property
    def mean(self) -> FloatArray:
        """Mean field (K, n); NaN without samples."""
        if self.count == 0:
            return np.full_like(self.first[0], np.nan)
        return (self.first[0] + self.first[1]) / self.count

    @property
    def sd(self) -> FloatArray:
        """Standard deviation with divisor count - 1, (K, n); 0 for one sample."""
        if self.count < 2:
            return np.zeros_like(self.first[0])
        high, low = self.first
        square = (self.second[0] - high * (high / self.count)) + (
            self.second[1] - 2 * low * (high / self.count)
        )
        return np.sqrt(np.maximum(square, 0.0) / (self.count - 1))


def _pair_sum(
    a: tuple[FloatArray, FloatArray], b: tuple[FloatArray, FloatArray]
) -> tuple[FloatArray, FloatArray]:
    total, error = two_sum(a[0], b[0])
    return two_sum(total, error + a[1] + b[1])
