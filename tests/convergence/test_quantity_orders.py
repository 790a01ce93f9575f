"""How fast each measure approaches that of the function, in the mesh and in the step.

The error of a located number jumps with its place between the nodes: errors are root mean squares over shifts
of one profile.  Remainder of cubic Hermite interpolation, h^4 u'''' / 384: any text (from memory).
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from numpy.polynomial.legendre import leggauss
from scipy.optimize import brentq
from scipy.special import lambertw

from aleafield.arrays import FloatArray
from aleafield.field.formula_term import FormulaTerm
from aleafield.formula import Formula
from aleafield.geometry import Domain
from aleafield.quantities import (
    ActiveWidth,
    FormulaQuantity,
    FrontPosition,
    Integral,
    Maximum,
    Mean,
    Minimum,
    Norm,
    Over,
    PeakPosition,
    Quantity,
    Reduction,
    SpectralPower,
    TimeToLevel,
    Value,
)
from tests.convergence.rates import observed_orders
from tests.exactness.trajectories import INTERVAL, RING, Trajectory, follow, of_function, space_of

SHIFTS = np.random.default_rng(41).uniform(-0.4, 0.4, 64)
LEVEL = 0.6
KAPPA = 2 * np.pi / RING.length


def bump(z: FloatArray) -> FloatArray:
    """One lopsided peak of height 1 at 0: e y exp(-y) with y = exp(3 z / 2)."""
    return np.exp(1.0 + 1.5 * z - np.exp(1.5 * z))


def round_bump(z: FloatArray) -> FloatArray:
    """One lopsided peak and one trough on the ring, analytic."""
    return np.exp(np.sin(KAPPA * z + 0.7) + 0.3 * np.cos(2 * KAPPA * z))


def slope_of_round_bump(z: float) -> float:
    wave = np.cos(KAPPA * z + 0.7) - 0.6 * np.sin(2 * KAPPA * z)
    return float(round_bump(np.array(z)) * KAPPA * wave)


def shifted(profile: Callable[[FloatArray], FloatArray]) -> Callable[[FloatArray], FloatArray]:
    return lambda x: profile(x[None, :] - SHIFTS[:, None])


def integrals(profile: Callable[[FloatArray], FloatArray], domain: Domain) -> FloatArray:
    """Of each shifted profile, by 20 Gauss points on each of 40 pieces."""
    points, weights = leggauss(20)
    half = domain.length / 80
    middles = domain.low + half * (2 * np.arange(40) + 1)
    x = (middles[:, None] + half * points).ravel()
    return np.asarray((shifted(profile)(x) * np.tile(half * weights, 40)).sum(axis=1))


def crossing(profile: Callable[[FloatArray], FloatArray], low: float, high: float) -> float:
    return float(brentq(lambda z: float(profile(np.array(z))) - LEVEL, low, high, xtol=1e-15))


BUMP_ENDS = [float(np.log(-lambertw(-LEVEL / np.e, branch).real) / 1.5) for branch in (0, -1)]
"""y exp(-y) = LEVEL / e, by the two branches of Lambert's function."""
THIRD = INTERVAL.low + INTERVAL.length / 3
"""A point a third or two thirds of the way between two nodes of every mesh of 2^k elements."""
ROUND_TOP = brentq(slope_of_round_bump, -0.3, 1.5, xtol=1e-15)
ROUND_PIT = brentq(slope_of_round_bump, -3.5, -1.5, xtol=1e-15)
ROUND_ENDS = crossing(round_bump, ROUND_PIT, ROUND_TOP), crossing(round_bump, ROUND_TOP, ROUND_PIT + 7.0)
ONES = np.ones(64)

Case = tuple[Quantity, FloatArray]


def power(profile: Callable[[FloatArray], FloatArray], exponent: int) -> Callable[[FloatArray], FloatArray]:
    return lambda z: profile(z) ** exponent


def formula(text: str) -> FormulaTerm:
    return FormulaTerm(Formula(text))


def cases_on_the_interval() -> list[Case]:
    """Quantities of the shifted bumps and their true values, (64,)."""
    area = integrals(bump, INTERVAL)
    there = bump(THIRD - SHIFTS)
    return [
        (Value("value", THIRD), bump(THIRD - SHIFTS)),
        (Integral("integral"), area),
        (Mean("mean"), area / INTERVAL.length),
        (Norm("norm"), np.sqrt(integrals(power(bump, 2), INTERVAL))),
        (PeakPosition("peak position"), SHIFTS),
        (Maximum("maximum"), ONES),
        (ActiveWidth("active width", LEVEL), (BUMP_ENDS[1] - BUMP_ENDS[0]) * ONES),
        (FrontPosition("right front", LEVEL), BUMP_ENDS[1] + SHIFTS),
        (FrontPosition("left front", LEVEL, "left"), BUMP_ENDS[0] + SHIFTS),
        (FormulaQuantity("formula", formula("u**3 + x * u"), "value", THIRD), there**3 + THIRD * there),
        (FormulaQuantity("largest", formula("u**2"), "maximum"), ONES),
        (FormulaQuantity("cube", formula("u**3"), "integral"), integrals(power(bump, 3), INTERVAL)),
    ]


def cases_on_the_ring() -> list[Case]:
    """Quantities of the shifted round bumps and their true values, (64,)."""
    n = np.arange(4000) * RING.length / 4000  # the periodic trapezoid rule, exact to rounding
    mode = np.mean(round_bump(n) * np.exp(-3j * KAPPA * n))
    return [
        (PeakPosition("peak position"), ROUND_TOP + SHIFTS),
        (Maximum("maximum"), float(round_bump(np.array(ROUND_TOP))) * ONES),
        (Minimum("minimum"), float(round_bump(np.array(ROUND_PIT))) * ONES),
        (ActiveWidth("active width", LEVEL), (ROUND_ENDS[1] - ROUND_ENDS[0]) * ONES),
        (Norm("norm"), np.sqrt(np.mean(round_bump(n) ** 2) * RING.length) * ONES),
        (SpectralPower("spectral power", 3), abs(mode) ** 2 * ONES),
    ]


INTERVAL_CASES = {case[0].name: case for case in cases_on_the_interval()}
RING_CASES = {case[0].name: case for case in cases_on_the_ring()}


def rms_errors(case: Case, projector: str, domain: Domain, counts: list[int]) -> list[float]:
    """Root mean squares over the shifts, for each number of nodes."""
    quantity, truth = case
    profile = bump if domain is INTERVAL else round_bump
    errors = []
    for n in counts:
        found = of_function(quantity, space_of((projector, domain), n), shifted(profile))[0]
        errors.append(float(np.sqrt(np.mean((found - truth) ** 2))))
    return errors


THIRD_ORDER = {"maximum", "minimum", "largest"}
"""Nodal values are exact here, and the parabola through three of them has error h^3."""


@pytest.mark.parametrize("name", INTERVAL_CASES)
def test_orders_of_piecewise_linear_fields_on_an_interval(name: str) -> None:
    counts = [65, 129, 257, 513]
    errors = rms_errors(INTERVAL_CASES[name], "piecewise linear", INTERVAL, counts)
    orders = observed_orders(errors, [1 / (n - 1) for n in counts])
    expected = 3.0 if name in THIRD_ORDER else 2.0
    assert all(abs(p - expected) < 0.35 for p in orders[1:]), orders
    assert errors[-1] < 1e-4, errors


@pytest.mark.parametrize("name", RING_CASES)
def test_orders_of_piecewise_linear_fields_on_a_ring(name: str) -> None:
    counts = [64, 128, 256, 512]
    errors = rms_errors(RING_CASES[name], "piecewise linear", RING, counts)
    orders = observed_orders(errors, [1 / n for n in counts])
    expected = 3.0 if name in THIRD_ORDER else 2.0
    assert all(abs(p - expected) < 0.35 for p in orders[1:]), orders
    assert errors[-1] < 2e-4, errors


@pytest.mark.parametrize(
    ("name", "projector", "domain"),
    [
        *((name, projector, INTERVAL) for name in INTERVAL_CASES for projector in ("chebyshev", "legendre")),
        *((name, "fourier", RING) for name in RING_CASES),
    ],
)
def test_spectral_fields_converge_faster_than_any_power(name: str, projector: str, domain: Domain) -> None:
    """Analytic profiles: doubling the nodes squares the error, until rounding."""
    cases, counts = (INTERVAL_CASES, [20, 40, 120]) if domain is INTERVAL else (RING_CASES, [10, 20, 60])
    errors = rms_errors(cases[name], projector, domain, counts)
    assert errors[1] < max(20 * errors[0] ** 2, 1e-1 * errors[0])
    assert errors[2] < 1e-10, errors


PHASES = np.linspace(0.0, 0.5, 32)
"""Shifts in time of one course, so that what is located lies anywhere in a step."""
STEP_COUNTS = [8, 16, 32, 64]


def swinging(offset: float) -> Trajectory:
    """(offset + sin(t + phase)) times 1 + x^2 / 20."""

    def profile(x: FloatArray) -> FloatArray:
        return 1.0 + x**2 / 20

    return Trajectory(
        lambda x, t: (offset + np.sin(t + PHASES[:, None])) * profile(x),
        lambda x, t: np.cos(t + PHASES[:, None]) * profile(x),
    )


def errors_in_time(
    quantity: Quantity, projector: str, trajectory: Trajectory, truth: FloatArray
) -> list[float]:
    """Root mean squares over the phases, for each number of steps on [0, 3]; the profile is in the space."""
    space = space_of((projector, INTERVAL), 15 if projector == "piecewise linear" else 12)
    errors = []
    for n in STEP_COUNTS:
        found = follow(quantity, space, trajectory, list(np.linspace(0.0, 3.0, n + 1)))[0]
        errors.append(float(np.sqrt(np.mean((found - truth) ** 2))))
    return errors


def check_fourth_order(errors: list[float]) -> None:
    orders = observed_orders(errors, [1 / n for n in STEP_COUNTS])
    assert all(abs(p - 4.0) < 0.4 for p in orders[1:]), orders
    assert errors[-1] < 1e-6, errors


@pytest.mark.parametrize("projector", ["piecewise linear", "chebyshev", "legendre"])
def test_the_time_to_a_level_is_of_order_four_in_the_step(projector: str) -> None:
    """At the node 0 the profile is 1: sin(t + phase) = 0.8."""
    truth = np.arcsin(0.8) - PHASES
    check_fourth_order(errors_in_time(TimeToLevel("q", 0.8, 0.0), projector, swinging(0.0), truth))


def test_the_margin_of_a_time_to_a_level_is_of_order_four() -> None:
    """The largest value over time is 1 at the node 0."""
    space = space_of(("piecewise linear", INTERVAL), 15)
    errors = []
    for n in STEP_COUNTS:
        steps = list(np.linspace(0.0, 3.0, n + 1))
        margin = follow(TimeToLevel("q", 0.7, 0.0), space, swinging(0.0), steps)[1]
        assert margin is not None
        errors.append(float(np.sqrt(np.mean((margin - 0.3) ** 2))))
    check_fourth_order(errors)


@pytest.mark.parametrize("reduce", ["maximum", "mean"])
@pytest.mark.parametrize("measure", ["value", "maximum", "norm", "active width"])
def test_windows_are_of_order_four_in_the_step(measure: str, reduce: Reduction) -> None:
    """The profile is largest at the right end, 1.8; above c where x^2 > 20 (c / course - 1) on both sides."""
    over = Over(0.0, 3.0, reduce)
    offset, level = 5.0, 6.3
    norm = float(np.sqrt(sum(c * (4.0**k + 3.0**k) / k for c, k in ((1, 1), (0.1, 3), (1 / 400, 5)))))
    quantity: Quantity = {
        "value": Value("q", 0.0, over),
        "maximum": Maximum("q", over),
        "norm": Norm("q", over),
        "active width": ActiveWidth("q", level, over),
    }[measure]

    def functional(course: FloatArray) -> FloatArray:
        if measure == "active width":  # all but |x| <= reach, which stays between 1 and 2.7
            return INTERVAL.length - 2 * np.sqrt(20 * (level / course - 1))
        return {"value": 1.0, "maximum": 1.8, "norm": norm}[measure] * course

    if reduce == "maximum":
        truth = functional(np.full(32, offset + 1.0))
    else:
        points, weights = leggauss(60)
        truth = (functional(offset + np.sin(1.5 * (1 + points) + PHASES[:, None])) * weights / 2).sum(axis=1)
    check_fourth_order(errors_in_time(quantity, "chebyshev", swinging(offset), truth))
