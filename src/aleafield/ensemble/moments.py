"""Running sums of fields, independent of how samples are cut into chunks up to far below rounding."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import BoolArray, FloatArray
from aleafield.ensemble.pairs import Pair, pair_product, pair_quotient, pair_square, pair_sum, sum_of, two_sum


@dataclass
class FieldMoments:
    """Sums of u - r and (u - r)^2 over samples, r one of them.

    About a field of the ensemble, not about 0: a spread far below the field itself is then as exact as any
    other, and equal fields have the spread 0.

    Attributes
    ----------
    count : int
        Samples that did not fail.
    reference : float array (K, n)
        r, the first of them; 0 without any.
    first, second : pairs of float arrays (K, n)
        The sums, each as a pair (high, low).
    """

    count: int
    reference: FloatArray
    first: Pair
    second: Pair

    @staticmethod
    def of(fields: FloatArray, valid: BoolArray) -> FieldMoments:
        """Moments of the valid rows of fields (S, K, n), time by time so that the work stays in cache."""
        count = int(valid.sum())
        shape = fields.shape[1:]
        if count == 0:
            zeros = np.zeros((5, *shape))
            return FieldMoments(0, zeros[0], (zeros[1], zeros[2]), (zeros[3], zeros[4]))
        reference = np.array(fields[valid.argmax()])
        sums = np.empty((4, *shape))
        with np.errstate(all="ignore"):  # the square of a huge finite field is infinite
            for k in range(shape[0]):
                kept = np.where(valid[:, None], fields[:, k], reference[k])
                difference = two_sum(kept, np.broadcast_to(-reference[k], kept.shape))
                sums[0, k], sums[1, k] = sum_of(difference)
                sums[2, k], sums[3, k] = sum_of(pair_square(difference))
        return FieldMoments(count, reference, (sums[0], sums[1]), (sums[2], sums[3]))

    def __add__(self, other: FieldMoments) -> FieldMoments:
        """The moments of these samples and of those that follow, about the reference of these."""
        if self.count == 0:
            return other
        if other.count == 0:
            return self
        with np.errstate(all="ignore"):
            moved = other.about(self.reference)
            return FieldMoments(
                self.count + other.count,
                self.reference,
                pair_sum(self.first, moved.first),
                pair_sum(self.second, moved.second),
            )

    def about(self, reference: FloatArray) -> FieldMoments:
        """The same moments about another field (K, n).

        With d = r - reference: sum (u - reference) = sum (u - r) + n d, and
        sum (u - reference)^2 = sum (u - r)^2 + d (2 sum (u - r) + n d).
        """
        apart = two_sum(self.reference, -reference)
        by = pair_product(apart, _constant(self.count, apart[0]))
        twice = (2.0 * self.first[0], 2.0 * self.first[1])
        return FieldMoments(
            self.count,
            reference,
            pair_sum(self.first, by),
            pair_sum(self.second, pair_product(apart, pair_sum(twice, by))),
        )

    @property
    def mean(self) -> FloatArray:
        """Mean field (K, n); NaN without samples."""
        if self.count == 0:
            return np.full_like(self.reference, np.nan)
        with np.errstate(all="ignore"):
            mean = pair_sum((self.reference, np.zeros_like(self.reference)), self._mean_difference)
        return mean[0]

    @property
    def sd(self) -> FloatArray:
        """Standard deviation with divisor count - 1, (K, n); 0 for one sample."""
        if self.count < 2:
            return np.zeros_like(self.reference)
        with np.errstate(all="ignore"):
            high, low = pair_product(self.first, self._mean_difference)
            square = pair_sum(self.second, (-high, -low))[0]
            return np.sqrt(np.maximum(square, 0.0) / (self.count - 1))

    @property
    def _mean_difference(self) -> Pair:
        return pair_quotient(self.first, self.count)


def _constant(value: int, like: FloatArray) -> Pair:
    return np.full_like(like, value), np.zeros_like(like)
