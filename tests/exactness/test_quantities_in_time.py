"""Windows, times to a level and speeds on trajectories known in closed form."""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.polynomial import Polynomial

from aleafield.arrays import FloatArray
from aleafield.field.formula_term import FormulaTerm
from aleafield.formula import Formula
from aleafield.geometry import Domain
from aleafield.quantities import (
    ActiveWidth,
    At,
    FormulaQuantity,
    FrontPosition,
    FrontSpeed,
    Mean,
    Over,
    PeakPosition,
    Reduction,
    TimeToLevel,
    Value,
)
from aleafield.quantities.cubic import Cubic
from tests.exactness.trajectories import (
    EPS,
    INTERVAL,
    PAIRS,
    RING,
    Trajectory,
    follow,
    separable,
    space_of,
)

SCALES = np.array([1.0, -0.5, 2.0])
COURSE = Polynomial([0.2, 1.0, -1.5, 0.4])
"""Of time on [0, 3]: it rises, falls below its start and rises again; a cubic, so that Hermite steps are "
"exact."""
STEPS = [0.0, 0.5, 0.75, 1.5, 2.0, 3.0]


def constant_in_space(x: FloatArray) -> FloatArray:
    return SCALES[:, None] * np.ones(len(x))


def extremes(course: Polynomial, start: float, end: float) -> tuple[float, float]:
    """Smallest and largest value on [start, end], from the roots of the derivative."""
    turning = [r.real for r in course.deriv().roots() if abs(r.imag) < 1e-12 and start < r.real < end]
    values = [float(course(t)) for t in (start, end, *turning)]
    return min(values), max(values)


@pytest.mark.parametrize("pair", PAIRS)
@pytest.mark.parametrize(("start", "end"), [(0.0, 3.0), (0.5, 1.5), (0.75, 2.0), (2.0, 3.0)])
def test_windows_of_linear_functionals_of_a_cubic_course(
    pair: tuple[str, Domain], start: float, end: float
) -> None:
    """The cubic through four values is the course itself."""
    space = space_of(pair, 9)
    trajectory = separable(constant_in_space, COURSE)
    lowest, highest = extremes(COURSE, start, end)
    primitive = COURSE.integ()
    expected: dict[Reduction, FloatArray] = {
        "maximum": np.where(SCALES > 0, SCALES * highest, SCALES * lowest),
        "minimum": np.where(SCALES > 0, SCALES * lowest, SCALES * highest),
        "mean": SCALES * (primitive(end) - primitive(start)) / (end - start),
    }
    for reduce, values in expected.items():
        for quantity in (Mean("q", Over(start, end, reduce)), Value("q", 0.3, Over(start, end, reduce))):
            found, margin = follow(quantity, space, trajectory, STEPS)
            np.testing.assert_allclose(found, values, rtol=1e3 * EPS, atol=1e2 * EPS)
            assert margin is None


def test_a_snapshot_is_taken_at_its_time_and_at_the_end_by_default() -> None:
    space = space_of(("fourier", RING), 8)
    trajectory = separable(constant_in_space, COURSE)
    for when, t in ((At(0.0), 0.0), (At(0.75), 0.75), (At(1.5 * (1 + 4 * EPS)), 1.5), (At(), 3.0)):
        found, _ = follow(Mean("q", when), space, trajectory, STEPS)
        np.testing.assert_allclose(found, SCALES * COURSE(t), rtol=1e2 * EPS)


def test_a_time_off_the_schedule_is_not_passed_over_in_silence() -> None:
    space = space_of(("fourier", RING), 8)
    trajectory = separable(constant_in_space, COURSE)
    with pytest.raises(RuntimeError, match=r"no state at time 0\.6"):
        follow(Mean("q", At(0.6)), space, trajectory, STEPS)
    with pytest.raises(RuntimeError, match="no step lies in"):
        follow(Mean("q", Over(0.6, 0.7, "mean")), space, trajectory, STEPS)


def test_a_comparison_with_time_takes_its_limit_from_inside_the_step() -> None:
    """The mean of (t < 1.5) over [0, 3] is 1/2, and 1 over the steps that end at the switch."""
    space = space_of(("fourier", RING), 8)
    trajectory = separable(constant_in_space, COURSE)
    term = FormulaTerm(Formula("t < 1.5"))
    for start, end, share in ((0.0, 3.0, 0.5), (0.75, 1.5, 1.0), (1.5, 2.0, 0.0)):
        for reduce in ("mean", "minimum", "maximum"):
            over = Over(start, end, reduce)  # type: ignore[arg-type]
            found, _ = follow(FormulaQuantity("q", term, when=over), space, trajectory, STEPS)
            whole = share in (0.0, 1.0) or reduce == "mean"
            expected = share if whole else {"minimum": 0.0, "maximum": 1.0}[reduce]
            np.testing.assert_allclose(found, np.full(3, expected), atol=10 * EPS)


@pytest.mark.parametrize("pair", PAIRS)
def test_the_time_to_a_level_of_a_cubic_course(pair: tuple[str, Domain]) -> None:
    """The first real root, from numpy's companion matrix; the running maximum from the roots of the slope."""
    space = space_of(pair, 9)
    trajectory = separable(constant_in_space, COURSE)
    level = np.array([0.36, 0.2, 0.799])
    highest = np.where(
        SCALES > 0, SCALES * extremes(COURSE, 0.0, 3.0)[1], SCALES * extremes(COURSE, 0.0, 3.0)[0]
    )
    found, margin = follow(TimeToLevel("q", level, 0.3), space, trajectory, STEPS)
    assert margin is not None
    np.testing.assert_allclose(margin, highest - level, atol=1e2 * EPS)
    for row in range(3):
        roots = (SCALES[row] * COURSE - level[row]).roots()
        first = min(r.real for r in roots if abs(r.imag) < 1e-9 and 0 <= r.real <= 3)
        slope = abs(SCALES[row] * COURSE.deriv()(first))
        assert found[row] == pytest.approx(first, abs=1e3 * EPS / slope)


def test_a_level_touched_inside_one_step_is_reached() -> None:
    """t (1 - t) reaches its maximum 1/4 inside the only step; its ends are below."""
    space = space_of(("fourier", RING), 8)
    trajectory = separable(lambda x: np.ones((4, len(x))), Polynomial([0.0, 1.0, -1.0]))
    level = np.array([0.24, 0.25 - 1e-9, 0.26, -0.1])
    found, margin = follow(TimeToLevel("q", level), space, trajectory, [0.0, 1.0])
    assert margin is not None
    np.testing.assert_allclose(margin, 0.25 - level, atol=4 * EPS)
    np.testing.assert_allclose(found[:2], 0.5 - np.sqrt(0.25 - level[:2]), atol=1e-11)
    assert math.isnan(found[2])
    assert found[3] == 0.0, "at or above the level from the start"


def test_a_level_reached_at_the_end_of_a_step_and_at_the_start() -> None:
    space = space_of(("fourier", RING), 8)
    trajectory = separable(lambda x: np.ones((2, len(x))), Polynomial([0.0, 1.0]))
    found, margin = follow(TimeToLevel("q", np.array([1.0, 0.0])), space, trajectory, [0.0, 1.0, 2.0])
    np.testing.assert_allclose(found, [1.0, 0.0], atol=4 * EPS)
    np.testing.assert_allclose(margin, [1.0, 2.0], rtol=4 * EPS)


def test_a_cubic_with_known_extremes() -> None:
    """Coefficients of random cubics against the extremes and the roots of numpy's polynomials."""
    rng = np.random.default_rng(29)
    coefficients = rng.standard_normal((64, 4))
    coefficients[:8, 3] = 0.0
    coefficients[:4, 2] = 0.0
    polynomials = [Polynomial(row) for row in coefficients]
    for low, high in np.sort(rng.uniform(0.0, 1.0, (64, 2))):  # with both turning points inside
        polynomials.append(Polynomial.fromroots([low, high]).integ())
    at = [np.array([p(theta) for p in polynomials]) for theta in (0.0, 1 / 3, 2 / 3, 1.0)]
    slopes = [np.array([p.deriv()(theta) for p in polynomials]) for theta in (0.0, 1.0)]
    highest = np.array([extremes(p, 0.0, 1.0)[1] for p in polynomials])
    means = np.array([p.integ()(1.0) for p in polynomials])
    for cubic in (Cubic.through(*at), Cubic.hermite(at[0], slopes[0], at[3], slopes[1])):
        np.testing.assert_allclose(cubic.maximum(), highest, atol=1e-13)
        np.testing.assert_allclose(cubic.mean(), means, atol=1e-13)
        for share in (0.01, 0.5, 0.99):
            level = at[0] + share * (highest - at[0])
            rising = np.flatnonzero(highest > at[0])
            found = cubic.of(rising).first_reach(level[rising])
            for theta, row in zip(found, rising, strict=True):
                roots = (polynomials[row] - level[row]).roots()
                first = min(r.real for r in roots if abs(r.imag) < 1e-9 and 0 < r.real <= 1 + 1e-9)
                assert theta == pytest.approx(first, abs=1e-9)
    assert len(rising) > 32


def bump(height: float, rate: float) -> Trajectory:
    """height - rate t times one minus a Gaussian bump that sinks, on the interval."""

    def shape(x: FloatArray) -> FloatArray:
        return np.exp(-(x**2))[None, :]

    return Trajectory(lambda x, t: (height - rate * t) * shape(x), lambda x, t: -rate * shape(x))


def test_the_width_over_a_window_counts_as_nothing_while_nothing_is_active() -> None:
    """A bump of height 1 - t with level 0.5: active until t = 0.5, width 2 sqrt(ln((1 - t) / 0.5))."""
    space = space_of(("chebyshev", INTERVAL), 80)
    times = [0.0, 0.3, 0.6, 0.75, 1.0]  # in the second step the cubic through the widths undershoots 0
    sinking = bump(1.0, 1.0)
    widest = 2 * math.sqrt(math.log(2.0))
    for reduce, value in (("maximum", widest), ("minimum", 0.0)):
        over = Over(0.0, 1.0, reduce)  # type: ignore[arg-type]
        found, margin = follow(ActiveWidth("q", 0.5, over), space, sinking, times)
        assert found[0] == pytest.approx(value, abs=1e-9 * value)
        np.testing.assert_allclose(margin, [0.5], rtol=1e-12)
    late, margin = follow(ActiveWidth("q", 0.5, Over(0.75, 1.0, "maximum")), space, sinking, times)
    assert math.isnan(late[0])
    np.testing.assert_allclose(margin, [-0.25], rtol=1e-12)


def test_a_front_over_a_window_occurs_if_it_does_throughout() -> None:
    """The bump of height 1 - t has fronts at level 0.5 while t < 0.5; its margin falls to 0.5 - t."""
    space = space_of(("chebyshev", INTERVAL), 80)
    times = [0.0, 0.125, 0.25, 0.5, 1.0]
    sinking = bump(1.0, 1.0)
    found, margin = follow(
        FrontPosition("q", 0.5, "right", Over(0.0, 0.25, "minimum")), space, sinking, times
    )
    assert found[0] == pytest.approx(math.sqrt(math.log(1.5)), abs=1e-9)
    np.testing.assert_allclose(margin, [0.25], rtol=1e-12)
    found, margin = follow(FrontPosition("q", 0.5, "right", Over(0.0, 1.0, "mean")), space, sinking, times)
    assert math.isnan(found[0])
    np.testing.assert_allclose(margin, [-0.5], rtol=1e-12)


def moving_front(speeds: FloatArray) -> Trajectory:
    """(1 - tanh(x - c t)) / 2 for several speeds."""

    def profile(x: FloatArray, t: float) -> FloatArray:
        return 0.5 - 0.5 * np.tanh(x - speeds[:, None] * t)

    def rate(x: FloatArray, t: float) -> FloatArray:
        return 0.5 * speeds[:, None] / np.cosh(x - speeds[:, None] * t) ** 2

    return Trajectory(profile, rate)


def test_the_speed_of_a_moving_front() -> None:
    """The coefficients of tanh fall like those of a pole at distance pi / 2: below 1e-15 for 90 nodes.

    The third front stands at 6 at the second time, outside the interval: margin level - u(to) < 0.
    """
    space = space_of(("chebyshev", INTERVAL), 90)
    speeds = np.array([0.5, -0.25, 6.0])
    quantity = FrontSpeed("q", 0.5, (0.25, 1.0))
    found, margin = follow(quantity, space, moving_front(speeds), [0.0, 0.25, 0.5, 1.0, 2.0])
    np.testing.assert_allclose(found[:2], speeds[:2], atol=1e-11)
    assert math.isnan(found[2])
    assert margin is not None
    assert margin[2] == pytest.approx(-0.5 * math.tanh(2.0), abs=1e-11)
    assert np.all(margin[:2] > 0)


@pytest.mark.parametrize("projector", ["fourier", "piecewise linear"])
def test_a_peak_is_followed_over_the_cut_of_the_ring(projector: str) -> None:
    """cos(kappa (x - x0 - c t)) goes one and a half times round; in 48 steps a step is 0.2 of a radian.

    The Hermite state is wrong by (kappa c h)^4 / 384 of its height, its peak by a few times that: 1e-4.
    """
    space = space_of((projector, RING), 32)
    kappa, speed = 2 * math.pi / RING.length, 1.5 * RING.length
    start = np.array([3.0, -3.4])

    def angle(x: FloatArray, t: float) -> FloatArray:
        return kappa * (x - start[:, None] - speed * t)

    turning = Trajectory(
        lambda x, t: np.cos(angle(x, t)),
        lambda x, t: kappa * speed * np.sin(angle(x, t)),
    )
    times = list(np.linspace(0.0, 1.0, 49))
    tolerance = (
        1e-4 if projector == "fourier" else 2e-2
    )  # the parabola is wrong by h^2 kappa^2 / 24 of a cell
    for reduce, value in (("maximum", start + speed), ("minimum", start), ("mean", start + speed / 2)):
        over = Over(0.0, 1.0, reduce)  # type: ignore[arg-type]
        found, _ = follow(PeakPosition("q", when=over), space, turning, times)
        np.testing.assert_allclose(found, value, atol=tolerance)
        found, _ = follow(PeakPosition("q", 100 * RING.length, over), space, turning, times)
        np.testing.assert_allclose(found, value + 100 * RING.length, atol=tolerance)
