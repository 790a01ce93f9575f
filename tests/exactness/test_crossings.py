"""Integrals over the set above a threshold.

Oracles: closed integrals between known crossings, and scipy's adaptive quadrature.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from aleafield.arrays import FloatArray
from aleafield.geometry import Interval, Ring
from aleafield.quadrature import active_moments, crossing_weights, make_rule
from tests.convergence.rates import observed_orders

EPS = float(np.finfo(np.float64).eps)
INTERVAL = Interval(-1.5, 2.0)
RING = Ring(3.0)
THRESHOLD = 0.25
CROSSINGS = np.array([-1.5, -1.31, -0.4, 0.123, 0.5, 1.7, 2.0, 2.6, -2.2])
"""Where a straight line passes the threshold; some on a node, at an end or outside."""


def lines(rule_points: FloatArray, slope: float) -> FloatArray:
    """One straight line for each crossing."""
    return np.asarray(THRESHOLD + slope * (rule_points[None, :] - CROSSINGS[:, None]))


def active_part(slope: float) -> tuple[FloatArray, FloatArray]:
    """Ends of the part of the interval where the line lies above the threshold."""
    at = np.clip(CROSSINGS, INTERVAL.low, INTERVAL.high)
    if slope > 0.0:
        return at, np.full_like(at, INTERVAL.high)
    return np.full_like(at, INTERVAL.low), at


@pytest.mark.parametrize("slope", [1.0, -0.7, 30.0])
@pytest.mark.parametrize("n", [2, 3, 8, 33])
def test_exact_for_a_linear_function_under_a_linear_kernel(slope: float, n: int) -> None:
    rule = make_rule("trapezoid", INTERVAL, n)
    assert rule.spacing is not None
    weights = crossing_weights(lines(rule.points, slope), THRESHOLD, rule.spacing, periodic=False)
    low, high = active_part(slope)
    tolerance = 16 * EPS * n * INTERVAL.length
    np.testing.assert_allclose(weights.sum(axis=-1), high - low, rtol=0.0, atol=tolerance)
    kernel = 0.3 - 2.0 * rule.points
    exact = 0.3 * (high - low) - (high**2 - low**2)
    np.testing.assert_allclose((weights * kernel).sum(axis=-1), exact, rtol=0.0, atol=4 * tolerance)


def test_weights_of_single_segments_as_published_in_the_study_file() -> None:
    """Fraction s of the crossing: left part s - s^2/2 and s^2/2, right part (1-s)^2/2 and (1-s^2)/2."""
    s = 0.3
    falling, rising = [s, s - 1.0], [-s, 1.0 - s]
    rows = np.array([falling, rising, [1.0, 2.0], [-1.0, -2.0], [0.0, 0.0], [0.0, 1.0]])
    expected = [
        [s - s * s / 2, s * s / 2],
        [(1 - s) ** 2 / 2, (1 - s * s) / 2],
        [0.5, 0.5],
        [0.0, 0.0],
        [0.0, 0.0],  # equal to the threshold is inactive
        [0.5, 0.5],
    ]
    weights = crossing_weights(rows, 0.0, 1.0, periodic=False)
    np.testing.assert_allclose(weights, expected, rtol=0.0, atol=4 * EPS)


def test_threshold_may_differ_from_sample_to_sample() -> None:
    rule = make_rule("trapezoid", RING, 24)
    assert rule.spacing is not None
    values = np.tile(np.cos(2 * np.pi * rule.points / RING.length), (3, 1))
    thresholds = np.array([-0.5, 0.1, 0.8])
    together = crossing_weights(values, thresholds, rule.spacing, periodic=True)
    for row, threshold in zip(together, thresholds.tolist(), strict=True):
        alone = crossing_weights(values[:1], threshold, rule.spacing, periodic=True)[0]
        assert np.array_equal(row, alone)


def kernel(y: FloatArray) -> FloatArray:
    """A smooth periodic kernel seen from one target point."""
    return np.exp(np.cos(2 * np.pi * (y - 0.4) / RING.length))


LEVELS = [64, 256, 1024]


def test_order_two_for_a_smooth_function_on_a_ring() -> None:
    """cos > 1/2 on |x| < length/6: for powers of four the crossing lies 2/3 of the way between two points,
    so that s (1 - s), the factor of the leading error, is the same on every level."""
    exact = quad(lambda y: float(kernel(np.array(y))), -RING.length / 6, RING.length / 6, epsabs=1e-14)[0]
    errors = []
    for n in LEVELS:
        rule = make_rule("trapezoid", RING, n)
        assert rule.spacing is not None
        values = np.cos(2 * np.pi * rule.points / RING.length)[None, :]
        weights = crossing_weights(values, 0.5, rule.spacing, periodic=True)
        errors.append(abs(float((weights * kernel(rule.points)).sum()) - exact))
    orders = observed_orders(errors, [1.0 / n for n in LEVELS])
    assert all(1.95 <= p <= 2.05 for p in orders), orders
    assert errors[-1] < 1e-5


WAVENUMBERS = np.array([0.0, 0.7, 2.0, 5.0])


@pytest.mark.parametrize("slope", [1.0, -0.7])
def test_moments_are_closed_between_the_crossings(slope: float) -> None:
    """The crossings of a straight line are exact, hence the moments are."""
    rule = make_rule("trapezoid", INTERVAL, 8)
    assert rule.spacing is not None
    cosine, sine = active_moments(
        lines(rule.points, slope), rule.points, THRESHOLD, rule.spacing, INTERVAL, WAVENUMBERS
    )
    low, high = active_part(slope)
    assert np.allclose(cosine[:, 0], high - low, rtol=0.0, atol=1e-13)
    assert np.all(sine[:, 0] == 0.0)
    for k, kappa in enumerate(WAVENUMBERS[1:], start=1):
        exact_cosine = (np.sin(kappa * high) - np.sin(kappa * low)) / kappa
        exact_sine = (np.cos(kappa * low) - np.cos(kappa * high)) / kappa
        np.testing.assert_allclose(cosine[:, k], exact_cosine, rtol=0.0, atol=1e-13)
        np.testing.assert_allclose(sine[:, k], exact_sine, rtol=0.0, atol=1e-13)


@pytest.mark.parametrize("centre", [0.0, 1.1, -1.45])
def test_moments_on_a_ring_converge_at_order_two_wherever_the_active_set_lies(centre: float) -> None:
    """Active set |x - centre| < length/6; the last centre puts it across the cut of the ring.

    The integral of cos(kappa y) over |y - c| < d is 2 sin(kappa d) cos(kappa c) / kappa, and likewise sin.
    """
    kappa = 2 * np.pi * np.array([1.0, 2.0]) / RING.length
    reach = 2 * np.sin(kappa * RING.length / 6) / kappa
    errors = []
    for n in LEVELS:
        rule = make_rule("trapezoid", RING, n)
        assert rule.spacing is not None
        shift = np.round(centre / rule.spacing) * rule.spacing  # on a node: the same fractions on all levels
        values = np.cos(2 * np.pi * (rule.points - shift) / RING.length)[None, :]
        cosine, sine = active_moments(values, rule.points, 0.5, rule.spacing, RING, kappa)
        error = cosine[0] + 1j * sine[0] - reach * np.exp(1j * kappa * shift)
        errors.append(float(np.linalg.norm(error)))
    assert errors[-1] < 1e-5
    orders = observed_orders(errors, [1.0 / n for n in LEVELS])
    assert all(1.95 <= p <= 2.05 for p in orders), orders


def test_a_ring_that_is_wholly_active_has_moments_of_the_length() -> None:
    rule = make_rule("trapezoid", RING, 12)
    assert rule.spacing is not None
    kappa = 2 * np.pi * np.array([0.0, 1.0]) / RING.length
    cosine, sine = active_moments(np.ones((2, 12)), rule.points, 0.5, rule.spacing, RING, kappa)
    np.testing.assert_allclose(cosine, [[RING.length, 0.0]] * 2, rtol=0.0, atol=8 * EPS * RING.length)
    assert np.all(sine == 0.0)


@pytest.mark.parametrize("domain", [INTERVAL, RING])
def test_rows_do_not_see_one_another_not_even_a_failed_one(domain: Interval | Ring) -> None:
    rule = make_rule("trapezoid", domain, 21)
    assert rule.spacing is not None
    values = np.random.default_rng(7).normal(size=(16, 21))
    kappa = 2 * np.pi * np.array([0.0, 1.0, 3.0]) / domain.length

    def everything(rows: FloatArray) -> FloatArray:
        assert rule.spacing is not None
        weights = crossing_weights(rows, 0.1, rule.spacing, domain.periodic)
        cosine, sine = active_moments(rows, rule.points, 0.1, rule.spacing, domain, kappa)
        return np.concatenate((weights, cosine, sine), axis=1)

    sound = everything(values)
    order = np.random.default_rng(8).permutation(16)
    assert np.array_equal(everything(values[order]), sound[order])
    assert np.array_equal(everything(values[3:5]), sound[3:5])
    broken = values.copy()
    broken[4, 2], broken[9, 5] = np.nan, np.inf
    others = np.setdiff1d(np.arange(16), [4, 9])
    assert np.array_equal(everything(broken)[others], sound[others])
