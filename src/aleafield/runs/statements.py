"""From the columns of an ensemble to the statements of a quantity."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from aleafield.accounting import (
    MESH,
    Clusters,
    Expanded,
    LevelValues,
    Pair,
    PartDifferences,
    QuantityStatements,
    quantity_statements,
)
from aleafield.archive.ensemble_reader import EnsembleReader
from aleafield.ensemble.level import Level, PathPart
from aleafield.estimates import Sample
from aleafield.runs.plan_file import Plan


@dataclass(frozen=True)
class Asked:
    """What is wanted of a quantity besides its mean, sd and occurrence.

    Attributes
    ----------
    quantiles : probabilities in (0, 1)
    exceed : levels in the units of the quantity
    confidence : float in (0, 1)
    """

    quantiles: tuple[float, ...]
    exceed: tuple[float, ...]
    confidence: float


class Blocks(NamedTuple):
    """The independent blocks that realizations come in, as a `Sample` takes them."""

    replicate: NDArray[np.int32] | None = None
    replicates: int = 1
    clustered: bool = False


def blocks_of(reader: EnsembleReader, realizations: int | None = None) -> Blocks:
    """The blocks of the first realizations, default all.

    Scramblings; without them parameter samples with all their noise paths; none where all realizations are
    independent: without repeats, and where nothing but the noise is uncertain.
    """
    replicate = reader.numbers("replicate", 0, realizations)
    if replicate.any():
        return Blocks(replicate, int(replicate.max()) + 1)
    if reader.inputs and reader.repeats > 1:
        sample = reader.numbers("sample", 0, realizations)
        return Blocks(sample, int(sample[-1]) + 1, clustered=True)
    return Blocks()


@dataclass(frozen=True, eq=False)
class QuantityColumns:
    """What the statements of one quantity are made from.

    Attributes
    ----------
    name : str
    sample : Sample
        All realizations.
    parts : tuple of PartDifferences
        Differences between levels on the probes.
    clusters : Clusters or None
        Which realizations share their parameter sample; None without noise.
    """

    name: str
    sample: Sample
    parts: tuple[PartDifferences, ...]
    clusters: Clusters | None


def columns_of(
    reader: EnsembleReader, plan: Plan, quantity: str, *, round_off: float = 0.0
) -> QuantityColumns:
    """The columns of one quantity; memory holds these and no others.

    Parameters
    ----------
    reader : EnsembleReader
    plan : Plan
    quantity : str
        Its name.
    round_off : float
        As in `PartDifferences`.
    """
    noisy = plan.noise is not None
    sample = Sample.of(
        reader.values(quantity),
        margin=reader.margins(quantity),
        valid=reader.valid(),
        certain=not reader.inputs and not noisy,
        **blocks_of(reader)._asdict(),
    )
    levels = _LevelColumns(reader, plan, quantity, sample)
    parts = tuple(
        _differences(part, levels, plan, quantity, round_off) for part in (*plan.path, *_mesh(plan.path))
    )
    clusters = (
        Clusters(reader.numbers("sample").astype(np.int64), plan.repeats, bool(reader.inputs))
        if noisy
        else None
    )
    return QuantityColumns(quantity, sample, parts, clusters)


def statements_of(
    columns: QuantityColumns, asked: Asked, expanded: Expanded | None = None
) -> QuantityStatements:
    """The statements of one quantity, from its samples or from its surrogate."""
    return quantity_statements(
        columns.sample,
        columns.parts,
        asked.quantiles,
        asked.exceed,
        asked.confidence,
        columns.clusters,
        expanded,
    )


class _LevelColumns:
    """One quantity on the probes, by level."""

    def __init__(self, reader: EnsembleReader, plan: Plan, name: str, sample: Sample) -> None:
        self._reader, self._plan, self._name, self._sample = reader, plan, name, sample
        self._found: dict[Level, LevelValues] = {}

    def at(self, level: Level) -> LevelValues:
        """The quantity at a level."""
        if level not in self._found:
            self._found[level] = self._read(level)
        return self._found[level]

    def _read(self, level: Level) -> LevelValues:
        if level == self._plan.level:
            cut = slice(0, self._plan.probe_realizations)
            margin = None if self._sample.margin is None else self._sample.margin[cut]
            return LevelValues.of(self._sample.values[cut], margin, self._sample.valid[cut])
        label = level.label
        return LevelValues.of(
            self._reader.values(self._name, label),
            self._reader.margins(self._name, label),
            self._reader.valid(label),
        )


def _mesh(path: tuple[PathPart, ...]) -> tuple[PathPart, ...]:
    """Space and quadrature as one part, where both are expected to fall alike; no level is added.

    Where they fall differently the sum has no order of its own, and nothing bounds it.
    """
    parts = {part.name: part for part in path}
    quadrature, space = parts.get("quadrature"), parts.get("space")
    if quadrature is None or space is None:
        return ()
    alike = quadrature.expected_order == space.expected_order
    if not alike or quadrature.observed_only != space.observed_only:
        return ()
    if quadrature.coarse_pair is None or space.coarse_pair is None:
        return ()
    return (
        replace(
            space,
            name=MESH,
            pair=(quadrature.pair[0], space.pair[1]),
            coarse_pair=(quadrature.coarse_pair[0], space.coarse_pair[1]),
        ),
    )


def _differences(
    part: PathPart, levels: _LevelColumns, plan: Plan, name: str, round_off: float
) -> PartDifferences:
    coarse = None if part.coarse_pair is None else Pair(*(levels.at(level) for level in part.coarse_pair))
    return PartDifferences(
        name=part.name,
        probes=np.arange(plan.probe_realizations, dtype=np.int64),
        fine=Pair(*(levels.at(level) for level in part.pair)),
        coarse=coarse,
        ratio_fine=part.ratio,
        ratio_coarse=part.coarse_ratio,
        expected_order=part.expected_order,
        observed_only=part.observed_only,
        least_factor=part.least_factor.get(name, 1.0),
        peak=name in part.peaks,
        erratic=part.erratic,
        known_factor=part.known_factor,
        open_side=part.open_side.get(name),
        open_occurrence=part.open_occurrence.get(name),
        passage=name in part.passages,
        noisy=plan.noise is not None,
        round_off=round_off,
    )
