"""Displacement and effective diffusion of patterns whose course is known, and histories of quantities."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.geometry import Domain
from aleafield.quantities import (
    ActiveWidth,
    At,
    Displacement,
    EffectiveDiffusion,
    FrontPosition,
    FrontSpeed,
    Maximum,
    Mean,
    Over,
    PeakPosition,
    Quantity,
    TimeToLevel,
    Value,
)
from aleafield.spaces import Space
from aleafield.stepping.view import AnyStep
from tests.exactness.trajectories import (
    EPS,
    INTERVAL,
    PAIRS,
    RING,
    Trajectory,
    noisy_steps,
    result_of,
    show,
    smooth_steps,
    space_of,
)

KAPPA = 2 * math.pi / RING.length
TIMES = [float(t) for t in np.linspace(0.0, 2.0, 41)]
SPEEDS = np.array([0.0, 0.7, -2.3, 3.2]) * RING.length
"""In two units of time: no turn, and 1.4, -4.6 and 6.4 turns; a step of 1/20 is at most 0.16 of a turn."""
STARTS = np.array([0.3, 3.4, -3.4, 0.0])


def travelling() -> Trajectory:
    """2 + cos and a second wave that does not move: only the first mode counts."""

    def angle(x: FloatArray, t: float) -> FloatArray:
        return KAPPA * (x - (STARTS + SPEEDS * t)[:, None])

    return Trajectory(
        lambda x, t: 2.0 + np.cos(angle(x, t)) + 3.0 * np.cos(2 * KAPPA * x + 1.0),
        lambda x, t: KAPPA * SPEEDS[:, None] * np.sin(angle(x, t)),
    )


def sliding() -> Trajectory:
    """A Gaussian bump on the interval, from 0 with the given speeds."""
    speeds = np.array([[0.0], [0.8], [-0.6]])

    def bump(x: FloatArray, t: float) -> FloatArray:
        return np.exp(-((x - speeds * t) ** 2))

    return Trajectory(bump, lambda x, t: 2 * (x - speeds * t) * speeds * bump(x, t))


def both_ways(space: Space, trajectory: Trajectory) -> dict[str, list[AnyStep]]:
    return {
        "smooth": smooth_steps(space, trajectory, TIMES),
        "noisy": noisy_steps(space, trajectory.field, TIMES),
    }


@pytest.mark.parametrize("projector", ["fourier", "piecewise linear"])
@pytest.mark.parametrize("kind", ["smooth", "noisy"])
def test_the_phase_of_a_travelling_wave_is_exact_over_several_turns(projector: str, kind: str) -> None:
    """Samples of a wave at equal distances hold its phase exactly, whatever the element does between them."""
    space = space_of((projector, RING), 16)
    steps = both_ways(space, travelling())[kind]
    far = 10 * RING.length
    for first, last in ((0.0, 2.0), (0.5, 1.5), (0.05, 0.1)):
        found, margin = result_of(Displacement("q", (first, last)), space, steps)
        assert margin is None
        np.testing.assert_allclose(found, SPEEDS * (last - first), atol=1e2 * EPS * far)
        found, margin = result_of(EffectiveDiffusion("q", (first, last)), space, steps)
        assert margin is None
        squares = SPEEDS**2 * (last**2 - first**2)
        np.testing.assert_allclose(found, squares / (2 * (last - first)), rtol=1e-11, atol=1e3 * EPS)


@pytest.mark.parametrize(
    ("projector", "nodes"), [("chebyshev", 80), ("legendre", 80), ("piecewise linear", 57)]
)
@pytest.mark.parametrize("kind", ["smooth", "noisy"])
def test_the_peak_of_a_sliding_bump_on_an_interval(projector: str, nodes: int, kind: str) -> None:
    """Nodes of 57 are the multiples of 1/8; by symmetry the parabola is exact at them and half way between."""
    space = space_of((projector, INTERVAL), nodes)
    steps = both_ways(space, sliding())[kind]
    speeds = np.array([0.0, 0.8, -0.6])
    found, _ = result_of(Displacement("q", (0.0, 1.25)), space, steps)
    np.testing.assert_allclose(found, speeds * 1.25, atol=1e-10)
    found, _ = result_of(EffectiveDiffusion("q", (0.0, 1.25)), space, steps)
    np.testing.assert_allclose(found, speeds**2 * 1.25 / 2, atol=1e-10)


def test_a_pattern_that_appears_later_is_followed_from_there() -> None:
    """Flat until t = 1: Delta is 0 until then, and after that what the wave has moved since t = 1."""
    space = space_of(("fourier", RING), 16)

    def late(x: FloatArray, t: float) -> FloatArray:
        wave = travelling().field(x, t)
        return wave if t >= 1.0 else np.full_like(wave, 0.3)

    steps = noisy_steps(space, late, TIMES)
    found, _ = result_of(Displacement("q", (1.0, 2.0)), space, steps)
    np.testing.assert_allclose(found, SPEEDS, atol=1e-12)
    found, _ = result_of(EffectiveDiffusion("q", (1.0, 2.0)), space, steps)
    np.testing.assert_allclose(found, SPEEDS**2 / 2, rtol=1e-11)
    np.testing.assert_allclose(result_of(Displacement("q", (0.0, 2.0)), space, steps)[0], SPEEDS, atol=1e-12)
    history = Displacement("q", (1.0, 2.0)).history(space, [0.0, 1.0, 1.5])
    show([history], steps)
    expected = np.stack([0 * SPEEDS, 0 * SPEEDS, SPEEDS / 2], 1)
    np.testing.assert_allclose(history.values, expected, atol=1e-12)


def test_a_time_off_the_schedule_is_not_passed_over_in_silence() -> None:
    space = space_of(("fourier", RING), 16)
    with pytest.raises(RuntimeError, match=r"no state at time 1\.01"):
        result_of(Displacement("q", (0.5, 1.01)), space, smooth_steps(space, travelling(), TIMES))


def followed(domain: Domain) -> list[Any]:
    """Quantities of one state, as functions of the time."""
    everywhere = [
        lambda when: Value("q", 0.3, when),
        lambda when: Mean("q", when),
        lambda when: Maximum("q", when),
        lambda when: PeakPosition("q", when=when),
        lambda when: ActiveWidth("q", 0.5, when),
    ]
    return everywhere if domain.periodic else [*everywhere, lambda when: FrontPosition("q", 0.5, when=when)]


@pytest.mark.parametrize("pair", PAIRS)
@pytest.mark.parametrize("kind", ["smooth", "noisy"])
def test_a_history_is_the_quantity_at_its_times(pair: tuple[str, Domain], kind: str) -> None:
    """To the bit at ends of steps; NaN where it does not occur (the bump sinks below the level)."""
    space = space_of(pair, 33)

    def sinking(x: FloatArray, t: float) -> FloatArray:
        return (1.0 - 0.4 * t) * np.exp(-((x - np.array([[0.0], [0.5]]) * t) ** 2))

    trajectory = Trajectory(sinking, lambda x, t: np.zeros((2, len(x))))
    steps = both_ways(space, trajectory)[kind]
    times = [0.0, 0.05, 0.7, TIMES[-2], 2.0]
    for made in followed(space.domain):
        history = made(At(1.0)).history(space, times)
        assert history is not None
        show([history], steps)
        assert history.values.shape == (2, 5)
        for column, time in enumerate(times):
            expected, _ = result_of(made(At(time)), space, [s for s in steps if s.t0 < max(time, 0.05)])
            np.testing.assert_array_equal(history.values[:, column], expected)
    width = ActiveWidth("q", 0.5).history(space, [0.5, 2.0])
    assert width is not None
    show([width], steps)
    np.testing.assert_array_equal(np.isnan(width.values), [[False, True], [False, True]])


def test_inside_a_step_a_history_takes_the_state_that_the_step_gives() -> None:
    """A cubic course is exact under Hermite steps; a noisy step is a straight line."""
    space = space_of(("fourier", RING), 8)
    cubic = Trajectory(lambda x, t: np.full((1, len(x)), t**3), lambda x, t: np.full((1, len(x)), 3 * t**2))
    times = [0.25, 0.5, 1.75]
    for steps, expected in (
        (smooth_steps(space, cubic, [0.0, 1.0, 2.0]), [0.25**3, 0.5**3, 1.75**3]),
        (noisy_steps(space, cubic.field, [0.0, 1.0, 2.0]), [0.25, 0.5, 1.0 + 0.75 * 7.0]),
    ):
        history = Mean("q").history(space, times)
        assert history is not None
        show([history], steps)
        np.testing.assert_allclose(history.values, [expected], rtol=10 * EPS)


@pytest.mark.parametrize("quantity", [Displacement("q", (0.5, 2.0)), EffectiveDiffusion("q", (0.5, 2.0))])
@pytest.mark.parametrize("kind", ["smooth", "noisy"])
def test_the_history_of_a_wandering_pattern_is_its_displacement_since_the_start(
    quantity: Displacement | EffectiveDiffusion, kind: str
) -> None:
    """Inside a straight step of angle a between two equal waves the phase at theta is known too."""
    space = space_of(("fourier", RING), 16)
    history = quantity.history(space, [0.0, 0.5, 1.95, 1.975, 2.0])
    show([history], both_ways(space, travelling())[kind])
    np.testing.assert_allclose(history.values[:, :3], SPEEDS[:, None] * [0.0, 0.5, 1.95], atol=1e-11)
    np.testing.assert_allclose(history.values[:, 4], SPEEDS * 2.0, atol=1e-11)
    # half way the mean of two waves has the phase half way; so has their Hermite interpolant, by symmetry
    np.testing.assert_allclose(history.values[:, 3], SPEEDS * 1.975, atol=1e-11)


@pytest.mark.parametrize(
    "quantity", [Mean("q", Over(0.0, 1.0, "mean")), TimeToLevel("q", 0.1), FrontSpeed("q", 0.1)]
)
def test_what_is_no_number_of_one_state_has_no_history(quantity: Quantity) -> None:
    assert quantity.history(space_of(("chebyshev", INTERVAL), 9), [0.0, 1.0]) is None


def test_a_history_is_not_cut_short_in_silence() -> None:
    space = space_of(("fourier", RING), 16)
    history = Mean("q").history(space, [0.0, 3.0])
    assert history is not None
    show([history], smooth_steps(space, travelling(), TIMES))
    with pytest.raises(RuntimeError, match="ended before time 3"):
        _ = history.values
