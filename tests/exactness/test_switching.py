"""Times at which a formula switches, and that the schedule holds those of drives and of quantities."""

from __future__ import annotations

import numpy as np
import pytest

from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.kernels import GaussianKernel
from aleafield.field.rates import LogisticRate
from aleafield.field.switching import Switching, switch_times, switching
from aleafield.formula import Formula
from aleafield.forward.field_model import FieldModel
from aleafield.geometry import Interval
from aleafield.projection.scheme import Scheme
from aleafield.quantities import At, FormulaQuantity, Over, When
from aleafield.randomness.design import Design
from aleafield.randomness.inputs import Dependence, Input
from aleafield.randomness.laws import Uniform
from tests.manufactured.problems import lone, term

PARAMETERS = {"on": 2.0, "twice": Formula("2*on"), "unsure": Uniform(0.0, 1.0)}


@pytest.mark.parametrize(
    ("text", "beside", "times", "uncertain"),
    [
        ("u * (t < 3)", {}, (3.0,), False),
        ("(on <= t) * (t < twice)", {}, (2.0, 4.0), False),
        ("(t < on) + (t < late)", {"on": 5.0, "late": Formula("on + 1")}, (5.0, 6.0), False),
        ("a * u", {"a": Formula("t < 1.5")}, (1.5,), False),
        ("(t < unsure) + (t < 1)", {}, (1.0,), True),
        ("x < t", {}, (), True),
        ("u * t", {}, (), False),
    ],
)
def test_switch_times_of_a_term(
    text: str, beside: dict[str, object], times: tuple[float, ...], uncertain: bool
) -> None:
    """By hand; names beside a formula hide parameters."""
    assert switch_times(term(text, beside), PARAMETERS) == Switching(times, uncertain)


def model(when: When, time_step: float) -> FieldModel:
    """A field without connections that stays at 1 under a drive that switches at the time 2, and a formula of
    it that is 3 before the time 7/3 and 1 after it."""
    equation = FieldEquation(
        Interval(-1.0, 1.0),
        lone(GaussianKernel(0.0, 1.0)),
        LogisticRate(1.0),
        Dynamics(1.0, 5.0),
        term("1 + 0*(t < on)"),
        term("1"),
        PARAMETERS | {"last": Formula("7/3")},
    )
    inputs = (Input("unsure", Uniform(0.0, 1.0), "1"),)
    design = Design(inputs, Dependence(), "monte carlo", 1)
    quantity = FormulaQuantity("q", term("u * where(t < last, 3, 1)"), "mean", when=when)
    scheme = Scheme("piecewise linear", "collocation", 9)
    return FieldModel(equation, scheme, [quantity], design, inputs, time_step)


def test_the_schedule_holds_the_switches_of_quantities() -> None:
    found = model(At(4.0), 0.5)
    assert switching(found.equation).times == (2.0,)
    assert found.schedule_times == pytest.approx((2.0, 7 / 3, 4.0), rel=1e-15)


@pytest.mark.parametrize("time_step", [1.0, 0.3])
def test_a_window_over_a_switch_is_exact(time_step: float) -> None:
    """Mean over [1, 4] of 3 until 7/3, then 1: (4/3 * 3 + 5/3) / 3 = 17/9, by the cubics of each step."""
    found = model(Over(1.0, 4.0, "mean"), time_step)
    records = found.evaluate(found.level, np.arange(8))
    np.testing.assert_allclose(records.values["q"], np.full(8, 17 / 9), rtol=1e-13)
