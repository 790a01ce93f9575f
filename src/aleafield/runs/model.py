"""From a study to its forward model, with the choices that pilots settle."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from aleafield.field.parameter import Bound
from aleafield.forward.field_model import FieldModel
from aleafield.forward.pilots import choose_halvings, circular_mean, pilot_samples
from aleafield.geometry import Ring
from aleafield.quantities import PeakPosition
from aleafield.randomness.design import Design
from aleafield.sampling.allocation import Allocation
from aleafield.study.study import Study

PILOT_TIMES = 21
"""Times spread over the run at which pilots compare fields."""


@dataclass(frozen=True)
class Choices:
    """What pilots settle once for a study.

    Attributes
    ----------
    time_step : float
        Largest step of the schedule, units of time.
    peak_references : mapping
        By quantity: the position about which peak positions on a ring are unwrapped.
    """

    time_step: float
    peak_references: Mapping[str, float]


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
    pilots = pilot_samples(allocation.samples)
    step = study.scheme.time_step
    if step is None:
        step = _chosen_step(study, allocation)
    choices = Choices(step, {})
    names = [q.name for q in study.quantities if isinstance(q, PeakPosition)]
    domain = study.equation.domain
    if not names or not isinstance(domain, Ring):
        return choices
    model = field_model(study, allocation, choices)
    records = model.evaluate(model.level, pilots)
    distinct = len(np.unique(pilots))
    references = {name: circular_mean(records.values[name][:distinct], domain.length) for name in names}
    return Choices(step, references)


def _chosen_step(study: Study, allocation: Allocation) -> float:
    """Half the smallest time constant of the pilots, halved until halving changes next to nothing."""
    pilots = pilot_samples(allocation.samples)
    design = design_of(study, allocation)
    binding = study.equation.binding(design.values(pilots))
    bound: Bound = study.equation.dynamics.bind("dynamics", binding).time_constant  # type: ignore[assignment]
    duration = study.equation.dynamics.duration
    base = min(float(np.min(bound)) / 2, duration / 4)
    model = field_model(study, allocation, Choices(base, {}))
    times = np.linspace(0.0, duration, PILOT_TIMES)
    aim = study.aim
    tolerance = aim.tolerance if aim is not None and not aim.relative else None
    return float(base / 2 ** choose_halvings(model, model.level, pilots, list(times), tolerance))
