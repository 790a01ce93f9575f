"""Formulas against Python's own arithmetic and the math module."""

from __future__ import annotations

import math
import pickle
from collections.abc import Callable

import numpy as np
import pytest

from aleafield.errors import InputError
from aleafield.field.formula_term import FormulaTerm
from aleafield.formula import FUNCTIONS, LAW_NAMES, RESERVED, Formula, constant, nearest_name, order_of

ORACLES: dict[str, Callable[[float], float]] = {
    "abs(a)": abs,
    "sqrt(a)": math.sqrt,
    "exp(a)": math.exp,
    "log(a)": math.log,
    "sin(a)": math.sin,
    "cos(a)": math.cos,
    "tan(a)": math.tan,
    "sinh(a)": math.sinh,
    "cosh(a)": math.cosh,
    "tanh(a)": math.tanh,
    "arctan(a)": math.atan,
    "erf(a)": math.erf,
    "sign(a)": lambda a: math.copysign(1.0, a),
    "minimum(a, 1)": lambda a: min(a, 1.0),
    "maximum(a, 1)": lambda a: max(a, 1.0),
    "where(a > 1, 2*a, 3*a)": lambda a: 2 * a if a > 1 else 3 * a,
    "-a**2": lambda a: -(a**2),
    "2**-a": lambda a: 2.0**-a,
    "2**a**2": lambda a: 2.0 ** (a**2),
    "1 - a - 2": lambda a: 1 - a - 2,
    "8 / a / 2": lambda a: 8 / a / 2,
    "+a - -a": lambda a: 2 * a,
    "1_0 * a + 0x10": lambda a: 10 * a + 16,
    "pi * a + e": lambda a: math.pi * a + math.e,
    "1 + (a < 2)": lambda a: 1.0 + (a < 2),
    "0 < a <= 1.5 < 4": lambda a: float(0 < a <= 1.5),
    "(a == 1.5) + 2*(a != 1.5)": lambda a: 1.0 if a == 1.5 else 2.0,
    "(a >= 1.5) - (a > 1.5)": lambda a: float(a == 1.5),
}


@pytest.mark.parametrize("text", ORACLES)
@pytest.mark.parametrize("a", [0.25, 1.0, 1.5, 2.75])
def test_scalars_and_arrays_agree_with_plain_arithmetic(text: str, a: float) -> None:
    """Functions are right to the last two bits of double precision, on numbers as on arrays."""
    formula = Formula(text)
    expected = ORACLES[text](a)
    value = formula.evaluate({"a": a})
    assert type(value) is float
    assert value == pytest.approx(expected, rel=5e-16, abs=1e-16)
    array = formula.evaluate({"a": np.full((3, 2), a)})
    assert isinstance(array, np.ndarray)
    assert array.shape == (3, 2)
    np.testing.assert_allclose(array, expected, rtol=5e-16, atol=1e-16)


def test_every_function_has_an_oracle() -> None:
    assert {text.split("(")[0] for text in ORACLES if "(" in text} >= FUNCTIONS


def test_values_broadcast() -> None:
    value = Formula("s * x + t").evaluate({"s": np.array([[1.0], [2.0]]), "x": np.arange(3.0), "t": 1})
    np.testing.assert_array_equal(value, [[1, 2, 3], [1, 3, 5]])


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("0 / a", math.nan),
        ("1 / a", math.inf),
        ("-1 / a", -math.inf),
        ("(a - 8)**(1/3)", math.nan),
        ("log(a)", -math.inf),
        ("log(a - 1)", math.nan),
        ("sqrt(a - 1)", math.nan),
        ("a**-1", math.inf),
        ("10**400 - 10**400", math.nan),
        ("where(a > 0, 1/a, 7)", 7.0),
        ("where(a > 0, exp(1000), 7)", 7.0),
        ("where(0 / a, 1, 2)", math.nan),
        ("(0 / a) < 1", 0.0),
    ],
)
def test_what_arithmetic_cannot_say_is_a_value_and_no_exception(text: str, expected: float) -> None:
    """IEEE 754: no warning either, since the test run turns warnings into errors."""
    for a in (0.0, np.zeros(3)):
        np.testing.assert_array_equal(Formula(text).evaluate({"a": a}), expected)


def test_result_does_not_depend_on_how_values_lie_in_memory() -> None:
    formula = Formula("exp(-a**2) * tanh(a) + sin(a)**1.3")
    table = np.linspace(0.1, 3.0, 999).reshape(333, 3)
    np.testing.assert_array_equal(
        formula.evaluate({"a": table[:, 1:2]}), formula.evaluate({"a": table[:, 1:2].copy()})
    )


def test_compared_time_is_taken_from_inside_the_step() -> None:
    """Only where t stands bare in a comparison; elsewhere it is the time of the stage."""
    formula = Formula("(t < 20) + 100 * t + (5 < t <= 30)")
    assert formula.evaluate({"t": 20.0}) == 2001.0
    assert formula.evaluate({"t": 20.0}, inside=19.75) == 2002.0
    assert formula.evaluate({"t": 30.0}, inside=30.25) == 3000.0
    assert Formula("t + 0 < 20").evaluate({"t": 20.0}, inside=19.75) == 0.0


@pytest.mark.parametrize(
    ("text", "switches", "mixed"),
    [
        ("a * (t < 20)", ["20"], False),
        ("(t_on <= t) * (t < t_on + 5) * x", ["t_on", "t_on + 5"], False),
        ("5 < t < 10", ["5", "10"], False),
        ("(t < 20) + (20 > t)", ["20"], False),
        ("x < t", [], True),
        ("t < 5 + u", [], True),
        ("2 * t < 20", [], True),
        ("where(t < 3, x, 0) + sin(t)", ["3"], False),
        ("sign(t - 3)", [], True),
        ("where(t - 3, 1, 2)", [], True),
        ("sign(t < 3)", ["3"], False),
        ("exp(-t) * (x < 1)", [], False),
        ("abs(t - 3)", [], False),
    ],
)
def test_switching_times_are_found(text: str, switches: list[str], mixed: bool) -> None:
    formula = Formula(text)
    assert [switch.text for switch in formula.switches()] == switches
    assert formula.mixed_switches is mixed


@pytest.mark.parametrize(
    ("text", "kinked"),
    [
        ("abs(x - 1)", True),
        ("x * sign(a)", False),
        ("maximum(0, u + x)", True),
        ("where(t < 5, x**2, 0)", False),
        ("where(x < 5, 1, 0)", True),
        ("where(x, 1, 0)", True),
        ("1 < x < 2", True),
        ("exp(-x**2) * (t < 5)", False),
    ],
)
def test_kinks_in_a_variable(text: str, kinked: bool) -> None:
    assert Formula(text).kinks_in("x") is kinked


@pytest.mark.parametrize(
    ("text", "degree"),
    [
        ("3 * a + e", 0),
        ("u", 1),
        ("-u + 2 * x - (a * u) / (1 + x**2)", 1),
        ("u * u - u", 2),
        ("(1 - u)**3 * u", 4),
        ("(u**2)**1.0", 2),
        ("u**0 + 1", 0),
        ("exp(x)**a", 0),
        ("u - u", 1),
        ("u * (t < 3)", 1),
        ("where(x > 0, u**2, u)", 2),
        ("where(u > 0, 1, 2)", math.inf),
        ("(u > 0)", math.inf),
        ("abs(u)", math.inf),
        ("u**2 / u", math.inf),
        ("u**-1", math.inf),
        ("u**0.5", math.inf),
        ("u**a", math.inf),
        ("2**u", math.inf),
        ("0 * exp(u)", math.inf),
        ("maximum(x, u)", math.inf),
    ],
)
def test_degree_in_a_name(text: str, degree: float) -> None:
    """By structure, nothing simplified; a polynomial p has |p(s u)| growing like s to the degree."""
    formula = Formula(text)
    assert formula.degree_in("u") == degree
    if math.isfinite(degree) and text != "u - u":
        values = {"a": 0.7, "x": 0.3, "t": 1.0}
        first, last = (float(formula.evaluate({**values, "u": -s})) for s in (1e6, 2e6))
        assert math.log2(last / first) == pytest.approx(degree, abs=1e-5)


def test_degree_through_names_beside() -> None:
    term = FormulaTerm(
        Formula("s * v + w"), {"v": Formula("a * u"), "w": Formula("v * v"), "s": 2.0, "a": 3.0}
    )
    assert term.degree_in("u") == 2
    assert term.degree_in("x") == 0
    assert FormulaTerm(Formula("s * v"), {"v": Formula("a * u"), "s": 2.0}).degree_in("u") == 1
    assert FormulaTerm(Formula("v"), {"v": Formula("tanh(u)")}).degree_in("u") == math.inf


def test_formulas_are_values() -> None:
    formula = Formula("a *  exp(-x**2)\n + e")
    assert formula.text == "a * exp(-x**2) + e"
    assert formula.names == {"a", "x"}
    assert formula == Formula("a * exp(-x**2) + e")
    assert formula != Formula("a * exp(-x**2) + pi")
    copy = pickle.loads(pickle.dumps(formula))
    assert copy == formula
    assert len({formula, copy}) == 1
    assert copy.evaluate({"a": 2.0, "x": 0.0}) == 2.0 + math.e


def test_names_of_laws_are_free_until_called() -> None:
    assert Formula("beta * gamma").names == {"beta", "gamma"}
    assert not LAW_NAMES & RESERVED
    assert {"x", "y", "r", "t", "u", "pi", "e", "where"} <= RESERVED


def test_constants() -> None:
    assert constant("2*pi", "domain.length") == 2 * math.pi
    assert constant("-1.0", "k") == -1.0
    with pytest.raises(InputError, match="the name p in '2\\*p'") as caught:
        constant("2*p", "domain.length")
    assert caught.value.key == "domain.length"
    for text in ("log(0)", "0/0", "10**999"):
        with pytest.raises(InputError, match="a finite number is needed"):
            constant(text, "domain.length")


def test_order_of_definitions() -> None:
    definitions = {
        "d": Formula("a + b"),
        "a": Formula("b * c + x"),
        "b": Formula("c**2"),
        "c": Formula("3"),
        "z": Formula("c"),
    }
    order = order_of(definitions, "parameters")
    assert sorted(order) == sorted(definitions)
    for name, formula in definitions.items():
        for used in formula.names & definitions.keys():
            assert order.index(used) < order.index(name)


@pytest.mark.parametrize(
    ("definitions", "cycle"),
    [
        ({"a": "a + 1"}, "a -> a"),
        ({"a": "b", "b": "c", "c": "b + d", "d": "1"}, "b -> c -> b"),
        ({"s": "a", "a": "b + c", "b": "1", "c": "2*a"}, "a -> c -> a"),
    ],
)
def test_a_cycle_is_named_all_the_way_round(definitions: dict[str, str], cycle: str) -> None:
    with pytest.raises(InputError) as caught:
        order_of({name: Formula(text) for name, text in definitions.items()}, "parameters")
    assert caught.value.found == f"a cycle: {cycle}"
    assert caught.value.key == f"parameters.{cycle[0]}"


def test_a_long_chain_of_definitions_needs_no_recursion() -> None:
    chain = {f"p{i}": Formula(f"p{i + 1} + 1") for i in range(3000)} | {"p3000": Formula("1")}
    assert order_of(chain, "parameters") == [f"p{i}" for i in range(3000, -1, -1)]


def test_caps_leave_room_for_long_sums() -> None:
    long = " + ".join(f"{k} * cos({k} * x)" for k in range(1, 38))
    assert Formula(long).evaluate({"x": 0.0}) == 37 * 38 / 2


def test_nearest_name() -> None:
    assert nearest_name("treshold", ["gain", "threshold"]) == "threshold"
    assert nearest_name("H", ["h"]) == "h"
    assert nearest_name("qqq", ["gain", "threshold"]) is None
