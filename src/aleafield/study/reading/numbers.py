"""Numbers of the model: a TOML number, an expression of parameters, or a distribution."""

from __future__ import annotations

import keyword
import re
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

from aleafield.errors import InputError
from aleafield.field.parameter import Parameter
from aleafield.formula import CONSTANTS, FUNCTIONS, RESERVED, Formula, constant, nearest_name, order_of
from aleafield.randomness.laws import parse_law
from aleafield.study.reading.table import Table, finite, shown

OUTPUT_NAMES = frozenset({"noise", "realization", "sample", "repeat", "replicate", "probe", "failed"})
"""Names that the stored results use themselves."""

_NAME = re.compile(r"[A-Za-z][A-Za-z0-9_]*")
_VARIABLES = ("x", "y", "r", "t", "u")


class Numbers:
    """Reads the numbers of one study and keeps account of its parameters.

    Attributes
    ----------
    parameters : dict of name to Parameter
    folder : Path or None
        Where the files of `sampled` are.
    warnings : list of str
    """

    def __init__(self, table: Table, folder: Path | None) -> None:
        self.folder = folder
        self.warnings: list[str] = []
        self.parameters: dict[str, Parameter] = {}
        self._used: set[str] = set()
        self._hidden: set[str] = set()
        for name in table:
            refuse_name(table.key(name), name, "a parameter")
            if name in OUTPUT_NAMES:
                needed = "the results use this name themselves; choose another"
                raise InputError(table.key(name), f"the name {name}", needed)
            self.parameters[name] = self.parse(table.value(name), table.key(name))
        formulas = {n: v for n, v in self.parameters.items() if isinstance(v, Formula)}
        for name, formula in formulas.items():
            self._refuse_unknown(formula, table.key(name), self.parameters, ())
        order_of(formulas, table.path)

    def parse(self, value: Any, key: str) -> Parameter:
        """A number, a law or an expression whose names are not looked up yet."""
        if not isinstance(value, str):
            return finite(value, key)
        law = parse_law(value, key, self.folder)
        if law is not None:
            return law
        formula = Formula(value, key)
        return formula if formula.names else constant(value, key)

    def read(self, value: Any, key: str) -> Parameter:
        """A number, a law or an expression of the study's parameters."""
        parameter = self.parse(value, key)
        if isinstance(parameter, Formula):
            self._refuse_unknown(parameter, key, self.parameters, ())
            self._used |= parameter.names
        return parameter

    def take(self, table: Table, name: str, needed: str = "") -> Parameter:
        """The number of that name in a table, which must be there."""
        wanted = needed or "a number, an expression of parameters or a distribution is needed"
        return self.read(table.value(name, needed=wanted), table.key(name))

    def beside(
        self, formula: Formula, table: Table, fixed: Iterable[str], variables: tuple[str, ...]
    ) -> dict[str, Parameter]:
        """The names that stand beside a formula and that it uses, itself or through one another.

        Parameters
        ----------
        formula : the formula
        table : the table in which it stands
        fixed : entries of the table that are not names for the formula
        variables : what the formula is a function of

        Raises
        ------
        InputError
            For an entry that the formula does not use, a name that nothing defines, a cycle.
        """
        entries = [name for name in table if name not in fixed]
        for name in RESERVED.intersection(entries):
            refuse_name(table.key(name), name, "a name beside a formula")
        values: dict[str, Parameter] = {}
        waiting = sorted(formula.names)
        users = {name: table.key("formula") for name in waiting}
        formulas = {table.key("formula"): formula}
        while waiting:
            name = waiting.pop(0)
            if name in values or name not in entries:
                continue
            refuse_name(table.key(name), name, "a name beside a formula")
            value = self.parse(table.value(name), table.key(name))
            values[name] = value
            if isinstance(value, Formula):
                formulas[table.key(name)] = value
                for further in sorted(value.names):
                    users.setdefault(further, table.key(name))
                    waiting.append(further)
        known = [*values, *self.parameters]
        missing = [n for n in users if n not in values and n not in variables and n not in self.parameters]
        for name in entries:
            if name not in values:
                nearest = nearest_name(name, [*fixed, *missing])
                found = "nothing reads this entry: the formula does not use it"
                raise InputError(table.key(name), found, "use it or take it out", nearest=nearest)
        for key, used in formulas.items():
            self._refuse_unknown(used, key, known, variables)
        order_of({n: v for n, v in values.items() if isinstance(v, Formula)}, table.path)
        self._used |= {name for name in users if name not in values and name in self.parameters}
        for name in values:
            if name in self.parameters:
                self._hidden.add(name)
                self.warnings.append(f"{table.key(name)} hides the parameter {name} in this formula")
        return {name: values[name] for name in entries}

    def refuse_unused(self, table: Table) -> None:
        """Refuse a parameter that no number or formula of the study uses.

        One that a key beside a formula hides is left in peace: the warning has said so.

        Raises
        ------
        InputError
            Naming the first one.
        """
        used = set(self._used)
        waiting = list(used)
        while waiting:
            value = self.parameters[waiting.pop()]
            if isinstance(value, Formula):
                waiting.extend(value.names - used)
                used |= value.names
        for name in table:
            if name not in used and name not in self._hidden:
                raise InputError(table.key(name), "nothing uses this parameter", "use it or take it out")

    def _refuse_unknown(
        self, formula: Formula, key: str, known: Iterable[str] | Mapping[str, Any], variables: tuple[str, ...]
    ) -> None:
        for name in sorted(formula.names):
            if name in variables or name in known:
                continue
            found = f"the name {name} in {shown(formula.text)}"
            if name in _VARIABLES:
                allowed = (
                    f"this formula is one of {', '.join(variables)}" if variables else "this is one number"
                )
                raise InputError(key, found, f"{allowed}: {name} has no value here")
            where = "in [parameters]" + (" or beside the formula" if variables else "")
            candidates = [*known, *variables, *CONSTANTS, *FUNCTIONS]
            raise InputError(
                key,
                found,
                f"nothing defines it: give it a value {where}",
                nearest=nearest_name(name, candidates),
            )


def refuse_name(key: str, name: str, what: str) -> None:
    """Refuse a name that formulas cannot use or that means something else.

    Raises
    ------
    InputError
        Where the name is no word of letters, digits and _, or is reserved.
    """
    if not _NAME.fullmatch(name) or keyword.iskeyword(name):
        needed = f"{what} is named by a letter, then letters, digits and _" + (
            f"; {name} is a word that formulas cannot hold" if keyword.iskeyword(name) else ""
        )
        raise InputError(key, f"the name {shown(name)}", needed)
    if name in RESERVED:
        kind = "function" if name in FUNCTIONS else "constant" if name in CONSTANTS else "variable"
        raise InputError(
            key, f"the name {name}", f"it is a {kind} of formulas; choose another name for {what}"
        )
