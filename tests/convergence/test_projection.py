"""How fast interpolants and projections approach a function, against what is proven.

Sources (from memory): remainder of linear interpolation, any text; Trefethen 2013, "Approximation theory and
approximation practice", theorems 7.2 and 8.2 (Chebyshev interpolants of functions of limited regularity and
of analytic functions); Trefethen and Weideman 2014, "The exponentially convergent trapezoidal rule" (on
aliasing).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from itertools import pairwise

import numpy as np
import pytest
from numpy.polynomial.legendre import leggauss

from aleafield.arrays import FloatArray
from aleafield.geometry import Domain, Interval, Ring
from aleafield.spaces import Space, make_space
from tests.convergence.rates import observed_orders

Function = Callable[[FloatArray], FloatArray]

REFERENCE = Interval(-1.0, 1.0)
CIRCLE = Ring(2 * math.pi)


def fine(domain: Domain) -> FloatArray:
    """Points at which sup norms are taken, no grid of any space."""
    return np.linspace(domain.low, domain.high, 20_011)


def sup_error(space: Space, function: Function) -> float:
    """Largest distance of the interpolant at the nodes."""
    u = space.coefficients(function(space.nodes)[None, :])
    x = fine(space.domain)
    return float(np.abs(space.evaluate(u, x)[0] - function(x)).max())


def composite(domain: Domain, pieces: int, per_piece: int) -> tuple[FloatArray, FloatArray]:
    """Gauss points and weights on each of equal pieces, from numpy."""
    t, w = leggauss(per_piece)
    ends = np.linspace(domain.low, domain.high, pieces + 1)
    half = 0.5 * domain.length / pieces
    return (ends[:-1, None] + half * (1.0 + t)).ravel(), np.tile(half * w, pieces)


def orthogonal_projection_error(space: Space, function: Function, pieces: int, per_piece: int = 12) -> float:
    """L2 norm of the distance of the orthogonal projection, inner products by a much finer rule."""
    x, w = composite(space.domain, pieces, per_piece)
    basis = space.evaluation_matrix(x)
    mass = basis.T @ (w[:, None] * basis)
    u = np.linalg.solve(mass, basis.T @ (w * function(x)))
    return math.sqrt(float(np.sum(w * (basis @ u - function(x)) ** 2)))


def wave(x: FloatArray) -> FloatArray:
    """exp(sin x), analytic and of period 2 pi."""
    return np.exp(np.sin(x))


def curvature_of_wave(x: FloatArray) -> FloatArray:
    """Second derivative of `wave`."""
    return (np.cos(x) ** 2 - np.sin(x)) * np.exp(np.sin(x))


@pytest.mark.parametrize(
    ("domain", "counts"), [(Interval(-1.0, 2.5), [9, 17, 33, 65, 129]), (CIRCLE, [8, 16, 32, 64, 128])]
)
def test_piecewise_linear_interpolation_is_of_order_two(domain: Domain, counts: list[int]) -> None:
    spaces = [make_space("piecewise linear", domain, n) for n in counts]
    sizes = [domain.length / (n if domain.periodic else n - 1) for n in counts]
    errors = [sup_error(space, wave) for space in spaces]
    orders = observed_orders(errors, sizes)
    assert all(1.9 <= p <= 2.1 for p in orders[1:]), orders
    remainder = sizes[-1] ** 2 / 8 * np.abs(curvature_of_wave(fine(domain))).max()
    assert 0.97 * remainder <= errors[-1] <= remainder


@pytest.mark.parametrize(
    ("domain", "counts"), [(Interval(-1.0, 2.5), [9, 17, 33, 65]), (CIRCLE, [8, 16, 32, 64])]
)
def test_piecewise_linear_projection_is_of_order_two(domain: Domain, counts: list[int]) -> None:
    """The leading error is h^2 u''/2 times the second Bernoulli polynomial, of norm 1/sqrt(180)."""
    sizes = [domain.length / (n if domain.periodic else n - 1) for n in counts]
    pieces = [n if domain.periodic else n - 1 for n in counts]
    errors = [
        orthogonal_projection_error(make_space("piecewise linear", domain, n), wave, m)
        for n, m in zip(counts, pieces, strict=True)
    ]
    orders = observed_orders(errors, sizes)
    assert all(1.9 <= p <= 2.1 for p in orders[1:]), orders
    x, w = composite(domain, 64, 12)
    leading = sizes[-1] ** 2 * math.sqrt(float(np.sum(w * curvature_of_wave(x) ** 2)) / 720)
    assert errors[-1] == pytest.approx(leading, rel=0.02)


def bell(x: FloatArray) -> FloatArray:
    """1 / (1 + 4 x^2), analytic inside the ellipse through its poles -+ i/2, of parameter (1 + sqrt 5)/2."""
    return 1.0 / (1.0 + 4.0 * x * x)


def cubic_corner(x: FloatArray) -> FloatArray:
    """|x|^3, whose third derivative jumps by 12."""
    return np.abs(x) ** 3


def poisson(x: FloatArray) -> FloatArray:
    """Poisson kernel: Fourier coefficients 2^-|k|."""
    return 0.75 / (1.25 - np.cos(x))


def periodic_corner(x: FloatArray) -> FloatArray:
    """|sin(x/2)|^3, whose third derivative jumps at 0."""
    return np.abs(np.sin(0.5 * x)) ** 3


def assert_faster_than_any_power(errors: list[float], counts: list[int]) -> None:
    """The observed order about doubles with the count, as that of rho^-n does."""
    orders = observed_orders(errors, [1.0 / n for n in counts])
    assert all(later > 1.8 * earlier for earlier, later in pairwise(orders)), orders


def rate(errors: list[float], degrees: list[float]) -> float:
    """ln rho of the last two levels, for errors like rho^-degree."""
    return math.log(errors[-2] / errors[-1]) / (degrees[-1] - degrees[-2])


RHO = 0.5 * (1.0 + math.sqrt(5.0))


def test_chebyshev_interpolation_of_an_analytic_function() -> None:
    counts = [9, 17, 33, 65]
    errors = [sup_error(make_space("chebyshev", REFERENCE, n), bell) for n in counts]
    assert_faster_than_any_power(errors, counts)
    assert rate(errors, [float(n) for n in counts]) == pytest.approx(math.log(RHO), rel=0.02)
    # theorem 8.2 on a smaller ellipse, where the function is at most its value at the top
    smaller = 1.5
    height = 0.5 * (smaller - 1.0 / smaller)
    largest = 1.0 / (1.0 - 4.0 * height**2)
    for n, error in zip(counts, errors, strict=True):
        assert error <= 4.0 * largest * smaller ** (1 - n) / (smaller - 1.0)


def test_chebyshev_interpolation_of_a_function_with_a_jump_in_the_third_derivative() -> None:
    counts = [9, 17, 33, 65, 129, 257]
    errors = [sup_error(make_space("chebyshev", REFERENCE, n), cubic_corner) for n in counts]
    orders = observed_orders(errors, [1.0 / (n - 1) for n in counts])
    assert all(2.95 <= p <= 3.05 for p in orders), orders
    for n, error in zip(counts, errors, strict=True):
        assert error <= 4.0 * 12.0 / (math.pi * 3.0 * (n - 1 - 3) ** 3), "theorem 7.2, variation 12"


def test_legendre_projection_of_an_analytic_function() -> None:
    counts = [8, 16, 32, 64]
    errors = [orthogonal_projection_error(make_space("legendre", REFERENCE, n), bell, 2, 200) for n in counts]
    assert_faster_than_any_power(errors, counts)
    assert rate(errors, [float(n) for n in counts]) == pytest.approx(math.log(RHO), rel=0.02)


def test_legendre_projection_of_a_function_with_a_jump_in_the_third_derivative() -> None:
    """Orthonormal coefficients fall like k^-4, the square root of the sum of their squares like n^-3.5."""
    counts = [8, 16, 32, 64, 128]
    errors = [
        orthogonal_projection_error(make_space("legendre", REFERENCE, n), cubic_corner, 2, 200)
        for n in counts
    ]
    orders = observed_orders(errors, [1.0 / n for n in counts])
    assert all(3.45 <= p <= 3.55 for p in orders[2:]), orders


def test_fourier_interpolation_of_an_analytic_function() -> None:
    counts = [8, 16, 32, 64]
    errors = [sup_error(make_space("fourier", CIRCLE, n), poisson) for n in counts]
    assert_faster_than_any_power(errors, counts)
    assert rate(errors, [0.5 * n for n in counts]) == pytest.approx(math.log(2.0), rel=0.02)
    for n, error in zip(counts, errors, strict=True):
        assert error <= 2.0 * 2.0 * 0.5 ** (n / 2) / (1.0 - 0.5), "twice the coefficients from n/2 on"


def test_fourier_interpolation_of_a_function_with_a_jump_in_the_third_derivative() -> None:
    counts = [8, 16, 32, 64, 128, 256]
    errors = [sup_error(make_space("fourier", CIRCLE, n), periodic_corner) for n in counts]
    orders = observed_orders(errors, [1.0 / n for n in counts])
    assert all(2.95 <= p <= 3.05 for p in orders), orders
    assert errors[-1] < 1e-7


def test_orders_use_the_true_ratio_of_two_levels() -> None:
    """Errors that are exactly h^2 on 33 and 65 points, 32 and 64 panels apart or counted as points."""
    panels = [32, 64]
    errors = [1.0 / m**2 for m in panels]
    assert observed_orders(errors, [1.0 / m for m in panels]) == pytest.approx([2.0], rel=1e-14)
    counted = observed_orders(errors, [1.0 / (m + 1) for m in panels])
    assert counted == pytest.approx([2.0 * math.log(2.0) / math.log(65.0 / 33.0)], rel=1e-14)
    with pytest.raises(ValueError, match="2 errors for 3 sizes"):
        observed_orders(errors, [1.0, 0.5, 0.25])
    with pytest.raises(ValueError, match="positive"):
        observed_orders([1.0, 0.0], [1.0, 0.5])
