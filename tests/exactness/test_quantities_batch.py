"""A sample's number has the same bits whatever stands beside it; failed samples give NaN and disturb "
"nobody."""

from __future__ import annotations

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.field.formula_term import FormulaTerm
from aleafield.formula import Formula
from aleafield.geometry import Domain
from aleafield.quantities import (
    ActiveWidth,
    Displacement,
    EffectiveDiffusion,
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
from aleafield.spaces import Space
from aleafield.stepping.view import StepView
from tests.exactness.trajectories import PAIRS, Result, measures, random_elements, result_of, space_of

SAMPLES = 24
TIMES = (0.0, 0.4, 1.0)
WINDOW = Over(0.0, 1.0, "maximum")


def term(text: str) -> FormulaTerm:
    return FormulaTerm(Formula(text))


def quantities(domain: Domain, level: FloatArray) -> list[Quantity]:
    """Every measure that the domain has, at one time and over a window."""
    everywhere: list[Quantity] = [
        Value("a", 0.37),
        Mean("b"),
        Integral("c"),
        Norm("d", WINDOW),
        Maximum("e"),
        Minimum("f", WINDOW),
        PeakPosition("g", 0.5),
        ActiveWidth("h", level),
        ActiveWidth("i", level, WINDOW),
        TimeToLevel("j", level, 0.37),
        FormulaQuantity("k", term("u**2 + x * (t < 2)"), "mean", None, WINDOW),
        FormulaQuantity("l", term("sin(u)"), "maximum"),
        FormulaQuantity("m", term("(u > 0) + t"), "value", 0.37),
        FunctionQuantity("n", largest_nodal_value),
        Displacement("s", (0.0, 1.0)),
        EffectiveDiffusion("t", (0.4, 1.0)),
    ]
    if domain.periodic:
        return [*everywhere, SpectralPower("o", 2, WINDOW)]
    return [
        *everywhere,
        FrontPosition("p", level),
        FrontPosition("q", level, "left", WINDOW),
        FrontSpeed("r", level, (0.4, 1.0)),
    ]


def largest_nodal_value(u: FloatArray, x: FloatArray) -> FloatArray:
    assert np.isfinite(u).all(), "failed samples are handed over as zeros"
    return np.asarray(u.max(axis=1))


def states(space: Space) -> list[FloatArray]:
    """States at the times and, after them, their derivatives."""
    rng = np.random.default_rng(31)
    return [random_elements(space, rng, SAMPLES) for _ in range(2 * len(TIMES))]


def run(quantity: Quantity, space: Space, fields: list[FloatArray]) -> Result:
    u, du = fields[: len(TIMES)], fields[len(TIMES) :]
    steps = [
        StepView(TIMES[k], u[k], du[k], TIMES[k + 1], u[k + 1], du[k + 1]) for k in range(len(TIMES) - 1)
    ]
    return result_of(quantity, space, steps)


def check_equal(found: Result, expected: Result, rows: FloatArray) -> None:
    """Bits of values and margins: found[k] and expected[rows[k]]."""
    np.testing.assert_array_equal(found[0], expected[0][rows])
    assert (found[1] is None) == (expected[1] is None)
    if found[1] is not None and expected[1] is not None:
        np.testing.assert_array_equal(found[1], expected[1][rows])


@pytest.mark.parametrize("pair", PAIRS)
def test_every_measure_is_tried(pair: tuple[str, Domain]) -> None:
    tried = {q.measure for domain in {p[1] for p in PAIRS} for q in quantities(domain, np.zeros(1))}
    assert tried == set(measures())


@pytest.mark.parametrize("pair", PAIRS)
def test_rows_do_not_depend_on_one_another(pair: tuple[str, Domain]) -> None:
    space = space_of(pair, 21)
    fields = states(space)
    level = np.linspace(-0.5, 1.0, SAMPLES)
    shuffled = np.random.default_rng(37).permutation(SAMPLES)
    for rows in (shuffled, np.arange(8, 16), shuffled[:16]):
        for whole, part in zip(
            quantities(space.domain, level), quantities(space.domain, level[rows]), strict=True
        ):
            found = run(part, space, [np.ascontiguousarray(f[rows]) for f in fields])
            check_equal(found, run(whole, space, fields), rows)


@pytest.mark.parametrize("pair", PAIRS)
def test_failed_samples_give_nan_and_disturb_nobody(pair: tuple[str, Domain]) -> None:
    """From the middle of the run on three samples are NaN, infinite, or NaN at one unknown.

    Warnings are errors here.
    """
    space = space_of(pair, 21)
    sound = states(space)
    level = np.linspace(-0.5, 1.0, SAMPLES)
    spoilt = [f.copy() for f in sound]
    for k in (1, 2, 4, 5):
        spoilt[k][3] = np.nan
        spoilt[k][10] = np.inf
        spoilt[k][17, 10] = np.nan
    failed = np.array([3, 10, 17])
    others = np.setdiff1d(np.arange(SAMPLES), failed)
    for quantity in quantities(space.domain, level):
        values, margin = run(quantity, space, spoilt)
        expected = run(quantity, space, sound)
        check_equal((values[others], None if margin is None else margin[others]), expected, others)
        # a point looks at its neighbours only: one bad unknown elsewhere is not its own
        seen = failed[:2] if isinstance(quantity, TimeToLevel) else failed
        assert np.isnan(values[seen]).all(), quantity
        if margin is not None:
            assert not np.any(margin[seen] >= 0), quantity
