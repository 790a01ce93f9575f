"""What a study asks of its ensemble, in the terms of the execution."""

from __future__ import annotations

from dataclasses import asdict
from datetime import UTC, datetime

from aleafield.archive.description import Axes, Description, InputColumn, QuantityColumn
from aleafield.arrays import FloatArray
from aleafield.runs.execution import Cost, Question
from aleafield.runs.plan_file import Plan
from aleafield.runs.summary import summarise
from aleafield.study.study import Study


def question_of(study: Study, x: FloatArray) -> Question:
    """The question of a study.

    Parameters
    ----------
    study : Study
    x : float array (n,)
        Points at which fields stand, increasing, units of length.
    """
    return Question(
        describe=lambda plan, cost: describe(study, plan, cost, x),
        summarise=lambda reader, plan, cost: summarise(reader, study, plan, cost),
    )


def describe(study: Study, plan: Plan, cost: Cost, x: FloatArray) -> Description:
    """Everything that ensemble.nc tells besides the values."""
    return Description(
        inputs=tuple(InputColumn(entry.path, entry.units, entry.law.text) for entry in study.inputs),
        quantities=tuple(
            QuantityColumn(
                q.name,
                study.quantity_units(q),
                q.measure,
                q.may_not_occur,
                q.followed,
                study.units.derived(q.history_dimension),
            )
            for q in study.quantities
        ),
        samples=plan.samples,
        repeats=plan.repeats,
        replicates=plan.allocation.replicates,
        level=plan.level,
        probes=plan.probes,
        extra_levels=plan.extra_levels,
        axes=Axes(
            x=x,
            kept_times=plan.kept_times,
            moment_times=plan.moment_times,
            length_units=study.units.length,
            time_units=study.units.time,
            field_units=study.activity_unit,
        ),
        attributes=_provenance(study, plan, cost),
        families=plan.families,
    )


def _provenance(study: Study, plan: Plan, cost: Cost) -> dict[str, object]:
    now = datetime.now(UTC).isoformat(timespec="seconds")
    source = f"aleafield {plan.versions['aleafield']}"
    scheme = study.scheme
    return {
        "title": study.title,
        "comment": study.about or None,
        "source": source,
        "history": f"{now}: {source}, {_how_many(plan)} at level {plan.level.label}",
        "institution": "not stated",
        "references": "see report.html beside this file",
        "date_created": now,
        "id": study.digest,
        "study_digest": study.digest,
        "study_text": study.source.text,
        "seed": study.seed,
        "versions": plan.versions,
        "scheme": {
            "projector": scheme.projector,
            "method": scheme.method,
            "quadrature": scheme.quadrature,
            "nodes": plan.level.nodes,
            "quadrature_points": plan.level.quadrature_points,
            "time_step": plan.time_step,
        },
        "noise": None if plan.noise is None else asdict(plan.noise),
        "scheme_level": plan.level.label,
        "sampling_method": plan.allocation.method,
        "wall_time_s": cost.wall,
        "processor_time_s": cost.processor,
    }


def _how_many(plan: Plan) -> str:
    paths = f" with {plan.repeats} noise paths each" if plan.repeats > 1 else ""
    further = "".join(f", {count} runs {family}" for family, count in plan.families.items())
    return f"{plan.samples} samples{paths}{further}"
