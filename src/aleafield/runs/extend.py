"""More samples for a run that ended: the old ones stay, the same stream of points goes on."""

from __future__ import annotations

from pathlib import Path

from aleafield.archive.durable import remove_partials
from aleafield.archive.layout import Layout
from aleafield.archive.lock import locked
from aleafield.errors import ArchiveError, InputError
from aleafield.runs.execution import clear_parts, is_complete, stored_ensemble
from aleafield.runs.folder import stored_study
from aleafield.runs.model import design_of
from aleafield.runs.plan_file import read_plan, with_more_samples, write_plan
from aleafield.runs.planning import planned_model
from aleafield.runs.progress import NoProgress, Progress
from aleafield.runs.run import RunResult, finish, worker_count
from aleafield.runs.stages import first_stage, refuse_impossible_runs
from aleafield.sampling.allocation import extended
from aleafield.study.study import Study

MOST_SAMPLES = 1_000_000_000
"""As many as a study file may ask for."""


def extend(
    folder: Path | str,
    samples: int,
    workers: int | None = None,
    progress: Progress | None = None,
    study: Study | None = None,
) -> RunResult:
    """Add parameter samples, each with as many noise paths as before, to a finished run.

    A run of S samples extended to S' equals a run of S' samples value for value.  An extension that was
    interrupted is finished by the same call, and nothing is added to it.

    Parameters
    ----------
    folder : results folder
    samples : int
        At least so many more; quasi-Monte Carlo rounds up to the next power of two per scrambling.
    workers, progress : as in `run`
    study : Study, optional
        Needed only where quantities are Python functions, which no file holds.

    Raises
    ------
    InputError
        When fewer than one sample is asked, or nothing is uncertain.
    ArchiveError
        When the folder holds no finished run.
    Interrupted
        When the extension was stopped; the same call goes on.
    """
    if samples < 1:
        raise InputError("samples", f"{samples} given", "at least one sample more is needed")
    if samples > MOST_SAMPLES:
        raise InputError("samples", f"{samples} given", f"at most {MOST_SAMPLES:,} more are possible")
    progress = progress or NoProgress()
    layout = Layout(Path(folder))
    plan = read_plan(layout)
    study = stored_study(layout, plan) if study is None else study
    if study.digest != plan.digest:
        raise ArchiveError(
            f"{layout.folder}: its study.toml is not the study that was run (quantities that are Python "
            "functions must be given again, from Python)"
        )
    if not study.inputs and plan.noise is None:
        raise InputError("samples", "the study has no uncertain inputs", "one run says everything")
    if stored_ensemble(layout).realizations == 0:
        raise ArchiveError(f"{layout.folder}: the run is unfinished; run it to its end before extending it")
    with locked(layout):
        remove_partials(layout.folder)
        model = planned_model(study, plan)
        if is_complete(layout, plan):
            clear_parts(layout)
            allocation = extended(plan.allocation, samples)
            if allocation.note:
                progress.say(allocation.note)
            refuse_impossible_runs(study, design_of(study, allocation), allocation)
            plan = first_stage(study, with_more_samples(plan, model, allocation))
            write_plan(layout, plan)
        return finish(layout, study, plan, model, worker_count(workers), progress)
