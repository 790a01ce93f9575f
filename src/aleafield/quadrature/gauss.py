"""The Gauss-Legendre rule on a whole interval."""

from __future__ import annotations

from numpy.polynomial.legendre import leggauss

from aleafield.geometry import Interval
from aleafield.quadrature.rule import Rule


def gauss_legendre(interval: Interval, n: int) -> Rule:
    """n Gauss points, ascending: exact for polynomials of degree 2n - 1.

    Faster than any power for analytic functions.

    References
    ----------
    Davis and Rabinowitz 1984, "Methods of Numerical Integration" (from memory).
    """
    reference, reference_weights = leggauss(n)
    half = 0.5 * interval.length
    middle = 0.5 * (interval.low + interval.high)
    return Rule("gauss-legendre", middle + half * reference, half * reference_weights, None)
