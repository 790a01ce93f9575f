"""Times at which a formula switches: sides of comparisons with t that hold neither x nor t."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from aleafield.field.equation import FieldEquation
from aleafield.field.formula_term import FormulaTerm
from aleafield.formula import Formula
from aleafield.randomness.laws import Law


@dataclass(frozen=True)
class Switching:
    """How a drive, or another formula of t, switches in time.

    Attributes
    ----------
    times : tuple of float
        Certain switch times, units of time, increasing; they belong on every schedule.
    uncertain : bool
        Whether a switch time depends on an uncertain input, or a comparison holds t together with x or in a
        form other than the bare name: then the time stepping is of order 1 across the switch.
    """

    times: tuple[float, ...]
    uncertain: bool


def switching(equation: FieldEquation) -> Switching:
    """The switch times of an equation's drive."""
    return switch_times(equation.drive, equation.parameters)


def switch_times(term: FormulaTerm, parameters: Mapping[str, Any]) -> Switching:
    """The switch times of an unbound term.

    Parameters
    ----------
    term : FormulaTerm
    parameters : mapping
        The study's named numbers, which those beside the term hide.
    """
    times: set[float] = set()
    uncertain = any(f.mixed_switches for f in term.formulas())
    for side in (side for f in term.formulas() for side in f.switches()):
        value = _certain_value(side, term.names, parameters)
        if value is None:
            uncertain = True
        else:
            times.add(value)
    return Switching(tuple(sorted(times)), uncertain)


def _certain_value(formula: Formula, names: Mapping[str, Any], parameters: Mapping[str, Any]) -> float | None:
    """Value of a formula of certain numbers; None where a law or a variable stands behind a name."""
    values: dict[str, float] = {}
    for name in formula.names:
        entry = names.get(name, parameters.get(name))
        if entry is None or isinstance(entry, Law):
            return None
        if isinstance(entry, Formula):
            own = names if name in names else {}
            resolved = _certain_value(entry, own, parameters)
            if resolved is None:
                return None
            values[name] = resolved
        else:
            values[name] = float(entry)
    return float(formula.evaluate(values))
