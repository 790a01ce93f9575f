"""The command `report`: summary, page and figures again from what is stored; nothing is solved."""

from __future__ import annotations

import json
from pathlib import Path

from aleafield.archive.layout import Layout
from aleafield.archive.lock import locked
from aleafield.errors import ArchiveError
from aleafield.runs.execution import is_complete, put_together
from aleafield.runs.folder import stored_study, stored_text, write_study
from aleafield.runs.plan_file import read_plan
from aleafield.runs.planning import planned_model
from aleafield.runs.question import question_of
from aleafield.runs.reporting import write_report
from aleafield.runs.run import RunResult
from aleafield.runs.summary import unmet
from aleafield.study.study import Study


def report(folder: Path | str, study: Study | None = None) -> RunResult:
    """Write the report of a finished run again.

    Parameters
    ----------
    folder : results folder
    study : Study, optional
        The same study with another title, about or report section; the folder then takes its text, and the
        statistics that it asks for are made from the stored samples.  Default: the folder's own.

    Raises
    ------
    ArchiveError
        When the folder holds no finished run, or the study is another one.
    InputError
        When the folder's copy of the study cannot be read.
    """
    layout = Layout(Path(folder))
    plan = read_plan(layout)
    study = stored_study(layout, plan) if study is None else study
    if study.digest != plan.digest:
        raise ArchiveError(
            f"{layout.folder}: holds results of another study (digest {plan.digest[:12]}, this one has "
            f"{study.digest[:12]}): only title, about and [report] may differ, and quantities that are "
            "Python functions must be given again, from Python"
        )
    if not is_complete(layout, plan):
        raise ArchiveError(
            f"{layout.folder}: the run is unfinished; the same `aleafield run` goes on with it"
        )
    with locked(layout):
        if stored_text(layout) == study.source.text and layout.summary.exists():
            summary = json.loads(layout.summary.read_text(encoding="utf-8"))
        else:
            model = planned_model(study, plan)
            summary = put_together(layout, plan, question_of(study, model.points(plan.level)))
            write_study(layout, study)
        write_report(layout, study, plan, summary)
    return RunResult(layout.folder, summary, 0, unmet(study, summary))
