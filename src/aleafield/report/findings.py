"""Findings: one statistic of one quantity with its interval and error parts, as the summary has it."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

from aleafield.accounting.split import RESOLUTION
from aleafield.ensemble.level import Side
from aleafield.report.data import Summary
from aleafield.report.parts import PARTS, Part
from aleafield.report.rounding import Earned, earned
from aleafield.units import Units


@dataclass(frozen=True)
class ObservedOrder:
    """Order of a part, observed (None: not seen) and expected (None: beyond any power), and its factor."""

    observed: float | None
    expected: float | None
    factor: float | None


@dataclass(frozen=True)
class Finding:
    """One statistic of a quantity.

    Attributes
    ----------
    name : of the statistic, as in "mean", "quantile 0.95", "P(above 4.0 mm)"
    units : of value, interval and error; "1" for probabilities
    value : None where it is not determined
    interval : (low, high), None where open or not determined
    error : by part; None where a part does not apply
    total : half-width; None where not determined, or where an end of the interval is open
    reason : why something is not determined, or ""
    corrected : the finding with the biases subtracted, where offered
    notes : what a reader must know of the parts
    orders : by part, as far as measured
    """

    name: str
    units: str
    value: float | None
    interval: tuple[float | None, float | None]
    error: Mapping[str, float | None] = field(default_factory=dict)
    total: float | None = None
    reason: str = ""
    corrected: Finding | None = None
    notes: tuple[str, ...] = ()
    orders: Mapping[str, ObservedOrder] = field(default_factory=dict)

    @property
    def rounded(self) -> Earned:
        """Value, interval and half-width to the digits they earned."""
        return earned(self.value, self.interval, self.total)

    @property
    def open_side(self) -> Side | None:
        """The side of the value on which nothing bounds the truth; None where both ends, or none, are known."""
        low, high = self.interval
        if self.value is None or (low is None) == (high is None):
            return None
        return "above" if high is None else "below"

    @property
    def reach(self) -> float | None:
        """The total; where an end is open, the length of the side that is bounded."""
        if self.total is not None or self.value is None or self.open_side is None:
            return self.total
        low, high = self.interval
        end = low if high is None else high
        assert end is not None
        return abs(self.value - end)

    def shares(self) -> dict[Part, float]:
        """Share of each part that applies in the total (in the bounded side, where the other is open).

        The shares add up to 1.  Biases add up.  What is random adds in quadrature, so the random parts divide
        their common half-width in proportion to their squares.  Empty where there is no positive total.
        """
        sizes = {part: self.error.get(part.key) for part in PARTS}
        present = {part: size for part, size in sizes.items() if size is not None}
        root = math.hypot(*(size for part, size in present.items() if part.random))
        lengths = {
            part: (size * (size / root) if root > 0 else 0.0) if part.random else size
            for part, size in present.items()
        }
        total = sum(lengths.values())
        if self.reach is None or not total > 0:
            return {}
        return {part: length / total for part, length in lengths.items()}

    def main_part(self) -> tuple[Part, float] | None:
        """The part with the largest share, and its share; None where there is no positive total."""
        shares = self.shares()
        if not shares:
            return None
        part = max(shares, key=lambda p: shares[p])
        return part, shares[part]

    def resolved(self, part: Part) -> bool:
        """Whether a part is large enough beside the total to be read by itself."""
        size, reach = self.error.get(part.key), self.reach
        return size is not None and reach is not None and size >= RESOLUTION * reach


def finding(name: str, units: str, found: Mapping[str, Any]) -> Finding:
    """The finding of one statistic of the summary."""
    low, high = found.get("interval") or (None, None)
    error = found.get("error") or {}
    corrected = found.get("corrected")
    return Finding(
        name=name,
        units=units,
        value=found.get("value"),
        interval=(low, high),
        error={part.key: error.get(part.key) for part in PARTS},
        total=error.get("total"),
        reason=found.get("reason") or "",
        corrected=None if corrected is None else finding(f"{name}, corrected", units, corrected),
        notes=tuple(found.get("notes") or ()),
        orders={
            key: ObservedOrder(order.get("observed"), order.get("expected"), order.get("factor"))
            for key, order in (found.get("orders") or {}).items()
        },
    )


@dataclass(frozen=True)
class VarianceFindings:
    """The variance of a quantity, parted into what the parameters and what the noise causes.

    Attributes
    ----------
    parameters, share : variance from the parameters, its share in the total; None without uncertain inputs
    noise, total : variance from the noise, variance of the realizations
    """

    parameters: Finding | None
    noise: Finding
    share: Finding | None
    total: Finding

    def all(self) -> Iterator[Finding]:
        """Every finding that applies, in the order of tables."""
        yield from (one for one in (self.parameters, self.noise, self.total, self.share) if one is not None)


@dataclass(frozen=True)
class QuantityFindings:
    """All findings on one quantity, None or empty where they do not apply or were not asked.

    Keys of `quantiles` and `exceed` are numbers as the summary writes them.
    """

    name: str
    units: str
    mean: Finding
    sd: Finding
    quantiles: Mapping[str, Finding]
    exceed: Mapping[str, Finding]
    occurs: Finding | None
    variance: VarianceFindings | None = None

    def all(self) -> Iterator[Finding]:
        """Every finding but the parts of the variance, in the order of tables and pictures."""
        yield self.mean
        yield self.sd
        yield from self.quantiles.values()
        yield from self.exceed.values()
        if self.occurs is not None:
            yield self.occurs


def quantity_findings(summary: Summary) -> list[QuantityFindings]:
    """The findings on every quantity, in the summary's order."""
    return [_of_quantity(name, entry) for name, entry in summary["quantities"].items()]


def _of_quantity(name: str, entry: Mapping[str, Any]) -> QuantityFindings:
    units, occurs = entry["units"], entry["occurs"]
    return QuantityFindings(
        name=name,
        units=units,
        mean=finding("mean", units, entry["mean"]),
        sd=finding("standard deviation", units, entry["sd"]),
        quantiles={
            key: finding(f"quantile {key}", units, value) for key, value in entry["quantiles"].items()
        },
        exceed={
            key: finding(f"P(above {with_units(key, units)})", "1", value)
            for key, value in entry["exceed"].items()
        },
        occurs=None if occurs is None else finding("P(occurs)", "1", occurs),
        variance=_of_variance(units, entry["variance"]),
    )


def _of_variance(units: str, entry: Mapping[str, Any] | None) -> VarianceFindings | None:
    if entry is None:
        return None
    parameters, share, square = entry["parameters"], entry["share"], squared(units)
    return VarianceFindings(
        parameters=None if parameters is None else finding("from the parameters", square, parameters),
        noise=finding("from noise", square, entry["noise"]),
        share=None if share is None else finding("share of the parameters", "1", share),
        total=finding("total", square, entry["total"]),
    )


@dataclass(frozen=True)
class FieldFindings:
    """Variance and correlation length of the field at a time, and that time."""

    time: float
    variance: Finding
    correlation_length: Finding


def field_findings(summary: Summary, units: Units) -> list[FieldFindings]:
    """What the summary states of the field itself, by time; empty without noise."""
    return [
        FieldFindings(
            entry["time"],
            finding("variance", squared(units.activity), entry["variance"]),
            finding("correlation length", units.length, entry["correlation_length"]),
        )
        for entry in summary["field"] or ()
    ]


def squared(units: str) -> str:
    """The unit of a square in UDUNITS form.

    >>> squared("mm"), squared("mm ms-1"), squared("1")
    ('mm2', '(mm ms-1)2', '1')
    """
    return Units(activity=units).derived((2, 0, 0))


def with_units(text: str, units: str) -> str:
    """A number with its unit; "1" is not written.

    >>> with_units("3.1", "mm"), with_units("3.1", "1")
    ('3.1 mm', '3.1')
    """
    return text if units in ("", "1") else f"{text} {units}"
