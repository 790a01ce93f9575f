"""What the first stage of a run decides: whether inputs must be exchanged between samples."""

from __future__ import annotations

from dataclasses import replace

from aleafield.archive.ensemble_reader import EnsembleReader
from aleafield.runs.causes import Inquiry
from aleafield.runs.plan_file import Plan, with_rows
from aleafield.runs.stages import further_runs
from aleafield.runs.statements import columns_of
from aleafield.study.study import Study


def next_stage(study: Study, plan: Plan, reader: EnsembleReader) -> tuple[Plan, str]:
    """What follows on the first stage, and a sentence for the user where something does.

    Parameters
    ----------
    study : Study
    plan : Plan
        Whose runs are all in place.
    reader : of an ensemble that holds them
    """
    count = further_runs(study, plan.allocation)["exchange"]
    inquiry = Inquiry(reader, study, plan)
    names = [name for name in reader.quantities if inquiry.needs_exchange(columns_of(reader, plan, name))]
    plan = replace(plan, settled=True)
    missing = count - plan.families.get("exchange", 0)
    if not names or missing <= 0:
        return plan, ""
    note = f"no surrogate of {', '.join(names)} is accepted: {missing} further runs for total indices"
    return with_rows(plan, "exchange", count), note
