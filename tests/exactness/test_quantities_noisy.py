"""Observers of noisy paths: what is exact path by path.  The laws of bridges are in tests/statistical."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from scipy.special import ndtri

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Side
from aleafield.field.formula_term import FormulaTerm
from aleafield.formula import Formula
from aleafield.geometry import Domain
from aleafield.quantities import (
    ActiveWidth,
    At,
    Displacement,
    FormulaQuantity,
    FrontPosition,
    FrontSpeed,
    FunctionQuantity,
    Integral,
    Maximum,
    Mean,
    Minimum,
    Norm,
    Over,
    PeakPosition,
    Quantity,
    SpectralPower,
    TimeToLevel,
    Value,
)
from aleafield.quantities.bridge import BridgedFunctional, Bridges
from aleafield.quantities.functional import LinearFunctional
from aleafield.spaces import make_space
from aleafield.stepping.view import NoisyStep
from tests.exactness.noisy_runs import GivenNoise, under_noise
from tests.exactness.trajectories import EPS, INTERVAL, PAIRS, noisy_steps, result_of, space_of

TIMES = [0.0, 0.5, 0.75, 1.5, 2.0]
COURSE = np.array([0.2, 1.0, -0.5, 0.7, 0.1])
"""Values at the times: nothing in between is known."""
MOST, LEAST = Over(0.0, 2.0, "maximum"), Over(0.0, 2.0, "minimum")
AVERAGE = Over(0.0, 2.0, "mean")
U = FormulaTerm(Formula("u"))


def flat(x: FloatArray, t: float) -> FloatArray:
    """The course, constant in space, times three numbers."""
    return np.array([[1.0], [-2.0], [0.5]]) * np.full(len(x), COURSE[TIMES.index(t)])


def last(u: FloatArray, x: FloatArray) -> FloatArray:
    return u[:, -1]


@pytest.mark.parametrize("pair", PAIRS)
def test_windows_see_the_ends_of_steps_and_straight_lines_between(pair: tuple[str, Domain]) -> None:
    """The mean is that of the polygon, and the extremes of what is not linear are those of the ends."""
    space = space_of(pair, 9)
    steps = noisy_steps(space, flat, TIMES)
    polygon = sum(
        (t - s) * (a + b) / 2 for (s, t), (a, b) in zip(pairwise(TIMES), pairwise(COURSE), strict=True)
    )
    scales = np.array([1.0, -2.0, 0.5])
    for quantity in (Mean("q", AVERAGE), Value("q", 0.3, AVERAGE), FormulaQuantity("q", U, when=AVERAGE)):
        found, margin = result_of(quantity, space, steps)
        np.testing.assert_allclose(found, scales * polygon / 2.0, rtol=1e3 * EPS)
        assert margin is None
    size = math.sqrt(space.domain.length) * np.abs(scales)
    np.testing.assert_allclose(result_of(Norm("q", MOST), space, steps)[0], size * 1.0, rtol=1e3 * EPS)
    np.testing.assert_allclose(result_of(Norm("q", LEAST), space, steps)[0], size * 0.1, rtol=1e3 * EPS)
    late = Norm("q", Over(0.75, 2.0, "maximum"))
    np.testing.assert_allclose(result_of(late, space, steps)[0], size * 0.7, rtol=1e3 * EPS)
    width, margin = result_of(ActiveWidth("q", 0.6, MOST), space, steps)
    assert margin is not None
    np.testing.assert_allclose(margin, np.array([1.0, 1.0, 0.5]) - 0.6, rtol=1e3 * EPS)
    np.testing.assert_allclose(width, [space.domain.length, space.domain.length, np.nan])


QUANTITIES: list[tuple[Quantity, bool, Side | None, bool]] = [
    (Value("q", 0.3), False, None, False),
    (Value("q", 0.3, MOST), True, None, False),
    (Mean("q", LEAST), True, None, True),
    (Mean("q"), False, None, True),
    (Integral("q", MOST), True, None, True),
    (Integral("q", AVERAGE), False, None, True),
    (TimeToLevel("q", 0.1), True, None, False),
    (Norm("q", MOST), False, "above", False),
    (Norm("q", AVERAGE), False, None, False),
    (Maximum("q", LEAST), False, "below", False),
    (Maximum("q", At(1.0)), False, None, False),
    (Minimum("q", MOST), False, "above", False),
    (PeakPosition("q", when=MOST), False, "above", False),
    (SpectralPower("q", 1, LEAST), False, "below", True),
    (SpectralPower("q", 1), False, None, True),
    (FunctionQuantity("q", last, MOST), False, "above", False),
    (ActiveWidth("q", 0.1), False, None, False),
    (ActiveWidth("q", 0.1, MOST), False, "above", False),
    (ActiveWidth("q", 0.1, LEAST), False, "below", False),
    (ActiveWidth("q", 0.1, AVERAGE), False, None, False),
    (FrontPosition("q", 0.1, when=AVERAGE), False, None, False),
    (FrontPosition("q", 0.1), False, None, False),
    (FrontSpeed("q", 0.1), False, None, False),
    (Displacement("q", (0.0, 1.0)), False, None, False),
    (FormulaQuantity("q", U), False, None, True),
    (
        FormulaQuantity("q", FormulaTerm(Formula("3 * x * u + t")), "integral", when=MOST),
        False,
        "above",
        True,
    ),
    (FormulaQuantity("q", FormulaTerm(Formula("u**2"))), False, None, False),
    (FormulaQuantity("q", FormulaTerm(Formula("a + 1"), {"a": Formula("tanh(u)")})), False, None, False),
    (FormulaQuantity("q", U, "maximum"), False, None, False),
    (FormulaQuantity("q", U, "value", 0.3), False, None, False),
]


@pytest.mark.parametrize(("quantity", "bridged", "open_side", "white"), QUANTITIES)
def test_what_noise_does_to_each_quantity(
    quantity: Quantity, bridged: bool, open_side: Side | None, white: bool
) -> None:
    assert quantity.bridged is bridged
    assert quantity.open_side == open_side
    assert quantity.defined_for_white_noise is white
    assert quantity.is_passage is isinstance(quantity, TimeToLevel)


@pytest.mark.parametrize("when", [MOST, LEAST, AVERAGE])
def test_occurrence_over_a_window_is_open_on_its_own_side(when: Over) -> None:
    """A width occurs once it does at any time of the window, a front where it does throughout."""
    assert ActiveWidth("q", 0.1, when).open_occurrence == "above"
    assert FrontPosition("q", 0.1, when=when).open_occurrence == "below"
    assert ActiveWidth("q", 0.1).open_occurrence is None
    assert FrontPosition("q", 0.1).open_occurrence is None


def test_quantities_of_one_functional_share_its_bridges() -> None:
    assert (
        Value("a", 0.5).functional_name == Value("b", 0.5).functional_name != Value("a", 0.4).functional_name
    )
    assert Mean("a").functional_name == Integral("b").functional_name


def test_bridges_of_huge_values_stay_finite() -> None:
    """1e200 apart: the squares of the distances overflow, maximum and passage do not."""
    ends = np.array([[0.0, 0.0], [1e200, 8e199]])
    bridges = Bridges(ends, np.array(1e300), np.full((1, 2), 0.5), np.full((2, 2), 0.5))
    assert np.isfinite(bridges.maximum()).all()
    np.testing.assert_allclose(bridges.first_reach(np.array([5e199, 4e199])), 0.5, rtol=1e-12)


def decay(u: FloatArray) -> FloatArray:
    return -1.5 * u


def waves(n: int) -> FloatArray:
    """Three modes of a space of n unknowns, of different sizes."""
    return np.array([[0.5], [0.3], [0.2]]) * np.cos(np.pi * np.arange(3)[:, None] * np.arange(n) / n)


def runs(seed: int = 3, samples: int = 24) -> tuple[GivenNoise, FloatArray]:
    """Noise of 3 base steps of 4 sub-steps, and random states of 9 unknowns to start from."""
    noise = GivenNoise.random(seed, (3, 4, samples), waves(9), 0.8)
    return noise, np.random.default_rng(seed + 1).standard_normal((samples, 9))


@pytest.mark.parametrize("steps_per_base", [1, 2, 4])
def test_bridges_start_and_end_where_the_steps_do(steps_per_base: int) -> None:
    """Between them lie the noise of the sub-steps and the drift in equal shares, for any linear functional."""
    noise, start = runs()
    noise = noise.at_level(steps_per_base)
    weights = np.linspace(-1.0, 2.0, 9)
    functional = LinearFunctional(weights)
    bridged = BridgedFunctional(functional, noise, "q")
    parts, length = 4 // steps_per_base, 0.8 / steps_per_base
    for step in noise.steps(start, decay):
        assert isinstance(step, NoisyStep)
        bridges = bridged(step)
        np.testing.assert_array_equal(bridges.ends[0], functional(step.u0))
        np.testing.assert_array_equal(bridges.ends[-1], functional(step.u1))
        increments = step.increments @ (noise.modes @ weights)
        drift = decay(step.u0) @ weights * length / parts
        np.testing.assert_allclose(np.diff(bridges.ends, axis=0), increments + drift, atol=1e3 * EPS)
        expected = ((noise.modes @ weights) ** 2).sum() * length / parts
        np.testing.assert_allclose(bridges.variance, expected, rtol=10 * EPS)
        base, place = divmod(step.index, steps_per_base)
        np.testing.assert_array_equal(
            bridges.uniforms, noise.uniform[base, place * parts : (place + 1) * parts]
        )


def test_uniform_numbers_are_drawn_once_for_a_base_step() -> None:
    noise, start = runs()
    noise = noise.at_level(4)
    drawn: list[int] = []

    class Counting(GivenNoise):
        def base_step(self, k: int, count: int) -> FloatArray:
            drawn.append(k)
            return super().base_step(k, count)

    counting = Counting(**vars(noise))
    under_noise(Mean("q", Over(0.8, 2.4, "maximum")), make_space("piecewise linear", INTERVAL, 9), counting,
                noise.steps(start, decay))  # fmt: skip
    assert drawn == [1, 2], "and none for steps outside the window"


def test_the_extremes_of_a_bridge_invert_their_law() -> None:
    """P(maximum > c) = exp(-2 (c - a)(c - b) / v) from a to b; the minimum is minus the maximum of -u."""
    rng = np.random.default_rng(11)
    ends, uniforms = rng.standard_normal((2, 64)), rng.random((1, 64))
    variance = rng.random(64)
    bridges = Bridges(ends, variance, uniforms, uniforms)
    for sign, extreme in ((1.0, bridges.maximum()), (-1.0, bridges.minimum())):
        a, b, c = sign * ends[0], sign * ends[1], sign * extreme
        assert np.all(c >= np.maximum(a, b))
        np.testing.assert_allclose(np.exp(-2 * (c - a) * (c - b) / variance), uniforms[0], rtol=1e-9)


def test_without_noise_a_bridge_is_a_straight_line() -> None:
    ends = np.array([[0.0, 0.0, 3.0], [1.0, -1.0, 2.0], [0.5, 2.0, 1.0]])
    straight = Bridges(ends, np.asarray(0.0), np.full((2, 3), 0.3), np.full((2, 3), 0.3))
    np.testing.assert_array_equal(straight.maximum(), [1.0, 2.0, 3.0])
    np.testing.assert_array_equal(straight.minimum(), [0.0, -1.0, 1.0])
    rising = straight.of(np.array([0, 1]))
    np.testing.assert_allclose(rising.first_reach(np.array([0.75, 0.5])), [0.375, 0.75], rtol=4 * EPS)
    assert rising.first_reach(np.array([1.0, 2.0])) == pytest.approx([0.5, 1.0], rel=4 * EPS)


def test_the_time_of_a_passage_inside_a_sub_step_by_its_transformation() -> None:
    """With a first draw of 1/2 the normal number is 0 and t / (d - t) is its mean A / B; with B = 0 and a
    second draw below 1/2, A^2 / v / normal^2, the law of a path that must end at the level (Levy's)."""
    ends = np.array([[0.0, 0.0], [-0.5, 1.0]])
    draws = np.array([[0.5, 0.8], [0.3, 0.3]])
    bridges = Bridges(ends, np.asarray(0.4), np.full((1, 2), 1e-9), draws)
    found = bridges.first_reach(np.array([1.0, 1.0]))
    ratio = np.array([1.0 / 1.5, 1.0 / 0.4 / ndtri(0.8) ** 2])
    np.testing.assert_allclose(found, ratio / (1 + ratio), rtol=1e-14)


LEVEL = np.linspace(-0.5, 1.0, 24)


def bridged_quantities(level: FloatArray) -> list[Quantity]:
    over = (Over(0.0, 2.4, "maximum"), Over(0.8, 2.4, "minimum"))
    windows: list[Quantity] = [measure("q", when=when) for measure in (Mean, Integral) for when in over]
    return [*windows, Value("q", 0.37, over[0]), TimeToLevel("q", level, 0.37)]


@pytest.mark.parametrize("projector", ["piecewise linear", "legendre"])
def test_bridged_rows_do_not_depend_on_one_another(projector: str) -> None:
    space = make_space(projector, INTERVAL, 9)
    noise, start = runs()
    steps = noise.steps(start, decay)
    shuffled = np.random.default_rng(37).permutation(24)
    for rows in (shuffled, np.arange(8, 16), shuffled[:16], np.array([5])):
        part = noise.of(rows)
        some = part.steps(np.ascontiguousarray(start[rows]), decay)
        for one, whole in zip(bridged_quantities(LEVEL[rows]), bridged_quantities(LEVEL), strict=True):
            found, expected = under_noise(one, space, part, some), under_noise(whole, space, noise, steps)
            np.testing.assert_array_equal(found[0], expected[0][rows])
            if found[1] is not None:
                assert expected[1] is not None
                np.testing.assert_array_equal(found[1], expected[1][rows])


def test_failed_paths_give_nan_and_disturb_nobody() -> None:
    """Warnings are errors here."""
    space = make_space("piecewise linear", INTERVAL, 9)
    noise, start = runs()
    spoilt = start.copy()
    spoilt[3], spoilt[10] = np.nan, np.inf
    with np.errstate(all="ignore"):
        steps = noise.steps(spoilt, decay)
    others = np.setdiff1d(np.arange(24), [3, 10])
    for quantity in bridged_quantities(LEVEL):
        values, margin = under_noise(quantity, space, noise, steps)
        expected = under_noise(quantity, space, noise, noise.steps(start, decay))
        np.testing.assert_array_equal(values[others], expected[0][others])
        assert not np.isfinite(values[[3, 10]]).any() or isinstance(quantity, TimeToLevel)
        if margin is not None:
            assert not np.isfinite(margin[[3, 10]]).any()


def test_all_levels_see_the_same_bridges_where_there_is_no_drift() -> None:
    """Coarse and fine then follow one path: maxima and passages agree to rounding."""
    space = make_space("piecewise linear", INTERVAL, 9)
    noise, start = runs(samples=64)
    level = np.linspace(0.0, 1.5, 64)
    for quantity in bridged_quantities(level):
        results = []
        for steps_per_base in (1, 2, 4):
            at_level = noise.at_level(steps_per_base)
            results.append(under_noise(quantity, space, at_level, at_level.steps(start, np.zeros_like)))
        for values, margin in results[1:]:
            np.testing.assert_allclose(values, results[0][0], atol=1e-12)
            if margin is not None:
                np.testing.assert_allclose(margin, results[0][1], atol=1e-12)


def test_a_passage_occurs_exactly_where_its_margin_is_not_negative() -> None:
    """Its time lies in the run; the running maximum is that of the window over the whole run."""
    space = make_space("piecewise linear", INTERVAL, 9)
    noise, start = runs(samples=256)
    steps = noise.steps(start, decay)
    times, margin = under_noise(TimeToLevel("q", 0.5, 0.37), space, noise, steps)
    highest, _ = under_noise(Value("q", 0.37, Over(0.0, 2.4, "maximum")), space, noise, steps)
    assert margin is not None
    np.testing.assert_allclose(margin, highest - 0.5, atol=10 * EPS)
    np.testing.assert_array_equal(np.isfinite(times), margin >= 0)
    reached = margin >= 0
    at_once = space.evaluate(start, np.array([0.37]))[:, 0] >= 0.5
    assert 0 < at_once.sum() < reached.sum() < 256
    np.testing.assert_array_equal(times[reached] == 0.0, at_once[reached])
    assert np.all(times[reached] <= 2.4)
