"""How many probes the error split of a noisy field needs: seen on pilots, before the run."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from aleafield.accounting import PilotDifferences, anticipated_factor, demand
from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.ensemble.records import Records
from aleafield.forward.field_model import FieldModel
from aleafield.forward.pilots import PILOTS

MOST_REPEATS = 4
"""Noise paths of each pilot that are looked at, the first ones."""


def probe_demand(model: FieldModel) -> float:
    """Share of the samples that must be probes for the noise of the error split to stay small.

    Differences between levels of a noisy field are noisy themselves: where they spread widely against the
    quantity, few probes would tell little of their mean.  The pilots are the first parameter samples, on the
    levels of each part; what they solve is solved again by the run, whose chunks know nothing of them.

    Parameters
    ----------
    model : FieldModel
        With noise.
    """
    return demand(_differences(model))


def _differences(model: FieldModel) -> Iterator[PilotDifferences]:
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
    for part in model.path(model.level):
        factor = anticipated_factor(part.expected_order, part.ratio, part.known_factor)
        coarser, finer = (at(level) for level in part.pair)
        for quantity in model.quantities:
            name = quantity.name
            if name not in part.open_side and name not in part.open_occurrence:
                difference = values(coarser, name) - values(finer, name)
                yield PilotDifferences(values(run, name), difference, factor)
