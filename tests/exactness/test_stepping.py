"""Schedules hold the times they must; Runge-Kutta is of order 4 across switches that lie on them."""

from __future__ import annotations

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.errors import InputError
from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.kernels import GaussianKernel
from aleafield.field.rates import LogisticRate
from aleafield.geometry import Interval
from aleafield.projection.discretisation import Discretisation
from aleafield.projection.pairing import resolve
from aleafield.projection.scheme import Scheme
from aleafield.randomness.laws import Uniform
from aleafield.stepping.runge_kutta import REAL_AXIS, integrate, stability_bound
from aleafield.stepping.schedule import Schedule
from aleafield.stepping.view import StepView
from tests.convergence.rates import observed_orders
from tests.manufactured.problems import growth_factor, lone, term
from tests.manufactured.solving import Final, root_mean_square, solve_level


@pytest.mark.parametrize(
    ("times", "step", "duration", "counts"),
    [
        ((), 0.5, 60.0, (120,)),
        ((20.0,), 0.5, 60.0, (40, 80)),
        ((), 0.1, 0.6, (6,)),  # 0.6 / 0.2 is 2.9999999999999996
        ((), 0.1, 0.3, (4,)),
        ((0.1 + 0.2,), 0.05, 0.9, (6, 12)),  # spans 0.30000000000000004 and 0.6
        ((1 / 3,), 0.25, 1.0, (2, 4)),
        ((5.0,), 100.0, 8.0, (2, 2)),
        ((3.0, 3.0 + 1e-13, 8.0, 0.0), 1.0, 8.0, (4, 6)),
    ],
)
def test_spans_have_an_even_number_of_equal_steps(
    times: tuple[float, ...], step: float, duration: float, counts: tuple[int, ...]
) -> None:
    """2 ceil(span / (2 step)) by hand; a rounding error must not add a pair of steps."""
    schedule = Schedule.through(times, step, duration)
    assert schedule.counts == counts
    assert len(schedule) == sum(counts)
    assert schedule.times[0] == 0.0
    assert schedule.times[-1] == duration
    assert schedule.longest <= step * (1 + 1e-8)
    for time in times:
        assert np.abs(schedule.times - time).min() <= 1e-12 * duration


def test_levels_are_nested_and_hold_the_fixed_times_to_the_bit() -> None:
    base = Schedule.through([0.7, 2.2], 0.3, 5.0)
    for level in (-1, 0, 1, 3):
        schedule = base.refined(level)
        assert len(schedule) == len(base) * 2.0**level
        assert {0.0, 0.7, 2.2, 5.0} <= set(schedule.times.tolist())
        steps = np.diff(schedule.times)
        for start, end in ((0.0, 0.7), (0.7, 2.2), (2.2, 5.0)):
            inside = (schedule.times[:-1] >= start) & (schedule.times[:-1] < end)
            np.testing.assert_allclose(steps[inside], (end - start) / inside.sum(), rtol=1e-12)


@pytest.mark.parametrize(("times", "step", "duration"), [((), 0.0, 1.0), ((), 0.1, -1.0), ((2.0,), 0.1, 1.0)])
def test_impossible_schedules_are_refused(times: tuple[float, ...], step: float, duration: float) -> None:
    with pytest.raises(InputError):
        Schedule.through(times, step, duration)


def test_only_one_doubling_is_a_level() -> None:
    with pytest.raises(InputError):
        Schedule.through([], 0.1, 1.0).refined(-2)


class Spiral:
    """u' = A u for two unknowns, a decaying rotation; and a record of the calls."""

    restarts = False

    def __init__(self) -> None:
        self.matrix = np.array([[-0.4, 2.0], [-2.0, -0.4]])
        self.calls: list[tuple[float, float | None]] = []

    def initial(self) -> FloatArray:
        return np.array([[1.0, 0.0], [0.0, 2.0]])

    def rate_of_change(self, t: float, u: FloatArray, inside: float | None = None) -> FloatArray:
        self.calls.append((t, inside))
        return u @ self.matrix.T


class Views:
    """Observer that keeps every view."""

    def __init__(self) -> None:
        self.views: list[StepView] = []

    def start(self, t: float, u: FloatArray) -> None:
        """Nothing of interest."""

    def step(self, view: StepView) -> None:
        """Keep it."""
        self.views.append(view)


def test_steps_multiply_by_the_growth_factor() -> None:
    """For a linear system a step is 1 + z + z^2/2 + z^3/6 + z^4/24 of the matrix."""
    system, watcher = Spiral(), Views()
    integrate(system, Schedule.through([1.0], 0.25, 2.0), [watcher])
    z = 0.25 * complex(-0.4, 2.0)
    factor = 1 + z + z**2 / 2 + z**3 / 6 + z**4 / 24
    for number, view in enumerate(watcher.views):
        state = factor ** (number + 1)
        np.testing.assert_allclose(view.u1[0], [state.real, -state.imag], rtol=0, atol=1e-14)
        np.testing.assert_array_equal(view.du0, view.u0 @ system.matrix.T)
        np.testing.assert_array_equal(view.du1, view.u1 @ system.matrix.T)


def test_derivatives_are_used_again_but_not_across_fixed_times() -> None:
    """Four evaluations a step, one more at the start of each span; all stages look inside their own step."""
    system = Spiral()
    integrate(system, Schedule.through([1.0], 0.25, 2.0), [])
    assert len(system.calls) == 4 * 8 + 2
    for t, inside in system.calls:
        assert inside is not None
        assert abs(t - inside) <= 0.125 + 1e-12
    at_switch = {inside for t, inside in system.calls if t == 1.0}
    assert at_switch == {0.875, 1.125}


def test_steps_have_order_four() -> None:
    system, errors, steps = Spiral(), [], (0.2, 0.1, 0.05)
    for step in steps:
        final = Final()
        integrate(system, Schedule.through([], step, 2.0), [final])
        exact = np.exp(2.0 * complex(-0.4, 2.0))
        errors.append(float(np.abs(final.u[0] - [exact.real, -exact.imag]).max()))
    assert observed_orders(errors, steps)[-1] == pytest.approx(4.0, abs=0.1)


def test_stability_bound_is_the_end_of_the_real_axis() -> None:
    assert abs(growth_factor(-REAL_AXIS)) == pytest.approx(1.0, abs=1e-12)
    assert abs(growth_factor(-REAL_AXIS * 1.001)) > 1.0
    assert abs(growth_factor(-REAL_AXIS * 0.999)) < 1.0
    np.testing.assert_allclose(stability_bound(10.0, np.array([0.0, 1.0])), [REAL_AXIS * 10, REAL_AXIS * 5])


def switched(drive: str, **names: float | Uniform) -> FieldEquation:
    """A smooth field whose drive switches."""
    return FieldEquation(
        Interval(-3.0, 3.0),
        lone(GaussianKernel(1.5, 1.0)),
        LogisticRate(5.0, 0.3),
        Dynamics(1.0, 3.0),
        term(drive, names),
        term("0.2*exp(-x**2)"),
    )


def errors_in_time(
    equation: FieldEquation, times: tuple[float, ...], halvings: int, further: int
) -> list[float]:
    """Root-mean-square error at the end over 8 samples, for a step of 0.2 halved 0, 1, .. times.

    Measured against the finest step, halved `further` times and once more.
    """
    pairing = resolve(Scheme("piecewise linear", "collocation", 33), equation)
    inputs = {one.path: one.law.support[0] + 0.4 * (np.arange(8) + 0.377) / 8 for one in equation.uncertain()}

    def final(level: int) -> FloatArray:
        counts = pairing.nodes, pairing.quadrature_points
        return solve_level(equation, pairing, Level(*counts, level), 0.2, times, inputs).u

    exact = final(halvings + further)
    return [root_mean_square(final(level) - exact) for level in range(halvings)]


@pytest.mark.parametrize(
    ("drive", "times"),
    [
        ("exp(-x**2)*cos(t)", ()),
        ("exp(-x**2)*(t < 1.1)", (1.1,)),
        ("exp(-x**2)*(0.4 <= t < 1.1)*cos(t)", (0.4, 1.1)),
        ("exp(-x**2)*(t < off)", (1.1,)),
    ],
)
def test_order_four_across_switches_on_the_schedule(drive: str, times: tuple[float, ...]) -> None:
    equation = switched(drive, off=1.1) if "off" in drive else switched(drive)
    for order in observed_orders(errors_in_time(equation, times, 3, 1), [4.0, 2.0, 1.0]):
        assert order == pytest.approx(4.0, abs=0.2)


def test_a_switch_off_the_schedule_costs_three_orders() -> None:
    """The negative control of the test above, and what is announced for uncertain switches."""
    equation = switched("exp(-x**2)*(t < off)", off=Uniform(0.9, 1.3))
    pairing = resolve(Scheme("piecewise linear", "collocation", 33), equation)
    assert pairing.time.order == 1.0
    errors = errors_in_time(equation, (), 4, 4)
    overall = observed_orders([errors[0], errors[-1]], [8.0, 1.0])[0]
    assert 0.7 <= overall <= 1.3


def test_a_derivative_is_not_reused_where_a_sample_may_switch() -> None:
    """An uncertain switch time may lie between the middles of two steps: every step then starts anew."""
    uncertain = switched("exp(-x**2)*(t < off)", off=Uniform(0.9, 1.3))
    certain = switched("exp(-x**2)*(t < off)", off=1.0)
    for equation, expected in ((uncertain, True), (certain, False)):
        pairing = resolve(Scheme("piecewise linear", "collocation", 33), equation)
        discretisation = Discretisation(equation, Level(33, 33), pairing)
        inputs = {one.path: np.full(8, 1.0) for one in equation.uncertain()}
        system = discretisation.system(equation.bind(equation.binding(inputs)), 8)
        assert system.restarts is expected
