"""Space and quadrature bounded together: planted cancellations, true and accidental."""

from __future__ import annotations

import numpy as np
import pytest

from aleafield.accounting import MEAN, Statement, quantile, split_error
from aleafield.accounting.statistic import Statistic
from tests.accounting.planted import PlantedField

Z = np.random.default_rng(5).normal(size=512)
SLOPE = np.array([0.05, 0.01, 0.0])


def stated(field: PlantedField, statistic: Statistic = MEAN, together: bool = True) -> Statement:
    """The statement with the parts of the field, and with both refined together or not."""
    parts = field.parts(Z)
    if together:
        parts.append(field.part("mesh", Z, expected_order=2.0))
    return split_error(field.sample(Z), parts, statistic, 0.95)


def bias(statement: Statement) -> float:
    """Stated bound of space and quadrature."""
    space, quadrature = statement.error["space"], statement.error["quadrature"]
    assert space is not None
    assert quadrature is not None
    return space + quadrature


@pytest.mark.parametrize("statistic", [MEAN, quantile(0.5)])
def test_parts_that_cancel_on_all_meshes_are_bounded_by_their_sum(statistic: Statistic) -> None:
    """C h^2 - C q^2 with h = q: the run has no error at all, each part has one of 0.05."""
    field = PlantedField(1.0, 0.3, {"space": (2.0, SLOPE), "quadrature": (2.0, -SLOPE)}, higher=0.0)
    apart, together = stated(field, statistic, together=False), stated(field, statistic)
    assert bias(apart) > 0.1
    assert bias(together) < 1e-9
    assert together.value == apart.value
    assert any("cancel" in note for note in together.notes)


def test_a_rest_of_the_cancellation_is_covered() -> None:
    """C h^2 - 0.8 C q^2: the error of the run is 0.2 C, and the bound is that times 1.25 / 3 * 3 / 4 more."""
    field = PlantedField(1.0, 0.3, {"space": (2.0, SLOPE), "quadrature": (2.0, -0.8 * SLOPE)}, higher=0.0)
    true = 0.2 * float(np.mean(np.polynomial.polynomial.polyval(Z, SLOPE)))
    found = bias(stated(field))
    assert true < found < 1.3 * true


def test_a_cancellation_on_one_mesh_alone_is_not_believed() -> None:
    """C h^2 - C' q^4 with C' such that a - c vanishes: the error of the run does not."""
    other = -SLOPE * (1 - 2.0**-2) / (1 - 2.0**-4)
    field = PlantedField(1.0, 0.3, {"space": (2.0, SLOPE), "quadrature": (4.0, other)}, higher=0.0)
    true = float(abs(np.mean(np.polynomial.polynomial.polyval(Z, SLOPE + other))))
    assert bias(stated(field)) > true


def test_a_sum_that_does_not_converge_is_not_used() -> None:
    """Orders 1/4 and 1/4 where 2 is expected: the bounds of the parts stand."""
    field = PlantedField(1.0, 0.3, {"space": (0.25, SLOPE), "quadrature": (0.25, -0.9 * SLOPE)}, higher=0.0)
    assert bias(stated(field)) == bias(stated(field, together=False))
