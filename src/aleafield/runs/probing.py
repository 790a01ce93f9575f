"""How many probes the error split of a noisy field needs: seen on pilots, before the run."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from aleafield.accounting import LARGEST_SHARE, PilotDifferences, anticipated_factor, demand
from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level, PathPart
from aleafield.ensemble.records import Records
from aleafield.forward.field_model import FieldModel
from aleafield.forward.pilots import PILOTS
from aleafield.runs.plan_file import extra_levels

MOST_REPEATS = 2
"""Noise paths of each pilot that are looked at, the first ones."""


def affordable_share(model: FieldModel) -> float:
    """Share of the samples that may be probes where their extra levels cost as much as all samples."""
    extra = extra_levels(model.path(model.level), model.level)
    return LARGEST_SHARE * model.operations(model.level) / sum(model.operations(level) for level in extra)


def probe_demand(model: FieldModel, part: str | None = None) -> float:
    """Share of the samples that must be probes for the noise of the error split to stay small.

    Differences between levels of a noisy field are noisy themselves: where they spread widely against the
    quantity, few probes would tell little of their mean.  The pilots are the first parameter samples, on the
    levels of each part; what they solve is solved again by the run, whose chunks know nothing of them.

    Parameters
    ----------
    model : FieldModel
        With noise.
    part : str, optional
        One part of the discretisation alone.
    """
    return demand(_differences(model, [p for p in model.path(model.level) if part in (None, p.name)]))


def _differences(model: FieldModel, path: Sequence[PathPart]) -> Iterator[PilotDifferences]:
    paths = min(model.repeats, MOST_REPEATS)
    pilots = (np.arange(PILOTS)[:, None] * model.repeats + np.arange(paths)).ravel().astype(np.int64)
    found: dict[Level, Records] = {}

    def at(level: Level) -> Records:
        if level not in found:
            found[level] = model.evaluate(level, pilots)
        return found[level]

    def values(records: Records, name: str) -> FloatArray:
        return records.values[name].reshape(PILOTS, paths)

    run = at(model.level)
    for part in path:
        factor = anticipated_factor(part.expected_order, part.ratio, part.known_factor)
        coarser, finer = (at(level) for level in part.pair)
        for quantity in model.quantities:
            name = quantity.name
            if name not in part.open_side and name not in part.open_occurrence:
                difference = values(coarser, name) - values(finer, name)
                yield PilotDifferences(values(run, name), difference, factor)
