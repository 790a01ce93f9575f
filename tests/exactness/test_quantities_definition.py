"""What a study says of its quantities: names, units, inputs, times, points, and what is refused."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np
import pytest

from aleafield.errors import InputError
from aleafield.field.formula_term import FormulaTerm
from aleafield.field.parameter import Binding
from aleafield.formula import Formula
from aleafield.quantities import (
    ActiveWidth,
    At,
    Displacement,
    EffectiveDiffusion,
    FormulaQuantity,
    FrontPosition,
    FrontSpeed,
    FunctionQuantity,
    Integral,
    Maximum,
    Mean,
    Norm,
    Over,
    PeakPosition,
    Quantity,
    SpectralPower,
    TimeToLevel,
    Value,
)
from aleafield.randomness.laws import parse_law
from aleafield.spaces import make_space
from aleafield.units import Units
from tests.exactness.trajectories import INTERVAL, RING, measures

UNITS = Units("mm", "ms", "mV")
TERM = FormulaTerm(Formula("a * u"), {"a": 2.0})


def test_every_measure_has_a_name_first_and_its_time_last() -> None:
    """Those of a study file, and functions from Python, whose unit stands after the time."""
    found = measures()
    assert set(found) == {
        "value",
        "mean",
        "maximum",
        "minimum",
        "peak position",
        "norm",
        "integral",
        "active width",
        "front position",
        "front speed",
        "time to level",
        "spectral power",
        "formula",
        "function",
        "displacement",
        "effective diffusion",
    }
    for measure in found.values():
        names = [spec.name for spec in dataclasses.fields(measure)]  # type: ignore[arg-type]
        assert names[0] == "name"
        assert "when" not in names[: -2 if measure is FunctionQuantity else -1]


@pytest.mark.parametrize(
    ("quantity", "units", "may_not_occur"),
    [
        (Value("q", 0.0), "mV", False),
        (Mean("q"), "mV", False),
        (Maximum("q"), "mV", False),
        (Norm("q"), "mV", False),
        (Integral("q"), "mV mm", False),
        (PeakPosition("q"), "mm", False),
        (ActiveWidth("q", 0.1), "mm", True),
        (FrontPosition("q", 0.1), "mm", True),
        (FrontSpeed("q", 0.1, (0.0, 1.0)), "mm ms-1", True),
        (TimeToLevel("q", 0.1, 0.0), "ms", True),
        (SpectralPower("q", 1), "mV2", False),
        (FormulaQuantity("q", TERM), "1", False),
        (Displacement("q", (0.0, 1.0)), "mm", False),
        (EffectiveDiffusion("q", (0.0, 1.0)), "mm2 ms-1", False),
    ],
)
def test_units_and_occurrence(quantity: Quantity, units: str, may_not_occur: bool) -> None:
    assert UNITS.derived(quantity.dimension) == units
    assert quantity.may_not_occur is may_not_occur
    assert UNITS.derived(quantity.history_dimension) == (
        "mm" if isinstance(quantity, EffectiveDiffusion) else units
    )
    for domain in (INTERVAL, RING):
        wandering = isinstance(quantity, Displacement | EffectiveDiffusion) and domain is INTERVAL
        of_peak = isinstance(quantity, PeakPosition) or wandering
        assert quantity.is_peak_position(domain) is of_peak
        assert quantity.takes_extremum(domain) is (of_peak or isinstance(quantity, Maximum))


def test_a_level_may_be_a_law_or_an_expression() -> None:
    law = parse_law("uniform(0.1, 0.3)", "level", None)
    assert law is not None
    quantity = ActiveWidth("wide", law)
    assert [(u.path, u.law) for u in quantity.uncertain("quantity.wide")] == [("quantity.wide.level", law)]
    drawn = np.array([0.1, 0.2])
    assert quantity.bind("quantity.wide", Binding({"quantity.wide.level": drawn}, {})).level is drawn
    shared = ActiveWidth("wide", Formula("2 * h"))
    assert list(shared.uncertain("quantity.wide")) == []
    np.testing.assert_array_equal(shared.bind("quantity.wide", Binding({}, {"h": drawn})).level, 2 * drawn)


def test_a_law_beside_a_formula_is_an_input() -> None:
    law = parse_law("normal(1, 0.1)", "a", None)
    assert law is not None
    quantity = FormulaQuantity("gain", FormulaTerm(Formula("a * u"), {"a": law}))
    assert [u.path for u in quantity.uncertain("quantity.gain")] == ["quantity.gain.a"]


@pytest.mark.parametrize(
    ("quantity", "times"),
    [
        (Mean("q"), (10.0,)),
        (Mean("q", At(4.0)), (4.0,)),
        (Mean("q", Over(2.0, 5.0, "mean")), (2.0, 5.0)),
        (FrontSpeed("q", 0.1, (3.0, 7.0)), (3.0, 7.0)),
        (TimeToLevel("q", 0.1, 0.0), (10.0,)),
        (Displacement("q", (0.0, 7.0)), (0.0, 7.0)),
    ],
)
def test_times_for_the_schedule(quantity: Quantity, times: tuple[float, ...]) -> None:
    assert quantity.times(10.0) == times


def test_points_off_the_nodes() -> None:
    """Nodes of 15 on [-3, 4] are the multiples of 1/2, of 29 those of 1/4."""
    coarse, fine = (make_space("piecewise linear", INTERVAL, n) for n in (15, 29))
    spectral = make_space("chebyshev", INTERVAL, 15)
    formula = FormulaQuantity("q", TERM, "value", 0.25)
    assert not Value("q", 0.5).off_the_nodes((coarse, fine))
    assert not Value("q", 0.5 + 1e-12).off_the_nodes((coarse, fine))
    assert Value("q", 0.25).off_the_nodes((coarse, fine))
    assert Value("q", 0.6).off_the_nodes((coarse,))
    assert not Value("q", 0.25).off_the_nodes((fine,))
    assert not Value("q", 0.3).off_the_nodes((spectral,))
    assert TimeToLevel("q", 0.1, 0.25).off_the_nodes((coarse,))
    assert formula.off_the_nodes((coarse,))
    assert not FormulaQuantity("q", TERM).off_the_nodes((coarse,))
    assert not Value("q", RING.high).off_the_nodes((make_space("piecewise linear", RING, 14),)), (
        "low, the same point"
    )


@pytest.mark.parametrize(
    ("quantity", "message"),
    [
        (Mean("q", At(11.0)), "quantity.q.time: time 11; a time from 0 to the duration 10"),
        (Mean("q", At(-1.0)), "quantity.q.time: time -1; "),
        (Mean("q", Over(3.0, 3.0, "mean")), r"quantity.q.over: \[3, 3\]; the second time must be the later"),
        (Mean("q", Over(3.0, 30.0, "mean")), "quantity.q.over: time 30; "),
        (Mean("q", Over(3.0, 4.0, "median")), "quantity.q.reduce: 'median'; one of maximum, minimum, mean"),  # type: ignore[arg-type]
        (FrontSpeed("q", 0.1, (5.0, 4.0)), r"quantity.q.between: \[5, 4\]; "),
        (EffectiveDiffusion("q", (5.0, 40.0)), "quantity.q.between: time 40; "),
    ],
)
def test_times_that_cannot_be(quantity: Quantity, message: str) -> None:
    with pytest.raises(InputError, match=message):
        quantity.times(10.0)


@pytest.mark.parametrize(
    ("quantity", "domain", "message"),
    [
        (Value("q", 5.0), INTERVAL, "quantity.q.at: 5; a point of the domain, from -3 to 4"),
        (Value("q", float("nan")), INTERVAL, "quantity.q.at: nan; "),
        (TimeToLevel("q", 0.1, -4.0), RING, "quantity.q.at: -4; a point of the domain, from -3.5 to 3.5"),
        (FormulaQuantity("q", TERM, "value", 9.0), INTERVAL, "quantity.q.at: 9; "),
        (FrontPosition("q", 0.1), RING, "quantity.q.measure: 'front position' on a ring; "),
        (FrontSpeed("q", 0.1, (0.0, 1.0)), RING, "quantity.q.measure: 'front speed' on a ring; "),
        (FrontPosition("q", 0.1, "up"), INTERVAL, "quantity.q.side: 'up'; 'right' or 'left'"),  # type: ignore[arg-type]
        (SpectralPower("q", 1), INTERVAL, "quantity.q.measure: 'spectral power' on an interval; a ring"),
    ],
)
def test_domains_without_the_measure(quantity: Quantity, domain: Any, message: str) -> None:
    space = make_space("piecewise linear", domain, 9)
    with pytest.raises(InputError, match=message):
        quantity.refuse_domain(domain)
    with pytest.raises(InputError, match=message):
        quantity.observer(space, 1.0)


@pytest.mark.parametrize(
    ("in_space", "at", "message"),
    [
        ("median", None, "quantity.q.in_space: 'median'; one of mean, maximum, integral, value"),
        ("value", None, "quantity.q.at: no point given; "),
        ("mean", 0.5, "quantity.q.at: 0.5 given; "),
    ],
)
def test_formulas_that_cannot_be(in_space: Any, at: float | None, message: str) -> None:
    with pytest.raises(InputError, match=message):
        FormulaQuantity("q", TERM, in_space, at)
