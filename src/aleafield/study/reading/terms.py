"""Formulas with the names beside them (drive, initial state, kernels, rates, quantities), and [dynamics]."""

from __future__ import annotations

from aleafield.errors import InputError
from aleafield.field.equation import Dynamics
from aleafield.field.formula_term import FormulaTerm
from aleafield.formula import Formula, constant
from aleafield.study.reading.numbers import Numbers
from aleafield.study.reading.table import Table, finite


def read_term(
    table: Table, numbers: Numbers, variables: tuple[str, ...], fixed: tuple[str, ...] = ()
) -> FormulaTerm:
    """The entry `formula` of a table, with the names beside it.

    Parameters
    ----------
    variables : what the formula is a function of
    fixed : entries of the table, besides `formula`, that are not names for the formula

    Raises
    ------
    InputError
        For a formula that cannot be read, unknown names, cycles, and entries that nothing reads.
    """
    key = table.key("formula")
    value = table.value("formula", needed=f"a formula of {', '.join(variables)} in quotation marks is needed")
    text = value if isinstance(value, str) else repr(finite(value, key))
    formula = Formula(text, key)
    if not formula.names:
        formula = Formula(repr(constant(text, key)), key)
    return FormulaTerm(formula, numbers.beside(formula, table, ("formula", *fixed), variables))


def read_dynamics(table: Table, numbers: Numbers) -> Dynamics:
    """Time constant and duration, both required; InputError where one is missing or cannot be."""
    table.only(("time_constant", "duration"), "[dynamics]")
    time_constant = numbers.take(table, "time_constant")
    duration = table.constant("duration", needed="how long the field is followed, a positive number")
    if not duration > 0:
        raise InputError(table.key("duration"), f"{duration!r} given", "a positive number is needed")
    return Dynamics(time_constant, duration)
