"""From a study to its forward model, with the choices that pilots settle."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from aleafield.forward.field_model import FieldModel
from aleafield.forward.pilots import Demand, choose_halvings, circular_mean, pilot_samples
from aleafield.geometry import Ring
from aleafield.quantities import PeakPosition
from aleafield.randomness.design import Design
from aleafield.sampling.allocation import Allocation
from aleafield.stepping.runge_kutta import stability_bound
from aleafield.study.study import Study

PILOT_TIMES = 21
"""Times spread over the run at which pilots compare fields."""
STABILITY_SAMPLES = 4096
"""Samples whose largest stable step is looked at, from the front of the stream, however many a run has."""
BLOCK = 256
"""Samples whose kernels are looked at together."""


@dataclass(frozen=True)
class Choices:
    """What is settled once for a study.

    Attributes
    ----------
    time_step : float
        Largest step of the schedule, units of time.
    peak_references : mapping
        By quantity: the position about which peak positions on a ring are unwrapped.
    notes : tuple of str
        What the user must know of these choices.
    """

    time_step: float
    peak_references: Mapping[str, float]
    notes: tuple[str, ...] = ()


def design_of(study: Study, allocation: Allocation) -> Design:
    """Sample index to inputs, by the method of the allocation."""
    return Design(study.inputs, study.dependence, allocation.method, study.seed)


def field_model(study: Study, allocation: Allocation, choices: Choices) -> FieldModel:
    """The forward model of a study once its choices are made."""
    return FieldModel(
        study.equation,
        study.scheme,
        study.quantities,
        design_of(study, allocation),
        study.inputs,
        choices.time_step,
        choices.peak_references,
    )


def make_choices(study: Study, allocation: Allocation) -> Choices:
    """Settle the time step where the study leaves it to pilots, and the references of peak positions."""
    pilots = pilot_samples(len(study.inputs))
    step, notes = _time_step(study, allocation)
    choices = Choices(step, {}, notes)
    names = [q.name for q in study.quantities if isinstance(q, PeakPosition)]
    domain = study.equation.domain
    if not names or not isinstance(domain, Ring):
        return choices
    model = field_model(study, allocation, choices)
    records = model.evaluate(model.level, pilots)
    references = {name: circular_mean(records.values[name], domain.length) for name in names}
    return Choices(step, references, notes)


def stable_steps(
    study: Study, allocation: Allocation, model: FieldModel
) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    """Largest stable step of each of the first samples of the stream, (n,), units of time.

    Where the slope of the rate is not known, that of the decay alone.
    """
    count = STABILITY_SAMPLES if study.inputs else 1
    discretisation = model.discretisation(model.level)
    found = []
    for first in range(0, count, BLOCK):
        samples = np.arange(first, min(first + BLOCK, count), dtype=np.int64)
        bound = study.equation.bind(study.equation.binding(model.design.values(samples)))
        gain = discretisation.gain(bound)
        step = stability_bound(bound.dynamics.time_constant, 0.0 if gain is None else gain)  # type: ignore[arg-type]
        found.append(np.broadcast_to(step, samples.shape))
    return np.concatenate(found)


def _time_step(study: Study, allocation: Allocation) -> tuple[float, tuple[str, ...]]:
    """The step of the study, or the one that pilots choose below what is stable; and what to say of it.

    Pilots start at an eighth of the duration, or half the smallest stable step where that is shorter.
    """
    duration = study.equation.dynamics.duration
    given = study.scheme.time_step
    model = field_model(study, allocation, Choices(given or duration / 8, {}))
    stable = stable_steps(study, allocation, model)
    if given is not None:
        share = float(np.mean(stable < model.schedule().longest))
        if share == 0:
            return given, ()
        return given, (
            f"the step {given:g} is above the stability bound of {100 * share:.2g} % of the samples (the "
            f"smallest is {stable.min():.3g}): their values may grow without meaning; take a smaller step",
        )
    base = min(float(stable.min()) / 2, duration / 8)  # half, since the doubled step is a level too
    model = field_model(study, allocation, Choices(base, {}))
    times = np.linspace(0.0, duration, PILOT_TIMES)
    aim = study.aim
    demand = None if aim is None or aim.relative else Demand(aim.quantity, aim.tolerance)
    pilots = pilot_samples(len(study.inputs))
    settled = choose_halvings(model, model.level, pilots, list(times), demand)
    return base / 2**settled.halvings, (settled.note,) if settled.note else ()
