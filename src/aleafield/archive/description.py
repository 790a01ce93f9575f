"""What an ensemble file says besides its values."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.randomness.families import Family

MOST_KEPT = 1024
"""Fields are stored for at most so many realizations, the first ones."""


@dataclass(frozen=True)
class InputColumn:
    """One uncertain input: its path, units and law, the law as text."""

    path: str
    units: str
    law: str


@dataclass(frozen=True)
class QuantityColumn:
    """One quantity.

    Attributes
    ----------
    name, units, measure : str
    may_not_occur : bool
        Whether it may have no value; it then has a margin.
    followed : str
        What its history shows, where it has one; empty where that is the quantity itself.
    followed_units : str
        Units of its history; empty where they are its own.
    """

    name: str
    units: str
    measure: str
    may_not_occur: bool
    followed: str = ""
    followed_units: str = ""


@dataclass(frozen=True)
class Axes:
    """Where and when fields stand.

    Attributes
    ----------
    x : float array (n,)
        Increasing positions.
    kept_times, moment_times : tuple of float
        Model times of the stored fields, and of their mean and standard deviation; none where there is no field.
    length_units, time_units, field_units : str
    """

    x: FloatArray
    kept_times: tuple[float, ...]
    moment_times: tuple[float, ...]
    length_units: str = "1"
    time_units: str = "1"
    field_units: str = "1"


@dataclass(frozen=True)
class Description:
    """Everything that ensemble.nc tells besides the values.

    Attributes
    ----------
    inputs, quantities : columns in the order of the study
    samples : int
        Parameter samples.
    repeats : int
        Noise paths of each: realization j is path j mod repeats of sample j // repeats.
    replicates : int
        Scramblings; sample i belongs to i mod replicates.
    level : Level
        The run's.
    probes : int
        Number of the first samples that are also solved, with all their paths, at the extra levels.
    extra_levels : tuple of Level
    axes : Axes
    attributes : mapping
        Provenance, as global attributes.
    families : mapping of family to count
        Further runs at the run's level, by family, none of them the main one.
    """

    inputs: tuple[InputColumn, ...]
    quantities: tuple[QuantityColumn, ...]
    samples: int
    repeats: int
    replicates: int
    level: Level
    probes: int
    extra_levels: tuple[Level, ...]
    axes: Axes
    attributes: Mapping[str, Any] = field(default_factory=dict)
    families: Mapping[Family, int] = field(default_factory=dict)

    @property
    def realizations(self) -> int:
        """All noise paths of all parameter samples."""
        return self.samples * self.repeats

    @property
    def kept(self) -> int:
        """Number of realizations whose fields are stored."""
        return min(self.realizations, MOST_KEPT) if self.axes.kept_times else 0
