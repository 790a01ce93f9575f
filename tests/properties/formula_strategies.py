"""Random formulas together with what plain Python makes of them."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import NamedTuple

from hypothesis import strategies as st


class Known(NamedTuple):
    """A formula of the names a and b, and a function of them that gives its value."""

    text: str
    value: Callable[[float, float], float]


def _divided(p: float, q: float) -> float:
    return (
        p / q
        if q
        else math.nan
        if not p or math.isnan(p)
        else math.copysign(1, p) * math.copysign(math.inf, q)
    )


def _binary(sign: str, operation: Callable[[float, float], float]) -> Callable[[Known, Known], Known]:
    return lambda f, g: Known(
        f"({f.text}) {sign} ({g.text})", lambda a, b: operation(f.value(a, b), g.value(a, b))
    )


def _leaf(number: float) -> Known:
    return Known(repr(number), lambda a, b: number)


_LEAVES = st.one_of(
    st.floats(0, 100).map(_leaf),
    st.just(Known("a", lambda a, b: a)),
    st.just(Known("b", lambda a, b: b)),
    st.just(Known("pi", lambda a, b: math.pi)),
)


def _grown(inner: st.SearchStrategy[Known]) -> st.SearchStrategy[Known]:
    operations = [
        _binary("+", lambda p, q: p + q),
        _binary("-", lambda p, q: p - q),
        _binary("*", lambda p, q: p * q),
        _binary("/", _divided),
        _binary("<", lambda p, q: float(p < q)),
        _binary(">=", lambda p, q: float(p >= q)),
        _binary("==", lambda p, q: float(p == q)),
    ]
    pairs = st.builds(lambda make, f, g: make(f, g), st.sampled_from(operations), inner, inner)
    negated = inner.map(lambda f: Known(f"-({f.text})", lambda a, b: -f.value(a, b)))
    absolute = inner.map(lambda f: Known(f"abs({f.text})", lambda a, b: abs(f.value(a, b))))
    chosen = st.builds(
        lambda f, g, h: Known(
            f"where(({f.text}) < ({g.text}), {h.text}, -({h.text}))",
            lambda a, b: h.value(a, b) if f.value(a, b) < g.value(a, b) else -h.value(a, b),
        ),
        inner,
        inner,
        inner,
    )
    return st.one_of(pairs, negated, absolute, chosen)


KNOWN_FORMULAS = st.recursive(_LEAVES, _grown, max_leaves=12)
"""Formulas of +, -, *, /, comparisons, abs and where, whose value plain arithmetic gives to the bit."""

SIGNS = [*"()[]{},.:;+-*/%^&|~<>='#@!$?\"\\ \n\t\0", "**", "//", "<=", "==", "!=", ">=", ":="]
WORDS = ["a", "b", "x", "t", "u", "e", "pi", "and", "or", "not", "if", "else", "for", "in", "is", "lambda"]
NUMBERS = ["0", "1", "2.5", "1e9", "1j", "007", "0x1f", "1_0", "True", "None"]
CALLS = [
    "exp(",
    "log(",
    "where(",
    "min(",
    "uniform(",
    "sampled(",
    "__import__(",
    "print(",
    "f'{a}'",
    "import",
]
FOREIGN = ["__class__", "yield", "await", "\N{MINUS SIGN}", "\N{GREEK SMALL LETTER PI}", "\ud800"]

FRAGMENTS = st.lists(st.sampled_from(SIGNS + WORDS + NUMBERS + CALLS + FOREIGN), max_size=25)
"""Pieces of formulas, of programs and of neither, to be joined."""
