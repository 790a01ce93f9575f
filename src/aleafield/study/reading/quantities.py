"""[[quantity]]: what is asked of the field."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any, Literal, cast

from aleafield.errors import InputError
from aleafield.geometry import Domain
from aleafield.quantities import (
    ActiveWidth,
    At,
    Displacement,
    EffectiveDiffusion,
    FormulaQuantity,
    FrontPosition,
    FrontSpeed,
    FunctionQuantity,
    Integral,
    Maximum,
    Mean,
    Minimum,
    Norm,
    Over,
    PeakPosition,
    Quantity,
    SpectralPower,
    TimeToLevel,
    Value,
    When,
)
from aleafield.study.reading.numbers import OUTPUT_NAMES, Numbers
from aleafield.study.reading.table import Table, shown
from aleafield.study.reading.terms import read_term

REDUCTIONS = ("maximum", "minimum", "mean")
SPACE_REDUCTIONS = ("mean", "maximum", "integral", "value")
_COMMON = ("name", "measure")
_WHEN = ("time", "over", "reduce")
_NAME = re.compile(r"[A-Za-z][A-Za-z0-9 _-]*")
_FIELD_NAMES = frozenset({"u", "x", "t"})


class QuantityReader:
    """Reads the quantities of a study on a domain, followed for a duration."""

    def __init__(self, numbers: Numbers, domain: Domain, duration: float, nodes: int) -> None:
        self.numbers = numbers
        self.domain = domain
        self.duration = duration
        self.nodes = nodes
        self.measures: dict[str, Callable[[Table, str], Quantity]] = {
            "value": lambda table, name: Value(name, self.place(table), self.when(table, "at")),
            "mean": self._whole(Mean),
            "maximum": self._whole(Maximum),
            "minimum": self._whole(Minimum),
            "peak position": self._whole(PeakPosition),
            "norm": self._whole(Norm),
            "integral": self._whole(Integral),
            "active width": self._active_width,
            "front position": self._front_position,
            "front speed": self._front_speed,
            "time to level": self._time_to_level,
            "spectral power": self._spectral_power,
            "displacement": self._wandering(Displacement),
            "effective diffusion": self._wandering(EffectiveDiffusion),
            "formula": self._formula,
        }

    def read(self, entries: list[Any]) -> tuple[Quantity, ...]:
        """The quantities in the order of the file.

        Raises
        ------
        InputError
            For names that cannot be used, unknown measures, and entries that a measure does not read.
        """
        names: list[str] = []
        quantities = []
        for place, values in enumerate(entries):
            if not isinstance(values, dict):
                found = f"{shown(values)} given"
                raise InputError(f"quantity.{place}", found, "each quantity is a section [[quantity]]")
            table = Table(values, f"quantity.{place}")
            name = _name_of(table, names)
            names.append(name)
            table.path = f"quantity.{name}"
            measure = table.choice("measure", tuple(self.measures))
            quantity = self.measures[measure](table, name)
            quantity.refuse_domain(self.domain)
            quantity.times(self.duration)
            quantities.append(quantity)
        return tuple(quantities)

    @staticmethod
    def with_functions(
        quantities: tuple[Quantity, ...], functions: tuple[FunctionQuantity, ...]
    ) -> tuple[Quantity, ...]:
        """The quantities of the file, then functions given in Python, named by the same rules."""
        names = [quantity.name for quantity in quantities]
        for function in functions:
            names.append(_name_of(Table({"name": function.name}, f"quantity.{function.name}"), names))
        return (*quantities, *functions)

    def when(self, table: Table, *further: str) -> When:
        """At one time or over a window; the other entries of the table must be the `further` ones."""
        table.only((*_COMMON, *_WHEN, *further), f"the measure {table.value('measure')!r}")
        return self._when(table)

    def _when(self, table: Table) -> When:
        if "time" in table and "over" in table:
            raise InputError(table.key("over"), "`time` and `over` together", "a quantity has one of them")
        if "over" not in table:
            if "reduce" in table:
                raise InputError(
                    table.key("reduce"), "nothing reads it: there is no `over`", "add over = [t1, t2]"
                )
            return At(table.constant("time") if "time" in table else None)
        start, end = self._span(table, "over")
        needed = '`over` needs reduce = "maximum", "minimum" or "mean"'
        table.value("reduce", needed=needed)
        return Over(
            start, end, cast(Literal["maximum", "minimum", "mean"], table.choice("reduce", REDUCTIONS))
        )

    def _span(self, table: Table, name: str) -> tuple[float, float]:
        """Two model times [t1, t2]."""
        needed = f"two model times, {name} = [t1, t2], are needed"
        times = table.constants(name, needed)
        if len(times) != 2:
            raise InputError(table.key(name), f"a list of {len(times)}", needed)
        return times[0], times[1]

    def place(self, table: Table) -> float:
        """The entry `at`, a point of the domain."""
        at = table.constant("at", needed="the point x at which the field is read")
        # the two ends of a ring are one point
        return self.domain.low if self.domain.periodic and at == self.domain.high else at

    def level(self, table: Table) -> Any:
        """The entry `level`: a number, an expression or a distribution."""
        return self.numbers.take(table, "level", needed="a level of the activity is needed")

    def _whole(self, measure: Callable[..., Quantity]) -> Callable[[Table, str], Quantity]:
        return lambda table, name: measure(name, when=self.when(table))

    def _wandering(
        self, measure: type[Displacement | EffectiveDiffusion]
    ) -> Callable[[Table, str], Quantity]:
        def read(table: Table, name: str) -> Quantity:
            table.only((*_COMMON, "between"), f"the measure {measure.measure!r}")
            return measure(name, self._span(table, "between"))

        return read

    def _active_width(self, table: Table, name: str) -> Quantity:
        when = self.when(table, "level")
        return ActiveWidth(name, self.level(table), when=when)

    @staticmethod
    def _side(table: Table) -> Literal["right", "left"]:
        return cast(Literal["right", "left"], table.choice("side", ("right", "left"), "right"))

    def _front_position(self, table: Table, name: str) -> Quantity:
        when, side = self.when(table, "level", "side"), self._side(table)
        return FrontPosition(name, self.level(table), side, when=when)

    def _front_speed(self, table: Table, name: str) -> Quantity:
        table.only((*_COMMON, "level", "between", "side"), "the measure 'front speed'")
        level, between = self.level(table), self._span(table, "between")
        return FrontSpeed(name, level, between=between, side=self._side(table))

    def _time_to_level(self, table: Table, name: str) -> Quantity:
        table.only((*_COMMON, "level", "at"), "the measure 'time to level'")
        return TimeToLevel(name, self.level(table), at=self.place(table))

    def _spectral_power(self, table: Table, name: str) -> Quantity:
        when = self.when(table, "wavenumber")
        wavenumber = table.integer("wavenumber")
        if 2 * wavenumber > self.nodes:
            needed = f"{self.nodes} nodes hold wavenumbers up to {self.nodes // 2}"
            raise InputError(table.key("wavenumber"), f"{wavenumber} given", needed)
        return SpectralPower(name, wavenumber, when=when)

    def _formula(self, table: Table, name: str) -> Quantity:
        fixed = (*_COMMON, *_WHEN, "in_space", "at")
        term = read_term(table, self.numbers, ("u", "x", "t"), fixed)
        needed = "how the formula becomes one number, one of " + ", ".join(SPACE_REDUCTIONS)
        table.value("in_space", needed=needed)
        in_space = cast(Any, table.choice("in_space", SPACE_REDUCTIONS))
        if in_space != "value" and "at" in table:
            found = f"nothing reads it with in_space = {in_space!r}"
            raise InputError(table.key("at"), found, 'take it out, or write in_space = "value"')
        at = self.place(table) if in_space == "value" else None
        return FormulaQuantity(name, term, in_space, at, when=self._when(table))


def _name_of(table: Table, taken: list[str]) -> str:
    key = table.key("name")
    needed = "a name is a letter, then letters, digits, spaces, _ and -"
    name = table.text("name", needed=needed)
    if not _NAME.fullmatch(name):
        raise InputError(key, f"the name {shown(name)}", needed)
    if name in taken:
        raise InputError(key, f"a second quantity named {name!r}", "every quantity has a name of its own")
    if name in _FIELD_NAMES or name in OUTPUT_NAMES:
        raise InputError(key, f"the name {name!r}", "the results use this name themselves; choose another")
    return name


def refuse_equal_names(quantities: tuple[Quantity, ...], paths: list[str]) -> None:
    """Refuse names that become equal where the results write them with letters, digits and _ alone.

    Raises
    ------
    InputError
        Naming both.
    """
    seen = {name: name for name in sorted(_FIELD_NAMES | OUTPUT_NAMES)}
    named = [(path if "." in path else f"parameters.{path}", path) for path in paths]
    named += [(f"quantity.{quantity.name}.name", quantity.name) for quantity in quantities]
    for key, name in named:
        stored = re.sub(r"[^A-Za-z0-9]", "_", name)
        if stored in seen:
            found = f"{name!r} and {seen[stored]!r} are both stored under the name {stored}"
            raise InputError(key, found, "choose another name for one of them")
        seen[stored] = name
