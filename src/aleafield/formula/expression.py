"""Formulas, parsed once and evaluated on arrays, and the order in which named formulas are evaluated."""

from __future__ import annotations

import ast
import itertools
import math
from collections.abc import Mapping
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.formula.degree import degree
from aleafield.formula.language import CONSTANTS, KINKED, nearest_name
from aleafield.formula.parser import Push, Read, parse, shown

_VARIABLES = frozenset({"x", "y", "r", "t", "u"})


class Formula:
    """An expression in named numbers, evaluated elementwise.

    Two formulas are equal when their texts are; a formula pickles as its text.

    Parameters
    ----------
    text : str
        At most 2,000 characters, 300 numbers, names and operations, 40 levels of nesting.
    key : str
        Dotted path of the entry, named by errors.

    Attributes
    ----------
    text : str
        The formula with its white space simplified.
    names : frozenset of str
        What it needs besides the constants pi and e.
    mixed_switches : bool
        Whether it jumps in t at times that depend on x or that are hidden in an expression of t: those times
        cannot be put on a schedule of steps.

    Raises
    ------
    InputError
        For anything that is not on the list of the language; says what to write instead.

    Examples
    --------
    >>> float(Formula("a * (0 < x < 2)").evaluate({"a": 3.0, "x": 1.0}))
    3.0
    """

    def __init__(self, text: str, key: str = "formula") -> None:
        if not isinstance(text, str):
            raise InputError(key, f"{text!r} instead of a formula", "write it as text in quotation marks")
        self.text = " ".join(text.split())
        self._tree, self._program = parse(self.text, key)
        self.names: frozenset[str] = _names_in(self._tree)
        switches: dict[str, Formula] = {}
        self.mixed_switches: bool = False
        for left, right in _links(self._tree):
            for side, other in ((left, right), (right, left)):
                if not _is_time(side):
                    continue
                if _names_in(other) & _VARIABLES:
                    self.mixed_switches = True
                else:
                    source = ast.get_source_segment(self.text, other) or ""
                    switches.setdefault(source, Formula(source, key))
            if not (_is_time(left) or _is_time(right)) and "t" in _names_in(left) | _names_in(right):
                self.mixed_switches = True
        if any("t" in _names_in(argument) for argument in _jumping_arguments(self._tree)):
            self.mixed_switches = True
        self._switches = tuple(switches.values())

    def evaluate(
        self, values: Mapping[str, float | FloatArray], inside: float | None = None
    ) -> float | FloatArray:
        """The value of the formula, broadcast over the values of its names.

        Division by zero, overflow and logarithms of negative numbers give infinities and NaN, not exceptions.

        Parameters
        ----------
        values : mapping
            A number or an array for every one of `names`; others are ignored.
        inside : float, optional
            The middle of the current step: a bare t in a comparison stands for it, so that every stage of a
            step takes the limit of a switch from inside that step.

        Returns
        -------
        float or float array
            A float when every value is a number.
        """
        stack: list[Any] = []
        with np.errstate(all="ignore"):
            for step in self._program:
                if isinstance(step, Push):
                    stack.append(step.value)
                elif isinstance(step, Read):
                    value = inside if step.limit and inside is not None else values[step.name]
                    stack.append(np.asarray(value, dtype=np.float64, order="C")[()])
                else:
                    stack[-step.arity :] = [step.operation(*stack[-step.arity :])]
        result: FloatArray = np.asarray(stack.pop(), dtype=np.float64)
        return result if result.ndim else float(result)

    def switches(self) -> tuple[Formula, ...]:
        """The times at which a comparison of the bare name t changes, as formulas free of x, y, r, t, u.

        For ``(t < 20) + (t_on <= t)`` they are ``20`` and ``t_on``.
        """
        return self._switches

    def kinks_in(self, variable: str) -> bool:
        """Whether the formula may fail to be smooth in the variable.

        It may when a comparison, or an argument of abs, sign, minimum or maximum, or the condition of `where`
        holds the variable.
        """
        if any(variable in _names_in(left) | _names_in(right) for left, right in _links(self._tree)):
            return True
        return any(
            variable in _names_in(argument)
            for call in _calls(self._tree, KINKED)
            for argument in (call.args[:1] if _name_of(call) == "where" else call.args)
        )

    def degree_in(self, name: str, others: Mapping[str, float] | None = None) -> float:
        """Degree as a polynomial in the name, by structure: 0, 1, 2, .. or inf where it is none.

        Parameters
        ----------
        name : str
        others : mapping, optional
            Degrees in it of further names, those of formulas that hold it; all others are free of it.

        Examples
        --------
        >>> Formula("a * u * (x < 1) + u**2 / 3").degree_in("u")
        2.0
        """
        return degree(self._tree, {**(others or {}), name: 1.0})

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Formula) and self.text == other.text

    def __hash__(self) -> int:
        return hash(("formula", self.text))

    def __repr__(self) -> str:
        return f"Formula({self.text!r})"

    def __reduce__(self) -> tuple[type[Formula], tuple[str]]:
        return Formula, (self.text,)


def constant(text: str, key: str) -> float:
    """The value of an expression of numbers and pi, e alone, such as ``2*pi`` or ``log(10)``.

    Raises
    ------
    InputError
        When the expression holds any name, or is not a finite number.
    """
    formula = Formula(text, key)
    if formula.names:
        name = min(formula.names)
        raise InputError(
            key,
            f"the name {name} in {shown(formula.text)}",
            "only numbers, pi, e and functions of them can stand here",
            nearest=nearest_name(name, CONSTANTS),
        )
    value = float(formula.evaluate({}))
    if not math.isfinite(value):
        raise InputError(key, f"{shown(formula.text)} is {value}", "a finite number is needed")
    return value


def order_of(definitions: Mapping[str, Formula], key: str) -> list[str]:
    """Names in an order in which each formula finds what it uses already evaluated.

    Parameters
    ----------
    definitions : mapping of name to Formula
        Formulas that may use one another; other names in them are left alone.
    key : str
        Dotted path of the section, named by errors.

    Raises
    ------
    InputError
        For a cycle: names it all the way round.
    """
    order: list[str] = []
    done: set[str] = set()
    for start in definitions:
        trail: dict[str, list[str]] = {}
        name: str | None = start
        while name is not None:
            if name not in done and name not in trail:
                trail[name] = sorted(definitions[name].names & definitions.keys())
            waiting = trail.get(name, [])
            following = next((used for used in waiting if used not in done), None)
            if following is None:
                if name not in done:
                    done.add(name)
                    order.append(name)
                trail.pop(name, None)
                name = next(reversed(trail), None)
            elif following in trail:
                path = list(trail)
                cycle = [*path[path.index(following) :], following]
                raise InputError(
                    f"{key}.{following}" if key else following,
                    "a cycle: " + " -> ".join(cycle),
                    "one of them must not depend on the others",
                )
            else:
                name = following
    return order


def _names_in(tree: ast.AST) -> frozenset[str]:
    called = {id(node.func) for node in ast.walk(tree) if isinstance(node, ast.Call)}
    return frozenset(
        node.id
        for node in ast.walk(tree)
        if isinstance(node, ast.Name) and id(node) not in called and node.id not in CONSTANTS
    )


def _links(tree: ast.AST) -> list[tuple[ast.expr, ast.expr]]:
    """The pairs that are compared, those of a chain one by one."""
    pairs: list[tuple[ast.expr, ast.expr]] = []
    for node in ast.walk(tree):
        if isinstance(node, ast.Compare):
            operands = [node.left, *node.comparators]
            pairs.extend(itertools.pairwise(operands))
    return pairs


def _name_of(call: ast.Call) -> str:
    return call.func.id if isinstance(call.func, ast.Name) else ""


def _calls(tree: ast.AST, names: frozenset[str]) -> list[ast.Call]:
    return [node for node in ast.walk(tree) if isinstance(node, ast.Call) and _name_of(node) in names]


def _jumping_arguments(tree: ast.AST) -> list[ast.expr]:
    """What decides a jump without a comparison: arguments of sign, conditions of `where`."""
    arguments = [call.args[0] for call in _calls(tree, frozenset({"sign", "where"}))]
    return [argument for argument in arguments if not _links(argument)]


def _is_time(node: ast.expr) -> bool:
    return isinstance(node, ast.Name) and node.id == "t"
