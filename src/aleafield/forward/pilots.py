"""Choices that a few pilot samples settle once for a study: the time step, and references on a ring."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.ensemble.forward_model import ForwardModel
from aleafield.ensemble.level import Level
from aleafield.ensemble.records import Records
from aleafield.forward.field_model import FieldModel

PILOTS = 32
"""Samples 0 to 31 are the pilots of every study with inputs, however many samples it has."""
TOLERANCES: Mapping[float, tuple[float, float]] = {4: (1e-5, 1e-3), 2: (1e-4, 2e-3), 1: (1e-2, 1e-2)}
"""By the expected order in time, what may change on halving the step: the field relative to the largest |u|,
and a quantity relative to its standard deviation over the pilots.  A lower order pays more for every digit."""
NOISY_TOLERANCES = (2e-3, 2e-2)
"""The same for noisy fields, along the same paths and in root mean square; the field may also change by the second
share of its standard deviation.  The law of a field is nearer than its paths: 2 % of path is less of any moment."""
TINY = 1e-9
"""Changes below this share of the largest |u| are nothing: a quantity may be zero by symmetry."""
MOST_HALVINGS = 8


@dataclass(frozen=True)
class Settled:
    """What the pilots found.

    Attributes
    ----------
    halvings : int
        How often the model's step is halved.
    note : str
        What did not settle within the most halvings; empty where all did.
    """

    halvings: int
    note: str = ""


@dataclass(frozen=True)
class Demand:
    """A half-width that is demanded of a quantity; a twentieth of it may come from the time step."""

    quantity: str
    tolerance: float


def pilot_realizations(model: FieldModel) -> IntArray:
    """Indices of the pilots, each with its first noise path, a multiple of 8.

    Realization 0 alone, repeated, where nothing is uncertain.
    """
    if not model.inputs and model.noise is None:
        return np.zeros(8, dtype=np.int64)
    return np.arange(PILOTS, dtype=np.int64) * model.repeats


def choose_halvings(
    model: ForwardModel,
    level: Level,
    realizations: IntArray,
    times: Sequence[float],
    demand: Demand | None,
) -> Settled:
    """The least number of halvings of the model's step after which halving it again changes next to nothing.

    Judged over the whole run, since any step gets a steady state right: the field at `times` by its largest
    change (of a noisy field by its root mean square), every quantity by its root-mean-square change over the
    pilots.

    Parameters
    ----------
    model : ForwardModel
    level : Level
    realizations : pilots
    times : model times spread over the run
    demand : Demand or None
    """
    order = next(part.expected_order for part in model.path(level) if part.name == "time") or 1.0
    if level.modes:
        tolerances = NOISY_TOLERANCES
    else:
        tolerances = TOLERANCES[max(known for known in TOLERANCES if known <= max(order, 1.0))]
    coarse = model.evaluate(_halved(level, 0), realizations, times)
    restless = ""
    for halvings in range(MOST_HALVINGS):
        fine = model.evaluate(_halved(level, halvings + 1), realizations, times)
        restless = _restless(coarse, fine, tolerances, demand, noisy=level.modes > 0)
        if not restless:
            return Settled(halvings)
        coarse = fine
    return Settled(
        MOST_HALVINGS,
        f'time_step = "auto": after {MOST_HALVINGS} halvings {restless} still changes with the step; '
        "the time part of the error says by how much",
    )


def _halved(level: Level, halvings: int) -> Level:
    return replace(level, halvings=halvings)


def _restless(
    coarse: Records, fine: Records, tolerances: tuple[float, float], demand: Demand | None, *, noisy: bool
) -> str:
    """What still changes with the step, in words; empty where nothing does."""
    of_field, of_spread = tolerances
    both = coarse.valid & fine.valid
    if not np.array_equal(coarse.valid, fine.valid):
        return "which samples stay finite"
    if not both.any():
        return ""  # no step helps: the run itself will report the failures
    assert coarse.fields is not None
    assert fine.fields is not None
    scale = float(np.abs(fine.fields[both]).max())
    change = coarse.fields[both] - fine.fields[both]
    if noisy:
        still = max(of_field * scale, of_spread * _root_mean_square(fine.fields[both].std(axis=0)))
        if _root_mean_square(change) > still:
            return "the field"
    elif np.abs(change).max() > of_field * scale:
        return "the field"
    for name, values in fine.values.items():
        difference = (coarse.values[name] - values)[both]
        difference = difference[np.isfinite(difference)]
        if len(difference) == 0:
            continue
        size = _root_mean_square(difference)
        spread = float(np.nanstd(values[both]))
        allowed = max(of_spread * spread, of_field * float(np.nanmax(np.abs(values[both]))), TINY * scale)
        if demand is not None and demand.quantity == name:
            allowed = min(allowed, demand.tolerance / 20)
        if size > allowed:
            return f"the quantity {name}"
    return ""


def _root_mean_square(values: FloatArray) -> float:
    return float(np.sqrt(np.mean(values**2)))


def circular_mean(positions: FloatArray, length: float) -> float:
    """Mean direction of positions on a ring (Mardia and Jupp 2000, Directional Statistics, section 2.2)."""
    finite = positions[np.isfinite(positions)]
    if len(finite) == 0:
        return 0.0
    phase = 2j * np.pi * finite / length
    return float(np.angle(np.exp(phase).sum()) * length / (2 * np.pi))
