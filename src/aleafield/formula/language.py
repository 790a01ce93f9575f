"""The words of the formula language, and what to write instead of words that it lacks."""

from __future__ import annotations

import ast
import difflib
import math
from collections.abc import Callable, Iterable
from typing import Any, NamedTuple

import numpy as np

Operation = Callable[..., Any]
"""A function of scalars or arrays that broadcasts."""


class Function(NamedTuple):
    """A function of the language: how many arguments it takes and what computes it."""

    arity: int
    operation: Operation


def _erf(x: Any) -> Any:
    from scipy.special import erf

    return erf(x)


def _where(condition: Any, a: Any, b: Any) -> Any:
    chosen = np.where(np.not_equal(condition, 0.0), a, b)
    return np.where(np.isnan(condition), np.nan, chosen)


FUNCTION_TABLE: dict[str, Function] = {
    "abs": Function(1, np.abs),
    "sqrt": Function(1, np.sqrt),
    "exp": Function(1, np.exp),
    "log": Function(1, np.log),
    "sin": Function(1, np.sin),
    "cos": Function(1, np.cos),
    "tan": Function(1, np.tan),
    "sinh": Function(1, np.sinh),
    "cosh": Function(1, np.cosh),
    "tanh": Function(1, np.tanh),
    "arctan": Function(1, np.arctan),
    "erf": Function(1, _erf),
    "sign": Function(1, np.sign),
    "minimum": Function(2, np.minimum),
    "maximum": Function(2, np.maximum),
    "where": Function(3, _where),
}

CONSTANT_TABLE: dict[str, float] = {"pi": math.pi, "e": math.e}

FUNCTIONS: frozenset[str] = frozenset(FUNCTION_TABLE)
"""Names of the functions that a formula may call."""

CONSTANTS: frozenset[str] = frozenset(CONSTANT_TABLE)
"""Names with a fixed value."""

RESERVED: frozenset[str] = FUNCTIONS | CONSTANTS | {"x", "y", "r", "t", "u"}
"""Names that no parameter may take: the variables, the constants and the functions."""

LAW_NAMES: frozenset[str] = frozenset(
    {
        "uniform",
        "normal",
        "truncated_normal",
        "lognormal",
        "loguniform",
        "triangular",
        "beta",
        "gamma",
        "exponential",
        "discrete",
        "sampled",
    }
)
"""Names of the laws; called in a formula they are an error, as bare names they are free."""

BINARY: dict[type[ast.operator], Operation] = {
    ast.Add: np.add,
    ast.Sub: np.subtract,
    ast.Mult: np.multiply,
    ast.Div: np.divide,
    ast.Pow: np.power,
}

COMPARISON: dict[type[ast.cmpop], Operation] = {
    ast.Lt: np.less,
    ast.LtE: np.less_equal,
    ast.Gt: np.greater,
    ast.GtE: np.greater_equal,
    ast.Eq: np.equal,
    ast.NotEq: np.not_equal,
}

KINKED: frozenset[str] = frozenset({"abs", "sign", "minimum", "maximum", "where"})
"""Functions that are not smooth in (for `where`: the first of) their arguments."""

OTHER_WORDS: dict[str, str] = {
    "ln": "log(a)",
    "log10": "log(a) / log(10)",
    "log2": "log(a) / log(2)",
    "pow": "a ** b",
    "power": "a ** b",
    "max": "maximum(a, b)",
    "min": "minimum(a, b)",
    "atan": "arctan(a)",
    "fabs": "abs(a)",
    "heaviside": "(a > 0)",
    "step": "(a > 0)",
    "ifelse": "where(condition, a, b)",
    "iif": "where(condition, a, b)",
    "sgn": "sign(a)",
    "sqr": "a**2",
    "square": "a**2",
    "sech": "1 / cosh(a)",
    "erfc": "1 - erf(a)",
    "sigmoid": "1 / (1 + exp(-a))",
}
"""Functions of other languages and what a formula says instead."""

FOREIGN_CHARACTERS: dict[str, str] = {
    "\u2212": "-",
    "\u2013": "-",
    "\u00d7": "*",
    "\u00b7": "*",
    "\u22c5": "*",
    "\u00f7": "/",
    "\u00b2": "**2",
    "\u00b3": "**3",
    "\u2264": "<=",
    "\u2265": ">=",
    "\u2260": "!=",
    "\u03c0": "pi",
    "\u221a": "sqrt(a)",
}
"""Characters that look like mathematics and what a formula says instead."""

SUMMARY = "a formula holds numbers, names, + - * / **, parentheses, comparisons and calls of " + ", ".join(
    FUNCTION_TABLE
)
"""One line that says what the language is."""


def nearest_name(name: str, valid: Iterable[str]) -> str | None:
    """The valid name most like `name`, or None when nothing comes close.

    >>> nearest_name("tahn", ["sin", "tanh"])
    'tanh'
    """
    candidates = sorted(valid)
    close = difflib.get_close_matches(name, candidates, n=1, cutoff=0.6)
    if close:
        return close[0]
    same_letters = {candidate.lower(): candidate for candidate in candidates}
    return same_letters.get(name.lower())
