"""The formula language for any text: a value that arithmetic confirms, or one clear refusal."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from aleafield.errors import InputError
from aleafield.formula import Formula
from tests.properties.formula_strategies import FRAGMENTS, KNOWN_FORMULAS, Known

ATTACKS = {
    "().__class__.__bases__[0].__subclasses__()": "attribute",
    "__import__('os').system('true')": "attribute",
    "__import__('os')": "unknown function __import__",
    "open('/etc/passwd').read()": "attribute",
    "open('/etc/passwd')": "unknown function open",
    "eval('1')": "unknown function eval",
    "exec('a = 1')": "unknown function exec",
    "getattr(a, 'real')": "unknown function getattr",
    "globals()": "unknown function globals",
    "print(a)": "unknown function print",
    "a.real": "attribute",
    "a.__class__": "attribute",
    "(1).__class__": "attribute",
    "np.exp(a)": "write exp(...)",
    "sin.__globals__": "attribute",
    "a[0]": "index",
    "[a][0]": "index",
    "[a for a in b]": "loop",
    "{a for a in b}": "loop",
    "{a: 1 for a in b}": "loop",
    "exp(a for a in b)": "loop",
    "[1, 2]": "list",
    "{1, 2}": "brace",
    "{1: 2}": "brace",
    "1, 2": "decimal point",
    "1,5 * a": "decimal point",
    "()": "comma",
    "'a'": "no text",
    "b'a'": "no text",
    "f'{a}'": "no text",
    "'a' * 1000000000": "no text",
    "lambda: 1": "lambda",
    "(lambda: 1)()": "lambda",
    "lambda * 2": "rename it",
    "(a := 1)": "':='",
    "a = 1": "write == to compare",
    "a; b": "cannot be read",
    "import os": "'import' is no name",
    "await a": "Await",
    "(yield)": "Yield",
    "exp(*a)": "star",
    "exp(a=1)": "keyword",
    "exp(**a)": "keyword",
    "exp()": "exp takes 1 argument",
    "exp(1, 2)": "exp takes 1 argument",
    "maximum(1, 2, 3)": "maximum(a, maximum(b, c))",
    "where(a, 1)": "where takes 3 arguments",
    "exp": "write exp(a)",
    "exp(a)(b)": "write * for a product",
    "2(a)": "write * for a product",
    "(a + 1)(b)": "write * for a product",
    "a(b)": "write a*(...)",
    "2a": "write * for every product",
    "a b": "write * for every product",
    "exq(a)": "did you mean 'exp'",
    "ln(a)": "write log(a)",
    "max(a, 1)": "write maximum(a, b)",
    "a if b else c": "write where(b, a, c)",
    "1if a else 2": "write where(a, 1, 2)",
    "a and b": "write (a) * (b)",
    "a or b": "write maximum(a, b)",
    "not a": "write 1 - (a)",
    "~a": "write 1 - (a)",
    "a && b": "maximum(a, b) for 'or'",
    "a in b": "write == or !=",
    "a is not b": "write == or !=",
    "a ^ 2": "write (a)**(2)",
    "a % 2": "no remainder",
    "a // 2": "write (a) / (2)",
    "a @ b": "write (a) * (b)",
    "a & b": "write (a) * (b)",
    "a | b": "write maximum(a, b)",
    "a << 2": "2**(2)",
    "a >> 2": "2**(2)",
    "True": "write 1",
    "False": "write 0",
    "None": "None",
    "...": "Ellipsis",
    "1j": "numbers are real",
    "1e999": "1.8e308",
    "9" * 1999: "1.8e308",
    "0777": "cannot be read",
    "uniform(0, 1)": "name it in [parameters]",
    "2 * normal(0, 1) + 1": "name it in [parameters]",
    "": "write 0",
    " \n\t ": "write 0",
    "a # all of it": "comment",
    "a \\ b": "cannot be read",
    "a\0": "character",
    "a\ud800": "character",
    "\u2212a": "write -",
    "a\u00b2": "write **2",
    "a\u00b7b": "write *",
    "\u03b1 + 1": "letters",
    "\uff41": "letters",
    "((a)": "2 opening and 1 closing",
    "a)": "0 opening and 1 closing",
    "(" * 300 + "a" + ")" * 300: "nesting",
    "(" * 999 + "a" + ")" * 999: "nesting",
    "(-" * 60 + "a" + ")" * 60: "nesting",
    "-" * 1999 + "a": "300",
    "exp(" * 60 + "a" + ")" * 60: "nesting",
    "a**" * 60 + "a": "nesting",
    " + ".join(["a"] * 200): "300",
    "a<" * 999 + "a": "300",
    "a" * 2001: "2001 characters",
    "(a<" * 33 + "a" + "<a)" * 33 + "<(a": "opening",
}


@pytest.mark.parametrize("text", ATTACKS)
def test_whatever_is_not_a_formula_is_refused_with_the_way_out(text: str) -> None:
    with pytest.raises(InputError) as caught:
        Formula(text, "drive.formula")
    assert ATTACKS[text] in str(caught.value)
    assert caught.value.key == "drive.formula"
    assert len(str(caught.value)) < 400
    assert str(caught.value).isprintable()


def test_nested_chains_do_not_grow_the_work() -> None:
    """Each middle operand is evaluated once; twice would take 2^30 evaluations here."""
    text = "a"
    for _ in range(30):
        text = f"(b < {text} < c)"
    assert Formula(text).evaluate({"a": 1.0, "b": 0.0, "c": 2.0}) == 1.0


def test_only_text_is_a_formula() -> None:
    with pytest.raises(InputError, match="3 instead of a formula"):
        Formula(3)  # type: ignore[arg-type]


@settings(deadline=None)
@given(KNOWN_FORMULAS, st.floats(-50, 50), st.floats(-50, 50))
def test_value_is_that_of_plain_arithmetic(known: Known, a: float, b: float) -> None:
    """Add, subtract, multiply, divide and compare are correctly rounded by IEEE 754, so to the bit."""
    value = Formula(known.text).evaluate({"a": a, "b": b})
    np.testing.assert_array_equal(value, known.value(a, b))


@settings(deadline=None)
@given(KNOWN_FORMULAS, st.lists(st.floats(-50, 50), min_size=1, max_size=5), st.floats(-50, 50))
def test_arrays_are_evaluated_element_by_element(known: Known, a: list[float], b: float) -> None:
    formula = Formula(known.text)
    value = formula.evaluate({"a": np.array(a), "b": b})
    np.testing.assert_array_equal(
        np.broadcast_to(value, (len(a),)), [formula.evaluate({"a": entry, "b": b}) for entry in a]
    )


def check_outcome(text: str) -> None:
    """A text is a formula that has a value, or is refused by a printable message; nothing else happens."""
    try:
        formula = Formula(text)
    except InputError as refusal:
        message = str(refusal)
    else:
        value = formula.evaluate(dict.fromkeys(formula.names, 0.5))
        assert isinstance(value, float)
        message = repr(formula)
    assert message.isprintable()


@settings(deadline=None)
@given(FRAGMENTS, st.sampled_from(["", " "]))
def test_any_text_is_a_formula_or_one_printable_refusal(fragments: list[str], between: str) -> None:
    check_outcome(between.join(fragments))


@settings(deadline=None)
@given(st.text(max_size=60))
def test_no_text_at_all_escapes(text: str) -> None:
    check_outcome(text)
