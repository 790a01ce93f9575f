"""From a results folder to its report: what the page shows is read here and written there."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from aleafield.archive.durable import make_folder, remove, write_bytes
from aleafield.archive.ensemble_reader import EnsembleReader, reading
from aleafield.archive.field_state import BAND_SAMPLES, FAN_REALIZATIONS
from aleafield.archive.layout import Layout
from aleafield.report.data import FieldRecord, HistoryRecord, Provenance, ReportData
from aleafield.report.figures import figure_files, report_figures
from aleafield.report.findings import quantity_findings
from aleafield.report.page import page
from aleafield.runs.plan_file import Plan
from aleafield.runs.wording import model_text
from aleafield.study.study import Study

MOST_VALUES = 1 << 16
"""Values of a quantity that a histogram shows, the first ones: memory does not grow with the samples."""


MOST_SCATTERED = 1 << 13
"""Realizations whose inputs stand beside their values, the first ones."""


def report_data(study: Study, plan: Plan, summary: Mapping[str, Any], reader: EnsembleReader) -> ReportData:
    """Everything that the report of a finished run shows.

    Parameters
    ----------
    study : Study
    plan : Plan
    summary : as in summary.json
    reader : of the run's ensemble
    """
    return ReportData(
        title=study.title,
        about=study.about,
        units=study.units,
        study_text=study.source.text,
        summary=summary,
        measures={quantity.name: quantity.measure for quantity in study.quantities},
        model=model_text(study, plan),
        provenance=Provenance(study.seed, study.digest, plan.versions),
        values={name: reader.values(name)[:MOST_VALUES].copy() for name in reader.quantities},
        inputs={path: reader.input(path)[:MOST_SCATTERED].copy() for path in reader.inputs},
        fields=_fields(reader),
        histories=_histories(study, reader),
    )


def write_report(layout: Layout, study: Study, plan: Plan, summary: Mapping[str, Any]) -> None:
    """Write report.html and the figures of a folder whose ensemble and summary are in place.

    Raises
    ------
    Interrupted
        When the disk fails.
    """
    with reading(layout.ensemble) as reader:
        data = report_data(study, plan, summary, reader)
    figures = report_figures(data, quantity_findings(summary))
    files = figure_files(figures)
    make_folder(layout.figures)
    for name, text in files.items():
        write_bytes(layout.figures / name, text.encode())
    for path in layout.figures.glob("*.svg"):
        if path.name not in files:
            remove(path)
    write_bytes(layout.report, page(data, figures).encode())


def _histories(study: Study, reader: EnsembleReader) -> dict[str, HistoryRecord]:
    """The quantities that were followed in time; what several of them show alike stands once, with the first."""
    found: dict[str, HistoryRecord] = {}
    for quantity in study.quantities:
        history = reader.histories(quantity.name)
        if history is not None:
            fan, paths = history
            others = (one for one in found.values() if one.followed)
            if any(
                one.followed == quantity.followed and np.array_equal(one.fan, fan, equal_nan=True)
                for one in others
            ):
                continue
            found[quantity.name] = HistoryRecord(
                followed=quantity.followed,
                units=study.units.derived(quantity.history_dimension),
                t=reader.axis("t_moments"),
                fan=fan,
                paths=paths,
                realizations=min(len(reader), FAN_REALIZATIONS),
            )
    return found


def _fields(reader: EnsembleReader) -> FieldRecord | None:
    mean, sd = reader.field_mean(), reader.field_sd()
    if not (np.isfinite(mean).all() and np.isfinite(sd).all()):
        return None
    return FieldRecord(
        t=reader.axis("t_moments"),
        x=reader.axis("x"),
        mean=mean,
        sd=sd,
        band=reader.field_band(),
        band_samples=min(len(reader), BAND_SAMPLES),
    )
