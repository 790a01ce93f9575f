"""summary.json: what a run has to say, put together from the columns of its ensemble."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from aleafield.accounting import RELATIVE_ROUND_OFF
from aleafield.archive.ensemble_file import Summary
from aleafield.archive.ensemble_reader import EnsembleReader
from aleafield.archive.names import netcdf_name
from aleafield.ensemble.records import FAILURE_MEANINGS
from aleafield.geometry import Domain
from aleafield.quantities import Quantity
from aleafield.report.rounding import percent
from aleafield.runs.causes import Inquiry
from aleafield.runs.execution import Cost
from aleafield.runs.field_statements import field_entries
from aleafield.runs.plan_file import Plan
from aleafield.runs.remarks import remarks, runs_word
from aleafield.runs.statements import Asked, QuantityColumns, columns_of, statements_of
from aleafield.study.study import Study
from aleafield.units import LENGTH

SCHEMA = 1
MOST_LISTED = 100
"""Failed realizations that are listed one by one; all are flagged in ensemble.nc and ensemble.csv."""
MOST_NAMED = 3
"""Failed realizations that the message of a run names."""
FAILED_SHARE = 0.05
"""Above this share of failed realizations the run does not meet what every study demands."""


def summarise(reader: EnsembleReader, study: Study, plan: Plan, cost: Cost) -> Summary:
    """The document summary.json.

    Quantities are read one at a time, so that memory holds the columns of one.
    """
    inquiry = Inquiry(reader, study, plan) if study.inputs else None
    quantities: dict[str, dict[str, Any]] = {}
    refusals: list[str] = []
    for quantity in study.quantities:
        columns = columns_of(
            reader, plan, quantity.name, round_off=_round_off(study.equation.domain, quantity)
        )
        quantities[quantity.name], refusal = _quantity(study, plan, quantity, columns, inquiry)
        refusals += [refusal] if refusal else []
    failed = _failed(reader, plan.repeats)
    return {
        "schema": SCHEMA,
        "title": study.title,
        "quantities": quantities,
        "field": field_entries(reader, study, plan),
        "inputs": {
            entry.path: {
                "law": entry.law.text,
                "units": entry.units,
                "mean": _finite(entry.law.mean),
                "sd": _finite(entry.law.sd),
            }
            for entry in study.inputs
        },
        "scheme": _scheme(study, plan),
        "sampling": _sampling(study, plan),
        "aim": _aim(study, quantities),
        "plan": None,
        "cost": {
            "predicted_s": None,
            "measured_s": cost.wall,
            "processor_s": cost.processor,
            "samples": plan.samples,
            "realizations": plan.realizations,
            "split_share": _split_share(plan),
        },
        "failed": failed,
        "confidence": study.confidence,
        "warnings": [
            *study.warnings,
            *plan.notes,
            *refusals,
            *remarks(reader, study),
            *_failure_warnings(failed, plan),
            *_further_failures(reader),
        ],
    }


def unmet(study: Study, summary: Mapping[str, Any]) -> tuple[str, ...]:
    """What the study demands and the run does not give, in words; empty where all is met."""
    found = []
    aim = summary["aim"]
    if aim is not None and not aim["met"]:
        found.append(f"the aim is missed: {aim['reason']}")
    failed, cost = summary["failed"]["count"], summary["cost"]
    realizations, repeats = cost["realizations"], cost["realizations"] // cost["samples"]
    if failed > FAILED_SHARE * realizations:
        found.append(
            f"{failed} of {realizations} {runs_word(repeats)} failed, more than {100 * FAILED_SHARE:.0f} %: "
            f"{_first_failures(summary['failed']['list'], repeats)}; summary.json lists "
            f"{summary['failed']['listed']} of them with their inputs"
        )
    for name, entry in summary["quantities"].items():
        asked = {f"P(above {level})": statement for level, statement in entry["exceed"].items()}
        if any(key.startswith("report.quantiles") for key in study.source.lines):
            asked.update({f"quantile {p}": statement for p, statement in entry["quantiles"].items()})
        for label, statement in asked.items():
            if _undetermined(statement):
                found.append(f"{name}, {label}: {statement.get('reason', 'not determined')}")
    return tuple(found)


def _undetermined(statement: Mapping[str, Any]) -> bool:
    """Whether a statement lacks its value or its interval; an interval with one open end is a bound."""
    interval = statement["interval"]
    return statement["value"] is None or interval is None or list(interval) == [None, None]


def _first_failures(entries: Sequence[Mapping[str, Any]], repeats: int) -> str:
    """The first failed realizations in words."""
    named = [
        f"sample {entry['sample']}"
        + (f", repeat {entry['repeat']}" if repeats > 1 else "")
        + f" ({entry['reason'].replace('_', ' ')}"
        + ("" if entry["time"] is None else f" at t = {entry['time']:.4g}")
        + ")"
        for entry in entries[:MOST_NAMED]
    ]
    return ", ".join(named) + (", .." if len(entries) > MOST_NAMED else "")


def _quantity(
    study: Study, plan: Plan, quantity: Quantity, columns: QuantityColumns, inquiry: Inquiry | None
) -> tuple[dict[str, Any], str]:
    """The entry of one quantity; and why polynomial chaos, where it was asked, is not what it comes from."""
    asked = Asked(study.report.quantiles, study.report.exceed.get(quantity.name, ()), study.confidence)
    units = study.quantity_units(quantity)
    if inquiry is None or not (study.sensitivity or plan.allocation.surrogate):
        return statements_of(columns, asked).as_json(units), ""
    fitted = inquiry.fitted(columns)
    expanded, refusal = inquiry.expanded(columns, fitted) if plan.allocation.surrogate else (None, "")
    if refusal:
        refusal = f"{quantity.name}: polynomial chaos is refused, the samples answer instead: {refusal}"
    statements = statements_of(columns, asked, expanded)
    entry = statements.as_json(units)
    if study.sensitivity is not None:
        entry |= inquiry.entries(columns, fitted, statements.variance)
    return entry, refusal


def _round_off(domain: Domain, quantity: Quantity) -> float:
    """Size up to which a difference is rounding: a position may be about 0, and the domain is its measure."""
    return RELATIVE_ROUND_OFF * domain.length if quantity.dimension == LENGTH else 0.0


def _finite(value: float) -> float | None:
    """JSON has no infinity: the mean of a very wide law may overflow."""
    return float(value) if math.isfinite(value) else None


def _scheme(study: Study, plan: Plan) -> dict[str, object]:
    scheme = study.scheme
    return {
        "projector": scheme.projector,
        "method": scheme.method,
        "nodes": plan.level.nodes,
        "quadrature": scheme.quadrature,
        "quadrature_points": plan.level.quadrature_points,
        "time_step": plan.time_step,
        "operators": [dict(operator) for operator in plan.operators],
        "parts": {
            part.name: {
                "levels": [
                    [level.label for level in pair]
                    for pair in (part.coarse_pair, part.pair)
                    if pair is not None
                ],
                "expected_order": part.expected_order,
                "proven": not part.observed_only,
                "note": part.note,
            }
            for part in plan.path
        },
        "probes": plan.probes,
        "noise": _noise(study, plan),
    }


def _noise(study: Study, plan: Plan) -> dict[str, object] | None:
    """The form of the correlation and the modes that are kept; None without noise."""
    if study.equation.noise is None or plan.noise is None:
        return None
    return {
        "correlation": study.equation.noise.correlation.name,
        "modes": plan.noise.modes,
        "ring_length": plan.noise.length,
        "dropped_share": plan.noise.dropped,
        "dropped_share_finer": plan.noise.dropped_finer,
        "image_error": plan.noise.image_error,
        "note": plan.noise.note,
    }


def _sampling(study: Study, plan: Plan) -> dict[str, object] | None:
    if not study.inputs and plan.noise is None:
        return None
    return {
        "method": plan.allocation.method,
        "samples": plan.samples,
        "replicates": plan.allocation.replicates,
        "points_per_replicate": plan.allocation.points_per_replicate,
        "noise_repeats": plan.repeats,
        "asked": study.sampling.method,
        "further_runs": dict(plan.families),
    }


def _split_share(plan: Plan) -> float:
    """Operations of the extra levels over those of all runs."""
    runs = plan.realizations * (1.0 + plan.probe_share) + sum(plan.families.values())
    return plan.realizations * plan.probe_share / runs


def _aim(study: Study, quantities: Mapping[str, Mapping[str, Any]]) -> dict[str, object] | None:
    aim = study.aim
    if aim is None:
        return None
    mean = quantities[aim.quantity]["mean"]
    total = mean["error"]["total"]
    allowed = None
    if not aim.relative:
        allowed = aim.tolerance
    elif mean["value"] is not None:
        allowed = aim.tolerance * abs(mean["value"])
    met = total is not None and allowed is not None and total <= allowed
    if total is None and mean["interval"] is not None:
        reason = f"the error of the mean of {aim.quantity} is bounded on one side only"
    elif total is None:
        reason = f"the error of the mean of {aim.quantity} is not determined"
    else:
        reason = f"the mean of {aim.quantity} is known to {total:.3g}, {aim.text} demands {allowed:.3g}"
    return {
        "tolerance": aim.text,
        "quantity": aim.quantity,
        "half_width": total,
        "allowed": allowed,
        "met": met,
        "reason": reason,
    }


def _failed(reader: EnsembleReader, repeats: int) -> dict[str, object]:
    which = np.flatnonzero(~reader.valid())
    codes = reader.failed()[which]
    reasons = {
        FAILURE_MEANINGS[int(code)]: int(count)
        for code, count in zip(*np.unique(codes, return_counts=True), strict=True)
    }
    listed = which[:MOST_LISTED]
    times = reader.failed_at()[listed]
    columns = {path: reader.input(path)[listed] for path in reader.inputs}
    entries = [
        {
            "sample": int(realization) // repeats,
            "repeat": int(realization) % repeats,
            "reason": FAILURE_MEANINGS[int(codes[row])],
            "time": float(times[row]) if np.isfinite(times[row]) else None,
            "inputs": {path: float(column[row]) for path, column in columns.items()},
        }
        for row, realization in enumerate(listed)
    ]
    return {"count": len(which), "reasons": reasons, "listed": len(listed), "list": entries}


def _failure_warnings(failed: Mapping[str, Any], plan: Plan) -> list[str]:
    count = failed["count"]
    if count == 0:
        return []
    word = runs_word(plan.repeats)
    share = percent(count / plan.realizations)
    reasons = ", ".join(f"{meaning.replace('_', ' ')}: {n}" for meaning, n in failed["reasons"].items())
    warnings = [f"{count} of {plan.realizations} {word} failed ({share}: {reasons}); no statistic holds them"]
    if failed["listed"] < count:
        warnings.append(
            f"summary.json lists the first {failed['listed']} of the {count} failed {word}; ensemble.nc and "
            "ensemble.csv flag all of them, with their inputs"
        )
    return warnings


def _further_failures(reader: EnsembleReader) -> list[str]:
    """Failed runs of the other families, which `failed` does not list."""
    found = []
    for family, count in reader.families.items():
        failed = int((~reader.valid(netcdf_name(family))).sum())
        if failed:
            found.append(f"{failed} of {count} further runs ({family}) failed and are left out")
    return found
