"""The main job: from a study to a results folder, resuming by itself what is unfinished."""

from __future__ import annotations

import json
import os
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from aleafield.archive.durable import remove_partials
from aleafield.archive.ensemble_file import Summary
from aleafield.archive.ensemble_reader import reading
from aleafield.archive.layout import Layout
from aleafield.archive.lock import locked
from aleafield.errors import InputError
from aleafield.forward.field_model import FieldModel
from aleafield.runs.execution import (
    Question,
    clear_parts,
    execute,
    gather_stage,
    is_complete,
    is_solved,
    put_together,
    stored_ensemble,
)
from aleafield.runs.folder import claimed_plan, stored_text, write_study
from aleafield.runs.plan_file import Plan, write_plan
from aleafield.runs.planning import make_plan, planned_model
from aleafield.runs.progress import NoProgress, Progress
from aleafield.runs.question import question_of
from aleafield.runs.reporting import write_report
from aleafield.runs.settling import next_stage
from aleafield.runs.summary import unmet
from aleafield.study.study import Study


@dataclass(frozen=True)
class RunResult:
    """What a run leaves.

    Attributes
    ----------
    folder : Path
    summary : mapping
        As in summary.json.
    solved : int
        Chunks that this call solved; 0 where everything was in place.
    unmet : tuple of str
        What the study demands and the run does not give.
    """

    folder: Path
    summary: Mapping[str, Any]
    solved: int
    unmet: tuple[str, ...]

    @property
    def files(self) -> tuple[str, ...]:
        """Paths that a reader of the result looks for first."""
        layout = Layout(self.folder)
        return tuple(str(path) for path in (layout.report, layout.summary, layout.ensemble))

    @property
    def exit_status(self) -> int:
        """0 done; 1 the run ended, but something that is demanded is not met."""
        return 1 if self.unmet else 0


def run(
    study: Study,
    out: Path | str,
    workers: int | None = None,
    progress: Progress | None = None,
    chunk_width: int | None = None,
) -> RunResult:
    """Run a study into a folder, or go on where an earlier call stopped.

    Where the folder holds the same study finished, and only title, about or the report section differ,
    nothing is solved: summary and report are made again.

    Parameters
    ----------
    study : Study
    out : path of the results folder
    workers : int, optional
        Worker processes; default the cores at hand.  No value depends on it.
    progress : Progress, optional
    chunk_width : int, optional
        Samples of a chunk, with all their noise paths, a multiple of 8; a choice of the plan, so it counts at
        the first call only.

    Raises
    ------
    InputError
        When the study or an argument cannot be used.
    ArchiveError
        When the folder belongs to something else.
    Interrupted
        When the run was stopped; the same call goes on.
    """
    progress = progress or NoProgress()
    layout = Layout(Path(out))
    count = worker_count(workers)
    _make_results_folder(layout)
    with locked(layout):
        remove_partials(layout.folder)
        plan = claimed_plan(layout, study)
        if plan is None:
            if study.scheme.time_step is None:
                progress.say("choosing the time step by pilot samples")
            plan, model = make_plan(study, chunk_width)
            write_study(layout, study)
            write_plan(layout, plan)
        else:
            model = planned_model(study, plan)
        return finish(layout, study, plan, model, count, progress)


def finish(
    layout: Layout, study: Study, plan: Plan, model: FieldModel, workers: int, progress: Progress
) -> RunResult:
    """Bring a folder to the state that its plan describes; the caller holds its lock."""
    if is_complete(layout, plan) and _up_to_date(layout, study):
        return _result(layout, study, json.loads(layout.summary.read_text(encoding="utf-8")), 0)
    question = question_of(study, model.points(plan.level))
    solved = _solve(layout, plan, model, workers, progress)
    if not plan.settled:
        plan = _settle(layout, study, plan, question, progress)
        solved += _solve(layout, plan, model, workers, progress)
    summary = put_together(layout, plan, question)
    write_report(layout, study, plan, summary)
    write_study(layout, study)
    clear_parts(layout)
    return _result(layout, study, summary, solved)


def _solve(layout: Layout, plan: Plan, model: FieldModel, workers: int, progress: Progress) -> int:
    """Solve what an ensemble lacks; how many chunks were solved."""
    if is_solved(layout, plan):
        return 0
    return execute(layout, model, plan, stored_ensemble(layout), workers, progress)


def _settle(layout: Layout, study: Study, plan: Plan, question: Question, progress: Progress) -> Plan:
    """Decide the next stage on what the first one gave, and write it down before anything of it is solved."""
    if not is_solved(layout, plan):
        gather_stage(layout, plan, question)
    clear_parts(layout)
    with reading(layout.ensemble) as reader:
        plan, note = next_stage(study, plan, reader)
    if note:
        progress.say(note)
    write_plan(layout, plan)
    return plan


def worker_count(asked: int | None) -> int:
    """The number of workers: what is asked, else the cores that this process may use.

    Raises
    ------
    InputError
        For less than one.
    """
    if asked is None:
        return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    if asked < 1:
        raise InputError("workers", f"{asked} given", "at least one is needed")
    return asked


def _make_results_folder(layout: Layout) -> None:
    if layout.folder.exists() and not layout.folder.is_dir():
        raise InputError("out", f"{layout.folder} is a file", "a folder is needed")
    try:
        layout.folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        found = f"{layout.folder} cannot be made ({error.strerror})"
        raise InputError("out", found, "a folder in a place where you may write is needed") from None


def _up_to_date(layout: Layout, study: Study) -> bool:
    """Whether nothing is left to write: the chunks go only when everything else is in place."""
    written = layout.summary.exists() and layout.report.exists() and not layout.parts.exists()
    return written and stored_text(layout) == study.source.text


def _result(layout: Layout, study: Study, summary: Summary, solved: int) -> RunResult:
    return RunResult(layout.folder, summary, solved, unmet(study, summary))
