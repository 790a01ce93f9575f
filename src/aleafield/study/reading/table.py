"""A table of a study file that knows its dotted key and says what is wrong with its entries."""

from __future__ import annotations

import datetime
import math
import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import Any

from aleafield.errors import InputError
from aleafield.formula import LAW_NAMES, constant, nearest_name

_ABSENT: Any = object()
_LAW = re.compile(r"\s*([A-Za-z_]\w*)\s*\(")


class Table:
    """One table; every method that reads an entry raises `InputError` with the entry's dotted key.

    Parameters
    ----------
    values : mapping
        As the TOML reader gives them.
    path : str
        Dotted key of the table; empty for the whole file.
    """

    def __init__(self, values: Mapping[str, Any], path: str = "") -> None:
        self.values = values
        self.path = path

    def __contains__(self, name: str) -> bool:
        return name in self.values

    def __iter__(self) -> Iterator[str]:
        return iter(self.values)

    def key(self, name: str) -> str:
        """Dotted key of an entry."""
        return f"{self.path}.{name}" if self.path else name

    def only(self, known: Iterable[str], owner: str) -> None:
        """Raise InputError for the first entry that nothing reads; `owner` says whose entries these are."""
        names = list(known)
        for name in self.values:
            if name not in names:
                raise unknown_key(self.key(name), names, owner)

    def value(self, name: str, default: Any = _ABSENT, needed: str = "") -> Any:
        """The raw value; InputError where it is missing and has no default."""
        if name in self.values:
            return self.values[name]
        if default is _ABSENT:
            raise InputError(self.key(name), "this entry is missing", needed or "it has no default")
        return default

    def text(self, name: str, default: Any = _ABSENT, needed: str = "") -> str:
        """A string that is not blank; InputError for anything else."""
        value = self.value(name, default, needed)
        if value is default:
            return str(default)
        if not isinstance(value, str):
            raise InputError(
                self.key(name), f"{shown(value)} given", needed or "text in quotation marks is needed"
            )
        if not value.strip():
            raise InputError(self.key(name), "the text is empty", needed or "it must say something")
        return value

    def choice(
        self,
        name: str,
        options: Sequence[str],
        default: Any = _ABSENT,
        unbuilt: Mapping[str, str] | None = None,
    ) -> str:
        """One word of a list.

        Parameters
        ----------
        options : the words that can be used
        unbuilt : words of the language that cannot be used yet, each with what to do instead

        Raises
        ------
        InputError
            For any other word, with the nearest one.
        """
        needed = "one of " + ", ".join(repr(word) for word in options) + " is needed"
        value = self.value(name, default, needed)
        if value is default:
            return str(default)
        if isinstance(value, str):
            if value in options:
                return value
            if unbuilt and value in unbuilt:
                raise not_built_yet(self.key(name), repr(value), unbuilt[value])
        nearest = nearest_name(value, [*options, *(unbuilt or {})]) if isinstance(value, str) else None
        raise InputError(self.key(name), f"{shown(value)} given", needed, nearest=nearest)

    def table(self, name: str, needed: str = "") -> Table:
        """A table inside this one, empty where it is missing and not `needed`; InputError for no table."""
        if name not in self.values and not needed:
            return Table({}, self.key(name))
        value = self.value(name, needed=needed)
        if not isinstance(value, dict):
            wanted = f"a section [{self.key(name)}] is needed"
            if isinstance(value, list):
                wanted += ", written once and in single brackets"
            raise InputError(self.key(name), f"{shown(value)} given", wanted)
        return Table(value, self.key(name))

    def integer(self, name: str, default: Any = _ABSENT, least: int = 0, most: int = 1_000_000_000) -> int:
        """A whole number within bounds; InputError for anything else."""
        value = self.value(name, default)
        if value is default:
            return int(default)
        needed = f"a whole number of at least {least} is needed"
        if isinstance(value, float) and math.isfinite(value) and value == int(value):
            needed += ", written without a decimal point or exponent"
        if isinstance(value, bool) or not isinstance(value, int):
            raise InputError(self.key(name), f"{shown(value)} given", needed)
        if value < least:
            raise InputError(self.key(name), f"{shown(value)} given", needed)
        if value > most:
            raise InputError(self.key(name), f"{shown(value)} given", f"at most {most:,} is possible")
        return value

    def flag(self, name: str, default: bool) -> bool:
        """An entry that is true or false; InputError for anything else."""
        value = self.value(name, default)
        if not isinstance(value, bool):
            raise InputError(
                self.key(name), f"{shown(value)} given", "true or false is needed, without quotation marks"
            )
        return value

    def constant(self, name: str, default: Any = _ABSENT, needed: str = "") -> float:
        """A certain number: a number, or an expression of numbers, pi and e."""
        value = self.value(name, default, needed)
        return default if value is default else constant_of(value, self.key(name))

    def constants(self, name: str, needed: str = "") -> tuple[float, ...]:
        """A list of certain numbers, each as `constant` reads it."""
        entries = self.entries(name, needed)
        return tuple(constant_of(entry, f"{self.key(name)}.{i}") for i, entry in enumerate(entries))

    def entries(self, name: str, needed: str = "") -> list[Any]:
        """A list that is not empty; InputError for anything else."""
        value = self.value(name, needed=needed)
        if not isinstance(value, list):
            raise InputError(self.key(name), f"{shown(value)} given", needed or "a list in [ ] is needed")
        if not value:
            raise InputError(self.key(name), "an empty list", needed or "one entry at least is needed")
        return value


def unknown_key(key: str, known: Iterable[str], owner: str) -> InputError:
    """The error for an entry that nothing reads."""
    names = list(known)
    name = key.rpartition(".")[2] if "." in key else key
    needed = f"{owner} has " + (", ".join(names) if names else "no entries")
    return InputError(key, "nothing reads this entry", needed, nearest=nearest_name(name, names))


def not_built_yet(key: str, what: str, instead: str) -> InputError:
    """The error for a word of the language that cannot be used yet."""
    return InputError(key, f"{what} is not built yet", instead)


def shown(value: Any) -> str:
    """A value as messages show it."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int):
        return str(value) if abs(value) < 10**30 else "a whole number of more than 30 digits"
    if isinstance(value, float):
        return repr(value)
    if isinstance(value, str):
        printable = "".join(c if c.isprintable() else "?" for c in value)
        return repr(printable if len(printable) <= 60 else printable[:57] + "...")
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, list):
        return "a list"
    if isinstance(value, datetime.date | datetime.time):
        return "a date or time of day"
    return f"a value of type {type(value).__name__}"


def finite(value: Any, key: str) -> float:
    """A TOML number as a finite float.

    Raises
    ------
    InputError
        For anything that is no number, and for nan, inf and integers beyond the range of floats.
    """
    if isinstance(value, bool) or not isinstance(value, int | float):
        hint = f"; write {int(value)} for {shown(value)}" if isinstance(value, bool) else ""
        raise InputError(key, f"{shown(value)} given", "a number is needed" + hint)
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    if not math.isfinite(number):
        raise InputError(key, f"{shown(value)} given", "a finite number is needed")
    return number


def constant_of(value: Any, key: str) -> float:
    """A certain number: a TOML number, or text with an expression of numbers, pi and e; else InputError."""
    if not isinstance(value, str):
        return finite(value, key)
    law = _LAW.match(value)
    if law is not None and law[1] in LAW_NAMES:
        raise InputError(
            key, f"the distribution {shown(value)}", 'this number is certain: a number or as "2*pi"'
        )
    return constant(value, key)
