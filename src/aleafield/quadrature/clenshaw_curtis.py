"""The Clenshaw-Curtis rule at the Chebyshev extremal points."""

from __future__ import annotations

import numpy as np
from scipy.fft import dct

from aleafield.arrays import FloatArray
from aleafield.geometry import Interval
from aleafield.quadrature.rule import Rule


def extremal_points(interval: Interval, n: int) -> FloatArray:
    """The n >= 2 extrema of the Chebyshev polynomial of degree n - 1, ascending, both ends exact; shape (n,).

    Written with a sine of symmetric arguments, so that the points are symmetric about the middle to rounding
    and those of n are every second one of those of 2n - 1.
    """
    j = np.arange(n)
    reference = np.sin(np.pi * (2 * j - (n - 1)) / (2 * (n - 1)))
    points = 0.5 * (interval.low + interval.high) + 0.5 * interval.length * reference
    points[0], points[-1] = interval.low, interval.high
    return points


def clenshaw_curtis(interval: Interval, n: int) -> Rule:
    """Integral of the interpolant at n extremal points; the weights come from one cosine transform.

    Exact for polynomials of degree n - 1, and of degree n where n is odd (odd powers about the middle
    vanish).

    References
    ----------
    Clenshaw and Curtis 1960, "A method for numerical integration on an automatic computer"; weights by a
    transform: Waldvogel 2006, "Fast construction of the Fejer and Clenshaw-Curtis quadrature rules" (both
    from memory).
    """
    degree = np.arange(n)
    moments = np.zeros(n)
    moments[::2] = 2.0 / (1.0 - degree[::2] ** 2.0)
    weights = np.asarray(dct(moments, type=1), dtype=np.float64) / (n - 1)
    weights[[0, -1]] *= 0.5
    weights *= 0.5 * interval.length
    return Rule("clenshaw-curtis", extremal_points(interval, n), weights, None)
