"""A study: the question, the field, the scheme, the sampling and what is wanted of the answer."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Literal

from aleafield.field.equation import FieldEquation
from aleafield.projection.scheme import Scheme
from aleafield.quantities import Quantity
from aleafield.randomness.inputs import Dependence, Input
from aleafield.sampling.request import SamplingRequest
from aleafield.units import ACTIVITY, Units

SensitivityIndex = Literal["first", "total", "second", "shapley"]
"""Sobol' indices of first order, total, of second order, and Shapley effects."""


@dataclass(frozen=True)
class Aim:
    """What accuracy is demanded of the mean of a quantity.

    Attributes
    ----------
    tolerance : float
        Half-width `total`; a share of |mean| where `relative`.
    relative : bool
    quantity : str
    text : str
        As the study states it, for messages and the summary.
    """

    tolerance: float
    relative: bool
    quantity: str
    text: str


@dataclass(frozen=True)
class ReportRequest:
    """Quantiles (probabilities in (0, 1)) and, by quantity, levels whose exceedance is wanted."""

    quantiles: tuple[float, ...] = (0.05, 0.5, 0.95)
    exceed: Mapping[str, tuple[float, ...]] = field(default_factory=dict)


@dataclass(frozen=True)
class SensitivityRequest:
    """What is wanted of the inputs: which of them cause the spread, and which to measure next.

    Attributes
    ----------
    indices : tuple of SensitivityIndex
        In Python any sequence, in any order.
    wanted_sd : mapping of quantity to standard deviation
        In units of the quantity: the cheapest set of inputs is wanted that brings its spread below this.
    fix_below : float or None
        Share of the variance, between 0 and 1: an input may be fixed where its total index is surely below.  None
        where it is not asked for; then 0.01 counts where total indices are at hand anyway.
    """

    indices: Sequence[SensitivityIndex] = ()
    wanted_sd: Mapping[str, float] = field(default_factory=dict)
    fix_below: float | None = None


@dataclass(frozen=True)
class Keep:
    """Which fields are stored: none, the final ones or all steps (at most 200), and further times."""

    fields: Literal["none", "final", "all"] = "final"
    times: tuple[float, ...] = ()


@dataclass(frozen=True)
class StudySource:
    """Where a study came from.

    Attributes
    ----------
    path : Path or None
    text : str
        Exact text of the file; for a study built in Python a canonical description of it.
    data_files : mapping of the name used in the study to the file's bytes
    lines : mapping of dotted key path to line number
    """

    path: Path | None
    text: str
    data_files: Mapping[str, bytes] = field(default_factory=dict)
    lines: Mapping[str, int] = field(default_factory=dict)


@dataclass(frozen=True)
class Study:
    """Everything that one study file says.

    `digest` covers what decides the samples and the solver: not title, about and the report section.
    """

    title: str
    equation: FieldEquation
    scheme: Scheme
    quantities: tuple[Quantity, ...]
    source: StudySource
    digest: str
    about: str = ""
    seed: int = 1
    units: Units = Units()
    sampling: SamplingRequest = SamplingRequest()
    dependence: Dependence = Dependence()
    aim: Aim | None = None
    confidence: float = 0.95
    sensitivity: SensitivityRequest | None = None
    report: ReportRequest = ReportRequest()
    keep: Keep = Keep()
    warnings: tuple[str, ...] = ()

    @property
    def inputs(self) -> tuple[Input, ...]:
        """All uncertain inputs: those of the equation, noise last, then levels of quantities."""
        found = list(self.equation.uncertain())
        for quantity in self.quantities:
            found.extend(quantity.uncertain(f"quantity.{quantity.name}"))
        return tuple(Input(u.path, u.law, self.units.derived(u.dimension)) for u in found)

    def quantity_units(self, quantity: Quantity) -> str:
        """Unit label of a quantity."""
        return self.units.derived(quantity.dimension)

    @property
    def activity_unit(self) -> str:
        """Unit label of the field."""
        return self.units.derived(ACTIVITY)
