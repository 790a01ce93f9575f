"""All figures of a report, in the order of the page."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np

from aleafield.report.data import ReportData
from aleafield.report.figures.distribution import distribution
from aleafield.report.figures.error_split import error_split
from aleafield.report.figures.fan import fan
from aleafield.report.figures.field_curves import course, profile
from aleafield.report.figures.field_maps import mean_map, spread_map
from aleafield.report.figures.index_bars import MOST_INPUTS, index_bars
from aleafield.report.figures.remaining_spread import remaining_spread
from aleafield.report.figures.scatter import MOST_CLOUDS, MOST_POINTS, scatter
from aleafield.report.figures.variance_parts import variance_parts
from aleafield.report.findings import QuantityFindings
from aleafield.report.influence import Influence, influences, measurements
from aleafield.report.svg import Drawing

Section = Literal["noise", "causes", "next", "error", "time", "field", "distribution", "inputs"]

MOST_DOTS = 48_000
"""Points of all clouds of a report: beyond it each has fewer."""


@dataclass(frozen=True)
class Figure:
    """A drawing with its caption; `quantity` is empty for pictures of the field or of all quantities."""

    section: Section
    quantity: str
    drawing: Drawing
    caption: str


def report_figures(data: ReportData, findings: list[QuantityFindings]) -> list[Figure]:
    """The causes of variance, the influence of the inputs and what to measure next, the error split of every
    quantity, what is followed in time, the field as far as it is stored, every distribution, every scatter."""
    names = drawing_names([found.name for found in findings])
    figures = []
    causes = variance_parts(findings, "variance-causes")
    if causes is not None:
        figures.append(Figure("noise", "", causes, _CAUSES_CAPTION))
    figures.extend(_influence_figures(data, names))
    for found in findings:
        split = error_split(found, f"error-{names[found.name]}")
        if split is not None:
            figures.append(Figure("error", found.name, split, _split_caption(found)))
    for found in findings:
        figures.extend(_fan_figures(data, found, f"fan-{names[found.name]}"))
    figures.extend(_field_figures(data))
    for found in findings:
        values = data.values.get(found.name)
        drawn = None if values is None else distribution(found, values, f"distribution-{names[found.name]}")
        if drawn is not None and values is not None:
            count = int(np.isfinite(values).sum())
            figures.append(Figure("distribution", found.name, drawn, _distribution_caption(found, count)))
    figures.extend(_scatter_figures(data, findings, names))
    return figures


def figure_files(figures: list[Figure]) -> dict[str, str]:
    """Contents of the figure files by file name."""
    return {f"{figure.drawing.name}.svg": figure.drawing.document() for figure in figures}


def drawing_names(quantities: list[str]) -> dict[str, str]:
    """A short name for each quantity, different without regard to case, of letters, digits and hyphens.

    >>> drawing_names(["peak height", "Peak-height"])
    {'peak height': 'peak-height', 'Peak-height': 'peak-height-2'}
    """
    found: dict[str, str] = {}
    for quantity in quantities:
        plain = re.sub(r"[^a-z0-9]+", "-", quantity.lower()).strip("-") or "quantity"
        name, number = plain, 1
        while name in found.values():
            number += 1
            name = f"{plain}-{number}"
        found[quantity] = name
    return found


_CAUSES_CAPTION = (
    "Each bar is the whole variance of a quantity, cut at the share of the parameters; the mark below the cut is "
    "its interval."
)


def _influence_figures(data: ReportData, names: Mapping[str, str]) -> list[Figure]:
    """Indices of the inputs, and what would narrow each quantity."""
    figures = []
    for influence in influences(data.summary):
        bars = index_bars(influence, f"causes-{names[influence.quantity]}")
        if bars is not None:
            figures.append(Figure("causes", influence.quantity, bars, _bars_caption(influence)))
    for found in measurements(data.summary):
        drawn = remaining_spread(found, f"next-{names[found.quantity]}")
        if drawn is not None:
            figures.append(Figure("next", found.quantity, drawn, _REMAINING_CAPTION))
    return figures


def _bars_caption(influence: Influence) -> str:
    text = "; ".join(f"{kind.name}: {kind.meaning}" for kind in influence.stated)
    text = f"{text[:1].upper()}{text[1:]}. " if text else ""
    text += "Across the bars: their intervals."
    if influence.noise is not None:
        text += " Noise: the share that stays, on average, however well the inputs are known."
    if influence.stated and len(influence.inputs) > MOST_INPUTS:
        text += f" The {MOST_INPUTS} most important of {len(influence.inputs)} inputs; the table has all."
    return text


_REMAINING_CAPTION = (
    "What stays of the standard deviation, on average over what may be found, when one input is known exactly or "
    "its spread is halved; the bars are the gain, the lines across the marks the intervals. Grey: the standard "
    "deviation now, with its interval."
)


def _scatter_figures(
    data: ReportData, findings: list[QuantityFindings], names: Mapping[str, str]
) -> list[Figure]:
    """Every quantity against its inputs, the most important ones first where that is known."""
    order = {one.quantity: [entry.path for entry in one.inputs] for one in influences(data.summary)}
    columns = min(len(data.inputs), MOST_CLOUDS)
    most = min(MOST_POINTS, MOST_DOTS // max(1, columns * len(findings)))
    section: Section = "causes" if order else "inputs"
    figures = []
    for found in findings:
        paths = [path for path in order.get(found.name, data.inputs) if path in data.inputs][:MOST_CLOUDS]
        inputs = {path: (data.summary["inputs"][path]["units"], data.inputs[path]) for path in paths}
        values = data.values.get(found.name)
        if values is None or not inputs:
            continue
        values = values[: len(data.inputs[paths[0]])]
        drawn = scatter((found.name, found.units), values, inputs, most, f"scatter-{names[found.name]}")
        if drawn is not None:
            count = min(most, int(np.isfinite(values).sum()))
            figures.append(
                Figure(section, found.name, drawn, _scatter_caption(count, columns, len(data.inputs)))
            )
    return figures


def _scatter_caption(count: int, shown: int, inputs: int) -> str:
    text = f"{count} runs. The line joins the means of groups of neighbours, equally many runs in each."
    return text if shown == inputs else f"{text} {shown} of {inputs} inputs."


def _fan_figures(data: ReportData, found: QuantityFindings, name: str) -> list[Figure]:
    record = data.histories.get(found.name)
    if record is None:
        return []
    drawing = fan(name, found.name, record, data.units)
    if drawing is None:
        return []
    caption = (
        f"Line: median over {record.realizations} realizations; the bands hold the middle 50 % and 90 % of them, "
        f"time by time. Thin: {len(record.paths)} single realizations."
    )
    return [Figure("time", found.name, drawing, caption)]


def _split_caption(found: QuantityFindings) -> str:
    return (
        f"Error of each statistic of {found.name}: the whole bar is the total half-width, written at its "
        "end. Bounds on biases add up; the random parts (sampling, noise of the biases) add in quadrature "
        "and share their length by their squares."
        + (
            " An arrow marks an open end; the bar before it is the side that is bounded."
            if any(one.open_side is not None for one in found.all())
            else ""
        )
    )


def _distribution_caption(found: QuantityFindings, count: int) -> str:
    text = f"{count} stored values of {found.name}. Below the bars: estimates (dots) with their intervals."
    if found.exceed:
        text += " Dashed: the levels asked for, with the probability of lying above."
    if found.occurs is not None:
        text += " Bars, mean and quantiles are given that it occurs; the probabilities are not."
    return text


def _field_figures(data: ReportData) -> list[Figure]:
    record, units = data.fields, data.units
    if record is None:
        return []
    runs = "samples" if data.model.noise is None else "realizations"
    bands = (
        f"Mean of u over all {runs}; the bands hold the middle 50 % and 90 % of {record.band_samples} {runs}, "
        "point by point."
    )
    drawings = (
        (mean_map(record, units), f"Mean of u over space and time, over all {runs}."),
        (spread_map(record, units), f"Standard deviation of u over all {runs}."),
        (profile(record, units), bands),
        (course(record, units), bands),
    )
    return [Figure("field", "", drawing, caption) for drawing, caption in drawings]
