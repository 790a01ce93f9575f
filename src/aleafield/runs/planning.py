"""The plan of a study: all its choices, made once."""

from __future__ import annotations

import platform
from collections.abc import Mapping
from importlib.metadata import PackageNotFoundError, version

import numpy as np

from aleafield.archive.chunks import LANE
from aleafield.ensemble.level import Level
from aleafield.errors import InputError
from aleafield.forward.field_model import FieldModel
from aleafield.runs.folder import data_folder
from aleafield.runs.model import Choices, design_of, field_model, make_choices
from aleafield.runs.plan_file import Plan, count_probes, default_width, plan_notes
from aleafield.runs.stages import first_stage, refuse_impossible_runs
from aleafield.sampling.allocation import allocate
from aleafield.study.study import Keep, Study

MOMENT_TIMES = 41
"""Equal times at which the field's mean, standard deviation and bands are taken."""
MOST_STEPS_KEPT = 200
"""With `fields = "all"`: every step up to so many, else so many equal ones."""
PACKAGES = ("aleafield", "numpy", "scipy", "netCDF4")


def make_plan(study: Study, chunk_width: int | None = None) -> tuple[Plan, FieldModel]:
    """Decide everything that a study leaves open, and the model that follows.

    Parameters
    ----------
    study : Study
    chunk_width : int, optional
        A multiple of 8; no value depends on it.

    Raises
    ------
    InputError
        When the width is no multiple of 8, or a sample gives an impossible number of the model.
    """
    if chunk_width is not None and (chunk_width < LANE or chunk_width % LANE):
        raise InputError("chunk_width", f"{chunk_width} given", f"a positive multiple of {LANE} is needed")
    allocation = allocate(study.sampling, len(study.inputs), study.equation.noise is not None)
    refuse_impossible_runs(study, design_of(study, allocation), allocation)
    choices = make_choices(study, allocation)
    model = field_model(study, allocation, choices)
    level, path = model.level, model.path(model.level)
    probes, share = count_probes(model, level, path, allocation.samples, choices.probe_demand)
    levels = {one for part in path for one in part.levels} | {level}
    duration = study.equation.dynamics.duration
    plan = Plan(
        digest=study.digest,
        versions=versions(),
        level=level,
        time_step=choices.time_step,
        schedule_times=model.schedule_times,
        path=path,
        allocation=allocation,
        probes=probes,
        probe_share=share,
        operations={one.label: model.operations(one) for one in sorted(levels)},
        chunk_width=chunk_width
        or default_width(
            level.nodes,
            allocation.samples,
            max(matrix_numbers(model, one) for one in levels),
            allocation.repeats,
        ),
        peak_references=choices.peak_references,
        moment_times=tuple(np.linspace(0.0, duration, MOMENT_TIMES).tolist()),
        kept_times=kept_times(study.keep, np.asarray(model.schedule().times).tolist()),
        data_folder=data_folder(study.source.data_files),
        operators=operators_of(model),
        notes=(*choices.notes, *plan_notes(allocation, probes, share, choices.probe_demand)),
        choice_notes=choices.notes,
        noise=choices.noise,
        probe_demand=choices.probe_demand,
    )
    return first_stage(study, plan), model


def planned_model(study: Study, plan: Plan) -> FieldModel:
    """The model of a plan that was made before: nothing is decided anew."""
    choices = Choices(plan.time_step, plan.peak_references, noise=plan.noise, probe_demand=plan.probe_demand)
    return field_model(study, plan.allocation, choices)


def kept_times(keep: Keep, steps: list[float]) -> tuple[float, ...]:
    """Model times of the stored fields.

    Parameters
    ----------
    keep : Keep
    steps : times of the run's schedule, from 0 to the duration
    """
    times = set(keep.times)
    if keep.fields == "final":
        times.add(steps[-1])
    elif keep.fields == "all":
        few = len(steps) - 1 <= MOST_STEPS_KEPT
        times.update(steps if few else np.linspace(0.0, steps[-1], MOST_STEPS_KEPT + 1).tolist())
    return tuple(sorted(times))


def matrix_numbers(model: FieldModel, level: Level) -> int:
    """Numbers of the kernel matrix that every realization has of its own at a level; 0 where it has none."""
    discretisation = model.discretisation(level)
    own = discretisation.operator_choice.name == "dense per sample"
    return len(discretisation.test_rule.points) * len(discretisation.rule.points) if own else 0


def operators_of(model: FieldModel) -> tuple[Mapping[str, object], ...]:
    """The operator that applies the kernel at the run's level, its error, and why it was chosen."""
    choice = model.discretisation(model.level).operator_choice
    return ({"part": "kernel", "operator": choice.name, "error": choice.error, "reason": choice.reason},)


def versions() -> dict[str, str]:
    """Versions of Python and of the packages that decide the numbers."""
    found = {"python": platform.python_version()}
    for package in PACKAGES:
        try:
            found[package] = version(package)
        except PackageNotFoundError:
            found[package] = "not installed"
    return found
