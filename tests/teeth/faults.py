"""Faults that more than one kind of evidence must see."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.field.kernels import ExponentialKernel, GaussianKernel
from aleafield.geometry import Interval, Ring


def not_periodised(kernel: type[GaussianKernel | ExponentialKernel]) -> Callable[..., FloatArray]:
    """The shortest distance in place of the sum over all images."""
    real = kernel.matrix

    def matrix(self: Any, x: FloatArray, y: FloatArray, domain: Interval | Ring) -> FloatArray:
        if not isinstance(domain, Ring):
            return real(self, x, y, domain)
        return real(self, domain.distance(x, y), np.zeros_like(x + y), Interval(-1.0, 1.0))

    return matrix


def doubled_symbol(real: Callable[..., Any]) -> Callable[..., Any]:
    """Twice the symbol of the waves, as where the two halves of a real transform are both counted."""

    def symbol(self: Any, k: Any, length: float) -> FloatArray:
        return np.asarray(real(self, k, length) * np.where(k > 0, 2.0, 1.0))

    return symbol


def width_decides(batch: FloatArray, matrix: FloatArray) -> FloatArray:
    """One product of all rows, whose order of summation follows their number, as in a BLAS library."""
    if len(batch) % 16:
        return np.asarray(batch[:, ::-1] @ matrix[::-1])
    return np.asarray(batch @ matrix)


def place_decides(batch: FloatArray, matrix: FloatArray) -> FloatArray:
    """The second half of the rows is summed in the other order."""
    half = len(batch) // 2
    return np.concatenate([batch[:half] @ matrix, batch[half:, ::-1] @ matrix[::-1]])


def nodal_sampling(values: FloatArray, threshold: Any, spacing: float, periodic: bool) -> FloatArray:
    """A point counts whole where it is above the threshold: order 1, and bumps pinned to the points."""
    weights = np.where(values > np.reshape(threshold, (-1, 1)), spacing, 0.0)
    if not periodic:
        weights[:, [0, -1]] *= 0.5
    return weights


def wrong_weight(
    system: Any, times: tuple[float, float, float], u: FloatArray, slope: FloatArray, _: Any
) -> FloatArray:
    """The four stages of the classical method with weights 1, 1, 3, 1: consistent, but of a lower order."""
    start, middle, end = times
    length = end - start
    second = system.rate_of_change(middle, u + 0.5 * length * slope, middle)
    third = system.rate_of_change(middle, u + 0.5 * length * second, middle)
    fourth = system.rate_of_change(end, u + length * third, middle)
    return np.asarray(u + length / 6.0 * (slope + second + 3.0 * third + fourth))
