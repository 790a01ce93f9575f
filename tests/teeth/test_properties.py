"""Faults that the property tests must see: formulas that run, rows that see others, studies that crash."""

from __future__ import annotations

import ast
from functools import partial
from typing import Any

import numpy as np

from aleafield.arrays import batch_product
from aleafield.errors import InputError
from aleafield.formula import Formula, parser
from aleafield.formula.language import BINARY, FUNCTION_TABLE
from aleafield.formula.parser import Push, _Compiler
from aleafield.projection.semidiscrete import SemiDiscreteField
from aleafield.stepping import failure
from tests.exactness import test_formula
from tests.properties import test_batches, test_formula_properties
from tests.teeth.biting import Check, Tooth, assert_bites, everywhere, member, teeth
from tests.teeth.faults import place_decides, width_decides


def accepts_all(self: Any, node: Any, depth: int) -> None:
    """Whatever is not on the list counts as 0 (it is read, not executed)."""
    try:
        REAL_WRITE(self, node, depth)
    except InputError:
        self.program.append(Push(np.float64(0.0)))


REAL_WRITE = _Compiler._write


@teeth(
    *[
        Tooth(
            f"a formula that takes {text!r}",
            member(_Compiler, "_write", accepts_all),
            partial(test_formula_properties.test_whatever_is_not_a_formula_is_refused_with_the_way_out, text),
        )
        for text in (
            *("a.real", "().__class__.__bases__[0].__subclasses__()", "__import__('os').system('true')"),
            *("eval('1')", "a[0]", "(lambda: 1)()", "'a' * 1000000000", "[a for a in b]", "a if b else c"),
        )
    ],
    Tooth(
        "a function that was let in",
        lambda patch: patch.setitem(FUNCTION_TABLE, "eval", FUNCTION_TABLE["exp"]),
        lambda: test_formula_properties.test_whatever_is_not_a_formula_is_refused_with_the_way_out(
            "eval('1')"
        ),
    ),
    Tooth(
        "a cap on the nesting that is lifted",
        member(parser, "DEEPEST", 10**6),
        lambda: test_formula_properties.test_whatever_is_not_a_formula_is_refused_with_the_way_out(
            "exp(" * 60 + "a" + ")" * 60
        ),
    ),
    Tooth(
        "a power taken for a product",
        lambda patch: patch.setitem(BINARY, ast.Pow, np.multiply),
        lambda: test_formula.test_scalars_and_arrays_agree_with_plain_arithmetic("2**a**2", 1.5),
    ),
    Tooth(
        "a switch decided by the time of the stage",
        member(
            Formula, "evaluate", lambda self, values, inside=None, real=Formula.evaluate: real(self, values)
        ),
        test_formula.test_compared_time_is_taken_from_inside_the_step,
    ),
)
def test_formulas(tooth: Tooth) -> None:
    assert_bites(tooth)


def rows_alone(operator: str) -> Check:
    """The bits of a row under one operator."""
    case = next(case for case in test_batches.CASES if case.operator == operator)
    return lambda: test_batches.test_rows_do_not_depend_on_the_batch(case)


def first_failure_stops_all(failed_at: Any, time: float, *arrays: Any) -> None:
    """One sample that is not finite makes all of its batch fail."""
    if not all(np.isfinite(array).all() for array in arrays):
        failed_at[np.isnan(failed_at)] = time
        for array in arrays:
            array[:] = np.nan


BLOW_UP: Check = lambda: test_batches.test_a_sample_that_blows_up_disturbs_no_other("chebyshev")  # noqa: E731


@teeth(
    Tooth(
        "a plain matrix product, bits by the width of the batch",
        everywhere(batch_product, width_decides),
        rows_alone("shared dense"),
    ),
    Tooth(
        "a plain matrix product, bits by the place in the batch",
        everywhere(batch_product, place_decides),
        rows_alone("shared dense"),
    ),
    Tooth(
        "a number of the whole batch in every row",
        member(
            SemiDiscreteField,
            "rate_of_change",
            lambda self, t, u, inside=None, real=SemiDiscreteField.rate_of_change: (
                real(self, t, u, inside) + 1e-15 * np.abs(u).max()
            ),
        ),
        rows_alone("toeplitz"),
    ),
    Tooth(
        "a failure that is not noted",
        everywhere(failure.freeze, lambda failed_at, time, *arrays: None),
        BLOW_UP,
    ),
    Tooth("a failure that spoils its batch", everywhere(failure.freeze, first_failure_stops_all), BLOW_UP),
)
def test_batches_of_samples(tooth: Tooth) -> None:
    assert_bites(tooth)
