"""Faults in steps, switches and projections that the exactness tests must see."""

from __future__ import annotations

from typing import Any

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.projection.restriction import MassRestriction, ModalRestriction
from aleafield.projection.semidiscrete import SemiDiscreteField
from aleafield.stepping import runge_kutta
from aleafield.stepping.schedule import Schedule
from tests.exactness import test_restriction, test_stepping
from tests.teeth.biting import Tooth, assert_bites, everywhere, member, teeth
from tests.teeth.faults import wrong_weight


def stage_left_out(
    system: Any, times: tuple[float, float, float], u: FloatArray, slope: FloatArray, stage: FloatArray
) -> FloatArray:
    """The midpoint rule: order 2."""
    start, middle, end = times
    return np.asarray(
        u + (end - start) * system.rate_of_change(middle, u + 0.5 * (end - start) * slope, middle)
    )


def outside(self: Any, t: float, u: FloatArray, inside: float | None = None) -> FloatArray:
    """The stages forget which side of a switch they are on."""
    return np.asarray(REAL_RATE(self, t, u, None))


REAL_RATE = SemiDiscreteField.rate_of_change
REAL_THROUGH = Schedule.through
SMOOTH, SWITCHED = ("exp(-x**2)*cos(t)", ()), ("exp(-x**2)*(t < 1.1)", (1.1,))


@teeth(
    *[
        Tooth(f"{fault.__name__}, seen by {check.__name__}", everywhere(runge_kutta._step, fault), check)
        for fault in (wrong_weight, stage_left_out)
        for check in (
            test_stepping.test_steps_have_order_four,
            test_stepping.test_steps_multiply_by_the_growth_factor,
        )
    ],
    Tooth(
        "a stage weight, seen by the order of a field",
        everywhere(runge_kutta._step, wrong_weight),
        lambda: test_stepping.test_order_four_across_switches_on_the_schedule(*SMOOTH),
    ),
    Tooth(
        "stages on the wrong side of a switch",
        member(SemiDiscreteField, "rate_of_change", outside),
        lambda: test_stepping.test_order_four_across_switches_on_the_schedule(*SWITCHED),
    ),
    Tooth(
        "an odd number of steps in a span",
        member(
            Schedule,
            "through",
            classmethod(lambda cls, times, step, duration: REAL_THROUGH(times, 2 * step, duration)),
        ),
        lambda: test_stepping.test_spans_have_an_even_number_of_equal_steps((20.0,), 0.5, 60.0, (40, 80)),
    ),
)
def test_steps(tooth: Tooth) -> None:
    assert_bites(tooth)


@teeth(
    Tooth(
        "a projection that takes the values for the unknowns",
        member(MassRestriction, "apply", lambda self, values: values[:, : len(self._diagonal)]),
        lambda: test_restriction.test_mass_restriction(test_restriction.DOMAINS[0], "simpson", 1, 8),
    ),
    Tooth(
        "inner products without the mass matrix",
        member(MassRestriction, "_solve", lambda self, load: load),
        lambda: test_restriction.test_mass_restriction(test_restriction.DOMAINS[1], "composite gauss", 1, 8),
    ),
    Tooth(
        "a spectral projection that is not applied",
        member(ModalRestriction, "apply", lambda self, values: values),
        test_restriction.test_modal_restriction_is_the_orthogonal_projection,
    ),
)
def test_projections(tooth: Tooth) -> None:
    assert_bites(tooth)
