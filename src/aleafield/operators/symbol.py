"""The exact Fourier symbol of a kernel on a ring."""

from __future__ import annotations

from typing import ClassVar

import numpy as np
import scipy.fft

from aleafield.arrays import FloatArray
from aleafield.operators.operator import KernelOperator, transform_rounding


class SymbolOperator(KernelOperator):
    """Multiplies the modes of the source by the kernel's exact Fourier coefficients.

    Sources stand at j length / q, values are wanted at i length / n.  Only f(u) is sampled: a kink of the
    kernel costs nothing, and no image is left out.  The last mode of an even q is a cosine.

    Parameters
    ----------
    symbol : float array (q // 2 + 1,) or (S, q // 2 + 1)
        Integral of w(z) cos(2 pi k z / length) for k = 0 .. q // 2, in units of activity.
    length : float
        Of the ring.
    q, n : int
        Numbers of source and of test points.
    truncated : bool
        Galerkin: keep the n modes of the space only (for even n the last one as a cosine).  Otherwise
        (collocation) all q modes are sampled at the test points.
    """

    name: ClassVar[str] = "exact symbol"

    def __init__(self, symbol: FloatArray, length: float, q: int, n: int, truncated: bool) -> None:
        self._q, self._stride, self._points = q, *_sampling(q, n, truncated)
        self._modes = min(q // 2, n // 2 if truncated else self._points // 2) + 1
        factor = np.full(self._modes, self._points / length)
        last = self._modes - 1
        if 2 * last == q and self._points > q:
            factor[last] *= 0.5  # the cosine of an even q is shared between +q/2 and -q/2 on the finer grid
        if 2 * last == self._points and q > self._points:
            factor[last] *= 2.0  # both modes +n/2 and -n/2 fall on the cosine of an even n
        self._factor = symbol[..., : self._modes] * factor

    @staticmethod
    def rounding(points: int) -> float:
        """Two transforms and exact coefficients are within the bound for three transforms."""
        return transform_rounding(points)

    def apply(self, source: FloatArray) -> FloatArray:
        """Transform, multiply, transform back, sample."""
        spectrum = scipy.fft.rfft(source, axis=-1)[:, : self._modes]
        spectrum *= self._factor
        values = np.asarray(scipy.fft.irfft(spectrum, self._points, axis=-1))
        return values if self._stride == 1 else values[:, :: self._stride]


def _sampling(q: int, n: int, truncated: bool) -> tuple[int, int]:
    """Stride and number of points of the inverse transform that gives values at n points."""
    stride = 1 if truncated or q <= n else -(-q // n)
    return stride, stride * n


def sampling_length(q: int, n: int, truncated: bool) -> int:
    """Number of points of the inverse transform of `SymbolOperator`."""
    return _sampling(q, n, truncated)[1]
