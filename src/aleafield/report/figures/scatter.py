"""A quantity against each of its inputs: clouds of samples with the mean of neighbours drawn through them."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.report.markup import Markup, element
from aleafield.report.svg import Drawing, Frame, labelled, segment, text_width
from aleafield.report.ticks import tick_labels

MOST_POINTS = 2000
"""Points of one cloud."""
MOST_CLOUDS = 12
"""Inputs that the picture of one quantity shows."""

_COLUMNS = 4
_CELL, _HEIGHT, _GAP, _FOOT = 196.0, 150.0, 26.0, 52.0
_TICK_ROOM = 110.0
_GRAIN = 2
"""Places of a point in one px: clouds are written in whole numbers."""
_FEWEST_IN_GROUP, _MOST_GROUPS = 40, 16


def scatter(
    quantity: tuple[str, str],
    values: FloatArray,
    inputs: Mapping[str, tuple[str, FloatArray]],
    most: int,
    name: str,
) -> Drawing | None:
    """Small multiples: one cloud per input, all with the quantity upwards on one axis.

    Parameters
    ----------
    quantity : its name and units
    values : float array (S,); NaN where the quantity does not occur
    inputs : units and values, float array (S,), by path, in the order of the clouds
    most : points of one cloud
    name : of the drawing

    Returns
    -------
    Drawing, or None without inputs or without two different finite values
    """
    chosen = np.flatnonzero(np.isfinite(values))[:most]
    if not inputs or len(chosen) == 0 or np.ptp(values[chosen]) == 0:
        return None
    y = values[chosen]
    pad = 0.04 * float(np.ptp(y))
    y_range = (float(y.min()) - pad, float(y.max()) + pad)
    marks = tick_labels(Frame(0, 0, _CELL, _HEIGHT, (0.0, 1.0), y_range).levels())
    left = 34.0 + max(text_width(text) for text in marks)
    columns, rows = min(_COLUMNS, len(inputs)), -(-len(inputs) // _COLUMNS)
    title, units = quantity
    drawing = Drawing(
        name,
        f"{title} against its inputs",
        f"{len(inputs)} clouds of {len(chosen)} samples each: {title} between {y.min():.4g} and {y.max():.4g}, "
        f"against {', '.join(inputs)}.",
        width=left + columns * (_CELL + _GAP),
        height=14 + rows * (_HEIGHT + _FOOT),
    )
    for number, (path, (unit, column)) in enumerate(inputs.items()):
        row, place = divmod(number, _COLUMNS)
        x = column[chosen]
        reach = 0.03 * float(np.ptp(x))
        frame = Frame(
            left + place * (_CELL + _GAP),
            14 + row * (_HEIGHT + _FOOT),
            _CELL,
            _HEIGHT,
            (float(x.min()) - reach, float(x.max()) + reach),
            y_range,
        )
        drawing.add(*_axes(frame, labelled(path, unit), labelled(title, units) if place == 0 else None))
        drawing.add(_cloud(frame, x, y))
        trend = neighbour_means(x, y)
        if trend is not None:
            drawing.add(frame.curve(*trend, "trend"))
    return drawing


def neighbour_means(x: FloatArray, y: FloatArray) -> tuple[FloatArray, FloatArray] | None:
    """Means of x and y over groups of neighbours along x, equally many in each; None for too few of them.

    Equal values of x stay together, so that a discrete input has one group at most for each of its values.

    Parameters
    ----------
    x, y : float arrays (S,)

    Returns
    -------
    Two float arrays (G,), G <= 16, the first increasing
    """
    groups = min(_MOST_GROUPS, len(x) // _FEWEST_IN_GROUP)
    if groups < 2:
        return None
    ranks = np.searchsorted(np.sort(x), x)  # equal values share the lowest rank
    _, group, counts = np.unique(ranks * groups // len(x), return_inverse=True, return_counts=True)
    if len(counts) < 2:
        return None
    return np.bincount(group, x) / counts, np.bincount(group, y) / counts


def _axes(frame: Frame, below: str, beside: str | None) -> list[Markup]:
    """The axis below; the one upwards only at the first cloud of a row, its lines across all."""
    if beside is not None:
        return frame.left_axis(beside) + frame.bottom_axis(below, _TICK_ROOM)
    levels = (frame.y(level) for level in frame.levels())
    return [segment(frame.left, y, frame.right, y, "grid") for y in levels] + frame.bottom_axis(
        below, _TICK_ROOM
    )


def _cloud(frame: Frame, x: FloatArray, y: FloatArray) -> Markup:
    """All points as one path of dots on a grid of half px, each once, written from one to the next."""
    across = np.rint(_GRAIN * frame.width * (x - frame.x_range[0]) / (frame.x_range[1] - frame.x_range[0]))
    down = np.rint(_GRAIN * frame.height * (frame.y_range[1] - y) / (frame.y_range[1] - frame.y_range[0]))
    places = np.unique(np.stack([across, down], axis=1).astype(np.int64), axis=0)
    steps = np.diff(places, axis=0, prepend=np.zeros((1, 2), dtype=np.int64))
    dots = "".join(f"m{dx}{dy if dy < 0 else f' {dy}'}h0" for dx, dy in steps.tolist())
    at = f"translate({frame.left:g} {frame.top:g}) scale({1 / _GRAIN:g})"
    return element("path", d=dots, class_="cloud", transform=at)
