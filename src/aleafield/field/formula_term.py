"""A formula with the names that stand beside it: drive, initial state, formula kernels and rates."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.field.parameter import Bindable, beside, per_sample
from aleafield.formula import Formula, order_of


@dataclass(frozen=True)
class FormulaTerm(Bindable):
    """A function given by a formula.

    Parameters
    ----------
    formula : Formula
        Uses its variables, the names beside it and the study's parameters.
    names : mapping, optional
        Names beside the formula: a number, a law, or a formula of the same variables (any order, no cycle).
        Such a name hides a parameter of the same name.
    """

    formula: Formula
    names: Mapping[str, Any] = beside()

    def used(self) -> frozenset[str]:
        """All names that the formula needs, through the formulas beside it as well."""
        found: set[str] = set()
        waiting = list(self.formula.names)
        while waiting:
            name = waiting.pop()
            if name in found:
                continue
            found.add(name)
            value = self.names.get(name)
            if isinstance(value, Formula):
                waiting.extend(value.names)
        return frozenset(found)

    def depends_on(self, variable: str) -> bool:
        """Whether the value changes with the variable."""
        return variable in self.used()

    def formulas(self) -> tuple[Formula, ...]:
        """The formula and those beside it that it uses."""
        used = self.used()
        return (self.formula, *(v for k, v in self.names.items() if isinstance(v, Formula) and k in used))

    def kinks_in(self, variable: str) -> bool:
        """Whether a kink or a jump in the variable can be (abs, sign, minimum, maximum, where, a comparison)."""
        dependent = {variable}
        changed = True
        while changed:  # names beside that are functions of the variable
            changed = False
            for name, value in self.names.items():
                if isinstance(value, Formula) and name not in dependent and value.names & dependent:
                    dependent.add(name)
                    changed = True
        return any(f.kinks_in(name) for f in self.formulas() for name in dependent)

    def degree_in(self, variable: str) -> float:
        """Degree as a polynomial in the variable, by structure: 0, 1, 2, .. or inf where it is none."""
        formulas = {name: value for name, value in self.names.items() if isinstance(value, Formula)}
        degrees: dict[str, float] = {}
        for name in order_of(formulas, "formula"):
            degrees[name] = formulas[name].degree_in(variable, degrees)
        return self.formula.degree_in(variable, degrees)

    def evaluate(
        self, variables: Mapping[str, float | FloatArray], axes: int, inside: float | None = None
    ) -> FloatArray:
        """Value of a bound term.

        Parameters
        ----------
        variables : the formula's variables, arrays with at most `axes` trailing axes
        axes : number of axes of the variables, after the sample axis
        inside : time in the middle of the current step, for comparisons with t

        Returns
        -------
        array, shape of the variables where no number depends on the sample, else (S, ...)
        """
        used = self.used()
        values: dict[str, Any] = {}
        formulas: dict[str, Formula] = {}
        for name, value in self.names.items():
            if name not in used:
                continue
            if isinstance(value, Formula):
                formulas[name] = value
            else:
                values[name] = per_sample(value, axes)
        values.update(variables)
        for name in order_of(formulas, "formula"):
            values[name] = formulas[name].evaluate(values, inside)
        return np.asarray(self.formula.evaluate(values, inside), dtype=np.float64)


def constant(value: float) -> FormulaTerm:
    """The term that has the same value everywhere."""
    return FormulaTerm(Formula(repr(float(value))))
