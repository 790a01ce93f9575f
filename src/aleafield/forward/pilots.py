"""Choices that a few pilot samples settle once for a study: the time step, and references on a ring."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.ensemble.forward_model import ForwardModel
from aleafield.ensemble.level import Level
from aleafield.ensemble.records import Records

PILOTS = 32
"""Samples 0 to 31 are the pilots of every study."""
FIELD_TOLERANCE = 1e-5
"""Accepted change of the field on halving the step, relative to the largest |u| of the pilots."""
SPREAD_TOLERANCE = 1e-3
"""Accepted change of a quantity, relative to its standard deviation over the pilots."""
MOST_HALVINGS = 10


def pilot_samples(available: int) -> IntArray:
    """Indices of the pilots, padded by the last one to a multiple of 8."""
    count = min(PILOTS, available)
    padded = -(-count // 8) * 8
    return np.minimum(np.arange(padded, dtype=np.int64), count - 1)


def choose_halvings(
    model: ForwardModel, level: Level, samples: IntArray, times: Sequence[float], tolerance: float | None
) -> int:
    """The least number of halvings of the model's step after which halving it again changes next to nothing.

    Judged over the whole run, since any step gets a steady state right: the field at `times` by its largest
    change, every quantity by its root-mean-square change over the pilots.

    Parameters
    ----------
    model : ForwardModel
    level : Level
    samples : pilots
    times : model times spread over the run
    tolerance : float or None
        A demanded half-width: no quantity's change may exceed a twentieth of it.
    """
    coarse = model.evaluate(_halved(level, 0), samples, times)
    for halvings in range(MOST_HALVINGS):
        fine = model.evaluate(_halved(level, halvings + 1), samples, times)
        if _settled(coarse, fine, tolerance):
            return halvings
        coarse = fine
    return MOST_HALVINGS


def _halved(level: Level, halvings: int) -> Level:
    return Level(level.nodes, level.quadrature_points, halvings)


def _settled(coarse: Records, fine: Records, tolerance: float | None) -> bool:
    both = coarse.valid & fine.valid
    if not np.array_equal(coarse.valid, fine.valid):
        return False
    if not both.any():
        return True  # no step helps: the run itself will report the failures
    assert coarse.fields is not None
    assert fine.fields is not None
    change = np.abs(coarse.fields[both] - fine.fields[both]).max()
    scale = np.abs(fine.fields[both]).max()
    if change > FIELD_TOLERANCE * scale:
        return False
    for name, values in fine.values.items():
        difference = (coarse.values[name] - values)[both]
        difference = difference[np.isfinite(difference)]
        if len(difference) == 0:
            continue
        size = float(np.sqrt(np.mean(difference**2)))
        spread = float(np.nanstd(values[both]))
        allowed = max(SPREAD_TOLERANCE * spread, FIELD_TOLERANCE * float(np.nanmax(np.abs(values[both]))))
        if tolerance is not None:
            allowed = min(allowed, tolerance / 20)
        if size > allowed:
            return False
    return True


def circular_mean(positions: FloatArray, length: float) -> float:
    """Mean direction of positions on a ring (Mardia and Jupp 2000, Directional Statistics, section 2.2)."""
    finite = positions[np.isfinite(positions)]
    if len(finite) == 0:
        return 0.0
    phase = 2j * np.pi * finite / length
    return float(np.angle(np.exp(phase).sum()) * length / (2 * np.pi))
