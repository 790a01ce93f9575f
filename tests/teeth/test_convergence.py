"""Faults that lower an order of convergence or announce a wrong one, which convergence tests must see."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.projection.pairing import Pairing, resolve
from aleafield.projection.scheme import Scheme
from aleafield.quadrature import crossing_weights
from aleafield.quantities.cubic import Cubic
from aleafield.quantities.peaks import Peak, parabolic_peak
from aleafield.spaces import PiecewiseLinear
from aleafield.stepping.view import StepView
from tests.convergence import order_table, test_field_convergence, test_projection, test_quantity_orders
from tests.convergence.field_orders import CASES
from tests.teeth.biting import Check, Tooth, assert_bites, everywhere, member, teeth
from tests.teeth.faults import nodal_sampling


def highest_node(values: FloatArray, points: FloatArray, _: Any) -> Peak:
    """The interpolant peaks at a node: its position does not converge at order 2."""
    return Peak(points[values.argmax(axis=1)], values.max(axis=1))


def straight(self: StepView, theta: float) -> FloatArray:
    """A chord in the place of the cubic Hermite interpolant."""
    return (1.0 - theta) * self.u0 + theta * self.u1


def chord(cls: type[Cubic], v0: FloatArray, _: FloatArray, v1: FloatArray, __: FloatArray) -> Cubic:
    """The derivatives at the ends of a step are not used."""
    nothing = np.zeros_like(v0)
    return cls(v0, v1, v1 - v0, nothing, nothing)


def announced(order: float) -> Any:
    """The same pairing with another expected order in space."""

    def faulty(scheme: Scheme, equation: Any) -> Pairing:
        found = resolve(scheme, equation)
        return replace(found, space=replace(found.space, order=order))

    return faulty


def nearest_node(self: PiecewiseLinear, u: FloatArray, x: FloatArray) -> FloatArray:
    """Values of the nearest node in the place of the linear interpolant."""
    return u @ np.round(self.evaluation_matrix(x)).T


def orders_of(domain: str, case: int, projector: str = "piecewise linear") -> Check:
    """One row of the table of orders."""
    scheme = Scheme(projector, "collocation", 65, "matched")  # type: ignore[arg-type]
    return lambda: test_field_convergence.test_orders_are_as_announced_and_as_documented(
        domain, scheme, CASES[domain][case]
    )


def on_a_line(name: str) -> Check:
    """The order of one measure under piecewise linear fields."""
    return lambda: test_quantity_orders.test_orders_of_piecewise_linear_fields_on_an_interval(name)


READ_ROWS = order_table.read_rows


@teeth(
    Tooth(
        "a step rate sampled at the nodes",
        everywhere(crossing_weights, nodal_sampling),
        orders_of("interval", 2),
    ),
    Tooth("an order announced too high", everywhere(resolve, announced(3.0)), orders_of("interval", 0)),
    Tooth("an order announced too low", everywhere(resolve, announced(1.0)), orders_of("ring", 1)),
    Tooth(
        "a page of orders that says something else",
        everywhere(
            order_table.read_rows,
            lambda text: {key: ("9.9", *row[1:]) for key, row in READ_ROWS(text).items()},
        ),
        orders_of("interval", 0),
    ),
    Tooth(
        "the position of the highest node",
        everywhere(parabolic_peak, highest_node),
        on_a_line("peak position"),
    ),
    Tooth("the height of the highest node", everywhere(parabolic_peak, highest_node), on_a_line("maximum")),
    Tooth(
        "a chord in time, seen by a first passage",
        member(Cubic, "hermite", classmethod(chord)),
        lambda: test_quantity_orders.test_the_time_to_a_level_is_of_order_four_in_the_step("chebyshev"),
    ),
    Tooth(
        "a chord in time, seen by a mean over a window",
        member(StepView, "state", straight),
        lambda: test_quantity_orders.test_windows_are_of_order_four_in_the_step("active width", "mean"),
    ),
    Tooth(
        "values of the nearest node",
        member(PiecewiseLinear, "evaluate", nearest_node),
        lambda: test_projection.test_piecewise_linear_interpolation_is_of_order_two(
            test_projection.CIRCLE, [8, 16, 32, 64, 128]
        ),
    ),
)
def test_orders(tooth: Tooth) -> None:
    assert_bites(tooth)
