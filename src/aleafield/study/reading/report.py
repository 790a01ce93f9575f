"""[report] and [keep]: what the summary tells besides mean and sd, and which fields are stored."""

from __future__ import annotations

from collections.abc import Sequence
from typing import cast

from aleafield.errors import InputError
from aleafield.study.reading.table import Table, finite, unknown_key
from aleafield.study.study import Keep, ReportRequest


def read_report(table: Table, names: Sequence[str]) -> ReportRequest:
    """Quantiles, and levels of quantities whose exceedance is wanted; `names` are those of the quantities.

    Raises
    ------
    InputError
        For probabilities outside (0, 1), unknown quantities and lists of no numbers.
    """
    table.only(("quantiles", "exceed"), "[report]")
    quantiles = ReportRequest().quantiles
    if "quantiles" in table:
        needed = "a list of probabilities is needed, as [0.05, 0.5, 0.95]"
        quantiles = () if table.value("quantiles") == [] else _numbers(table, "quantiles", needed)
        for place, p in enumerate(quantiles):
            if not 0 < p < 1:
                raise InputError(
                    f"{table.key('quantiles')}.{place}", f"{p!r} given", "it must lie between 0 and 1"
                )
    levels = table.table("exceed")
    exceed: dict[str, tuple[float, ...]] = {}
    for name in levels:
        if name not in names:
            raise unknown_key(levels.key(name), names, "the study's list of quantities")
        exceed[name] = _numbers(levels, name, "a list of levels is needed, as [3.0, 4.0]")
    return ReportRequest(quantiles, exceed)


def read_keep(table: Table, duration: float) -> Keep:
    """Which fields are stored; the final ones where nothing is said.

    Raises
    ------
    InputError
        For an unknown choice, and for times outside the run.
    """
    table.only(("fields", "times"), "[keep]")
    fields = table.choice("fields", ("none", "final", "all"), "final")
    times: tuple[float, ...] = ()
    if "times" in table:
        times = table.constants("times", "a list of model times is needed, as [10.0, 20.0]")
        for place, time in enumerate(times):
            if not 0 <= time <= duration:
                found = f"{time!r} given"
                needed = f"model times run from 0 to the duration, {duration!r}"
                raise InputError(f"{table.key('times')}.{place}", found, needed)
    return Keep(cast("object", fields), tuple(sorted(set(times))))  # type: ignore[arg-type]


def _numbers(table: Table, name: str, needed: str) -> tuple[float, ...]:
    entries = table.entries(name, needed)
    numbers = (finite(entry, f"{table.key(name)}.{place}") for place, entry in enumerate(entries))
    return tuple(dict.fromkeys(numbers))
