"""From a study to its forward model, with the choices that pilots settle."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from aleafield.field.noise_modes import SAMPLES as NOISE_SAMPLES
from aleafield.field.noise_modes import NoiseModes, choose_modes
from aleafield.forward.field_model import FieldModel
from aleafield.forward.pilots import Demand, choose_halvings, circular_mean, pilot_realizations
from aleafield.geometry import Ring
from aleafield.projection.pairing import resolve
from aleafield.quantities import PeakPosition
from aleafield.randomness.design import Design
from aleafield.runs.probing import affordable_share, probe_demand
from aleafield.runs.resolution import stable_step
from aleafield.sampling.allocation import Allocation
from aleafield.study.study import Study

PILOT_TIMES = 21
"""Times spread over the run at which pilots compare fields."""
STABILITY_SAMPLES = 4096
"""Samples whose largest stable step is looked at, from the front of the stream, however many a run has."""
MOST_FURTHER_HALVINGS = 3
"""How often a step that the pilots accept is halved again for the sake of the error split."""
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
    noise : NoiseModes or None
        The modes that are kept of the noise.
    probe_demand : float
        Share of the samples that the error split must see for its own noise to stay small; 0 without noise.
    notes : tuple of str
        What the user must know of these choices.
    """

    time_step: float
    peak_references: Mapping[str, float]
    noise: NoiseModes | None = None
    probe_demand: float = 0.0
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
        choices.noise,
        allocation.repeats,
    )


def noise_modes(study: Study, allocation: Allocation) -> NoiseModes | None:
    """The modes of a study's noise; None without noise."""
    equation = study.equation
    if equation.noise is None:
        return None
    pairing = resolve(study.scheme, equation)
    samples = np.arange(NOISE_SAMPLES if study.inputs else 1, dtype=np.int64)
    first = equation.bind(equation.binding(design_of(study, allocation).values(samples)))
    finest, _ = pairing.refined(pairing.nodes, pairing.quadrature_points)
    return choose_modes(equation, first, pairing.nodes, finest)


def make_choices(study: Study, allocation: Allocation) -> Choices:
    """Settle what a study leaves open: noise modes, time step, references of peak positions, demand for probes."""
    noise = noise_modes(study, allocation)
    step, notes = _time_step(study, allocation, noise)
    if noise is not None and noise.note:
        notes = (*notes, noise.note)
    if noise is not None and study.scheme.time_step is None:
        step = _step_for_the_split(study, allocation, Choices(step, {}, noise))
    choices = Choices(step, {}, noise, notes=notes)
    model = field_model(study, allocation, choices)
    choices = replace(choices, peak_references=_peak_references(study, model))
    if noise is not None:
        choices = replace(choices, probe_demand=probe_demand(field_model(study, allocation, choices)))
    return choices


def _step_for_the_split(study: Study, allocation: Allocation, choices: Choices) -> float:
    """The step, halved until as many probes as may be afforded tell the time part from its own noise.

    First passages and fronts jump from path to path: few paths differ much between two steps, and the mean of such
    differences needs many probes.  A smaller step makes them rarer.
    """
    step = choices.time_step
    for _ in range(MOST_FURTHER_HALVINGS):
        model = field_model(study, allocation, replace(choices, time_step=step))
        if probe_demand(model, "time") <= affordable_share(model):
            break
        step /= 2.0
    return step


def _peak_references(study: Study, model: FieldModel) -> dict[str, float]:
    """Circular means of the peaks that the pilots have, on a ring."""
    names = [q.name for q in study.quantities if isinstance(q, PeakPosition)]
    domain = study.equation.domain
    if not names or not isinstance(domain, Ring):
        return {}
    records = model.evaluate(model.level, pilot_realizations(model))
    return {name: circular_mean(records.values[name], domain.length) for name in names}


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
        found.append(np.broadcast_to(stable_step(bound, gain), samples.shape))
    return np.concatenate(found)


def _time_step(
    study: Study, allocation: Allocation, noise: NoiseModes | None
) -> tuple[float, tuple[str, ...]]:
    """The step of the study, or the one that pilots choose below what is stable; and what to say of it.

    Pilots start at an eighth of the duration, or half the smallest stable step where that is shorter.  Under
    noise they follow their own paths, the same at every step, and do not judge quantities that look inside the
    steps: bridges are shared by the levels of the error split alone, and extremes seen at the ends of steps
    approach their limit too slowly to wait for.
    """
    duration = study.equation.dynamics.duration
    given = study.scheme.time_step
    model = field_model(study, allocation, Choices(given or duration / 8, {}, noise))
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
    if noise is not None:
        judged = tuple(q for q in study.quantities if not (q.bridged or q.open_side or q.open_occurrence))
        study = replace(study, quantities=judged)
    model = field_model(study, allocation, Choices(base, {}, noise))
    times = np.linspace(0.0, duration, PILOT_TIMES)
    if noise is not None:  # ends of steps: between them a noisy path is known to the root of the step only
        ends = model.schedule().times
        times = ends[np.unique(np.linspace(0, len(ends) - 1, PILOT_TIMES).round().astype(np.int64))]
    aim = study.aim
    demand = None if aim is None or aim.relative else Demand(aim.quantity, aim.tolerance)
    note = ""
    if demand is not None and all(q.name != demand.quantity for q in study.quantities):
        note = f'time_step = "auto" is not judged by {demand.quantity}, which looks inside the steps of noisy paths'
    settled = choose_halvings(model, model.level, pilot_realizations(model), list(times), demand)
    return base / 2**settled.halvings, tuple(filter(None, (settled.note, note)))
