"""Influence: what each input does to a quantity, and what measuring it would bring, as the summary has it."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from aleafield.report.data import Summary
from aleafield.report.findings import Finding, finding
from aleafield.report.parts import FIRST, INDICES, SHAPLEY, TOTAL, IndexKind


@dataclass(frozen=True)
class InputInfluence:
    """The indices of one input on one quantity; kinds that were not asked are absent."""

    path: str
    indices: Mapping[IndexKind, Finding]


@dataclass(frozen=True)
class PairInfluence:
    """The second-order index of two inputs on one quantity."""

    first: str
    other: str
    index: Finding


@dataclass(frozen=True)
class Influence:
    """What causes the spread of one quantity.

    Attributes
    ----------
    quantity : its name
    inputs : the most important first, by `ruling`; those without a value last
    pairs : largest first, those without a value last; each pair once
    noise : total index of the noise; None where it does not apply
    first_is_largest : certainty, at least, that the first input really is; None where it was not estimated
    above_next : certainty that each input really exceeds the next one; empty where it was not estimated
    notes : what a reader must know of all of them
    """

    quantity: str
    inputs: tuple[InputInfluence, ...]
    pairs: tuple[PairInfluence, ...]
    noise: Finding | None
    first_is_largest: float | None = None
    above_next: tuple[float, ...] = ()
    notes: tuple[str, ...] = ()

    @property
    def kinds(self) -> tuple[IndexKind, ...]:
        """The kinds of indices that were asked, in the order of pictures."""
        return tuple(kind for kind in INDICES if any(kind in one.indices for one in self.inputs))

    @property
    def stated(self) -> tuple[IndexKind, ...]:
        """Those of which one value at least is determined."""
        return tuple(k for k in self.kinds if any(_value(one, k) is not None for one in self.inputs))

    @property
    def ruling(self) -> IndexKind | None:
        """The kind that orders the inputs: total, else Shapley, else first order; None where none has a value."""
        return _ruling(self.inputs)

    def all(self) -> Iterator[Finding]:
        """Every index, input by input, then pairs and noise."""
        for one in self.inputs:
            yield from one.indices.values()
        yield from (pair.index for pair in self.pairs)
        if self.noise is not None:
            yield self.noise

    def tiers(self) -> list[list[InputInfluence]]:
        """Inputs with a value of the ruling kind, cut where every interval before lies above every one after."""
        kind = self.ruling
        ranked = [one for one in self.inputs if kind is not None and _value(one, kind) is not None]
        if kind is None or not ranked:
            return []
        ends = [ends_of(one.indices[kind]) for one in ranked]
        found: list[list[InputInfluence]] = [[]]
        for place, one in enumerate(ranked):
            if place and min(low for low, _ in ends[:place]) > max(high for _, high in ends[place:]):
                found.append([])
            found[-1].append(one)
        return found


@dataclass(frozen=True)
class Measure:
    """What it would bring to know one input better.

    Attributes
    ----------
    path : of the input
    known, halved : expected standard deviation of the quantity once the input is known exactly, or its spread
        is halved
    may_be_fixed : whether it may be fixed without changing the answer; None where that is not determined
    """

    path: str
    known: Finding
    halved: Finding
    may_be_fixed: bool | None


@dataclass(frozen=True)
class PinnedSet:
    """The cheapest inputs to know for a wanted standard deviation.

    Attributes
    ----------
    inputs : paths; empty where it is as small as wanted already, None where no set suffices
    remaining_sd : expected with these known; None where no set suffices
    wanted_sd : as the study asks
    exhaustive : whether all subsets were looked at
    reason : why there is none, or ""
    """

    inputs: tuple[str, ...] | None
    remaining_sd: float | None
    wanted_sd: float
    exhaustive: bool
    reason: str = ""


@dataclass(frozen=True)
class Measurement:
    """What to measure next for one quantity.

    Attributes
    ----------
    quantity, units : name and units of the quantity
    present : its standard deviation as it is
    measures : that which leaves least first, those without a value last
    sets : to pin down
    notes : what a reader must know of all of them, where it does not stand with the indices
    """

    quantity: str
    units: str
    present: Finding
    measures: tuple[Measure, ...]
    sets: tuple[PinnedSet, ...]
    notes: tuple[str, ...] = ()

    @property
    def best(self) -> Measure | None:
        """The input whose exact knowledge leaves least; None where no value is determined."""
        return self.measures[0] if self.measures and self.measures[0].known.value is not None else None


def influences(summary: Summary) -> list[Influence]:
    """The influence of the inputs on every quantity; quantities of which nothing was asked are left out."""
    entries = ((name, entry) for name, entry in summary["quantities"].items() if entry.get("sensitivity"))
    return [_influence(name, entry) for name, entry in entries]


def measurements(summary: Summary) -> list[Measurement]:
    """What to measure next for every quantity of which it was asked."""
    entries = summary["quantities"].items()
    return [
        _measurement(name, entry)
        for name, entry in entries
        if entry.get("measure_next") or entry.get("pin_down")
    ]


def ends_of(found: Finding) -> tuple[float, float]:
    """The interval, infinite where it is open."""
    low, high = found.interval
    return -math.inf if low is None else low, math.inf if high is None else high


def _influence(name: str, entry: Mapping[str, Any]) -> Influence:
    stated = entry["sensitivity"]
    inputs = [
        InputInfluence(
            path, {kind: _index(kind.name, path, one[kind.key]) for kind in INDICES if one.get(kind.key)}
        )
        for path, one in stated.items()
        if path != "noise"
    ]
    kind = _ruling(inputs)
    if kind is not None:
        inputs.sort(key=lambda one: _falling(_value(one, kind)))
    noise = (stated.get("noise") or {}).get("total")
    ranking = _ranking(entry, inputs)
    return Influence(
        quantity=name,
        inputs=tuple(inputs),
        pairs=tuple(sorted(_pairs(stated), key=lambda pair: _falling(pair.index.value))),
        noise=None if noise is None else _index(TOTAL.name, "noise", noise),
        first_is_largest=ranking.get("first_is_largest"),
        above_next=tuple(ranking.get("above_next", ())),
        notes=tuple(entry.get("notes") or ()),
    )


def _ranking(entry: Mapping[str, Any], inputs: Sequence[InputInfluence]) -> Mapping[str, Any]:
    """The summary's ranking where it is of these inputs by these indices; else nothing."""
    found, kind = entry.get("ranking") or {}, _ruling(inputs)
    same = kind is not None and found.get("by") == kind.key and found["order"] == [one.path for one in inputs]
    return found if same else {}


def _pairs(stated: Mapping[str, Any]) -> Iterator[PairInfluence]:
    """Every pair once, in whichever of its two places it stands first."""
    seen: set[frozenset[str]] = set()
    for path, one in stated.items():
        for other, index in (one.get("second") or {}).items():
            if frozenset((path, other)) not in seen:
                seen.add(frozenset((path, other)))
                yield PairInfluence(path, other, _index("second order", f"{path} and {other}", index))


def _index(kind: str, of: str, found: Mapping[str, Any]) -> Finding:
    """An index is a share: what of its interval lies outside 0 to 1 is not shown."""
    stated = finding(f"{kind}, {of}", "1", found)
    low, high = (None if end is None else min(max(end, 0.0), 1.0) for end in stated.interval)
    return replace(stated, interval=(low, high))


def _measurement(name: str, entry: Mapping[str, Any]) -> Measurement:
    units = entry["units"]
    measures = [
        Measure(
            path,
            finding(f"{path} known exactly", units, one["remaining_sd_known"]),
            finding(f"spread of {path} halved", units, one["remaining_sd_halved"]),
            one["may_be_fixed"],
        )
        for path, one in (entry.get("measure_next") or {}).items()
    ]
    measures.sort(key=lambda one: math.inf if one.known.value is None else one.known.value)
    sets = [
        PinnedSet(
            None if one["inputs"] is None else tuple(one["inputs"]),
            one["remaining_sd"],
            one["wanted_sd"],
            one["exhaustive"],
            one.get("reason") or "",
        )
        for one in entry.get("pin_down") or ()
    ]
    present = finding("standard deviation", units, entry["sd"])
    notes = () if entry.get("sensitivity") else tuple(entry.get("notes") or ())
    return Measurement(name, units, present, tuple(measures), tuple(sets), notes)


def _ruling(inputs: Sequence[InputInfluence]) -> IndexKind | None:
    known = (kind for kind in (TOTAL, SHAPLEY, FIRST) if any(_value(one, kind) is not None for one in inputs))
    return next(known, None)


def _value(one: InputInfluence, kind: IndexKind) -> float | None:
    return one.indices[kind].value if kind in one.indices else None


def _falling(value: float | None) -> float:
    return math.inf if value is None else -value
