"""Faults that the property tests must see: formulas that run, rows that see others, studies that crash."""

from __future__ import annotations

import ast
from typing import Any

import numpy as np

from aleafield.errors import InputError
from aleafield.formula import Formula, parser
from aleafield.formula.language import BINARY, FUNCTION_TABLE
from aleafield.formula.parser import Push, _Compiler
from tests.exactness import test_formula
from tests.properties import test_formula_properties
from tests.teeth.biting import Tooth, assert_bites, member, teeth


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
            lambda text=text: (
                test_formula_properties.test_whatever_is_not_a_formula_is_refused_with_the_way_out(text)
            ),
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
