"""A quantity of a noisy field over time: a fan of quantiles, and a few single paths under it."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from aleafield.arrays import BoolArray
from aleafield.report.data import HistoryRecord
from aleafield.report.figures.readings import add_readings
from aleafield.report.svg import Drawing, Frame, labelled
from aleafield.units import Units


def fan(name: str, quantity: str, record: HistoryRecord, units: Units) -> Drawing | None:
    """Bands of quantiles over t (5 to 95 %, 25 to 75 %), the median, and single paths beneath.

    Where the quantity occurs in no realization the bands have a gap, and a path where it does not occur.

    Parameters
    ----------
    name : name of the drawing
    quantity : its name
    record : HistoryRecord
    units : Units

    Returns
    -------
    Drawing, or None where no two times in a row have quantiles
    """
    known: BoolArray = np.asarray(np.isfinite(record.fan).all(axis=0))
    paths = [np.where(np.isfinite(path), path, np.nan) for path in record.paths]
    bands = list(stretches(known))
    if not bands:
        return None
    followed = record.followed or quantity
    seen = np.concatenate([record.fan[:, known].ravel(), *paths])
    low, high = float(np.nanmin(seen)), float(np.nanmax(seen))
    pad = 0.06 * (high - low)
    drawing = Drawing(
        name,
        f"{quantity} over time" if not record.followed else f"{quantity}: {record.followed}",
        _description(followed, record, bands),
        width=560,
        height=330,
    )
    frame = Frame(76, 14, 466, 260, (float(record.t[0]), float(record.t[-1])), (low - pad, high + pad))
    drawing.add(*frame.left_axis(labelled(followed, record.units)))
    for path in paths:
        drawing.add(
            *(frame.curve(record.t[cut], path[cut], "single") for cut in stretches(np.isfinite(path)))
        )
    for cut in bands:
        t, (least, first, median, third, most) = record.t[cut], record.fan[:, cut]
        drawing.add(frame.band(t, least, most, "fan"))
        drawing.add(frame.band(t, first, third, "fan inner"))
        drawing.add(frame.curve(t, median))
    drawing.add(*frame.bottom_axis(labelled("t", units.time)))
    add_readings(drawing, frame, "t", record.t, record.fan[[2, 0, 4]], "median", "realizations")
    return drawing


def stretches(present: BoolArray) -> Iterator[slice]:
    """Runs of at least two places in a row where something is, shape (K,); a single place makes no curve."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], present, [False]]).astype(np.int64)))
    for first, last in zip(edges[::2], edges[1::2], strict=True):
        if last - first > 1:
            yield slice(int(first), int(last))


def _description(followed: str, record: HistoryRecord, bands: list[slice]) -> str:
    last = bands[-1].stop - 1
    least, first, median, third, most = (float(value) for value in record.fan[:, last])
    return (
        f"Quantiles of {followed} over t from {record.t[0]:g} to {record.t[-1]:g}. At t = {record.t[last]:g} the "
        f"median is {median:.3g}, half of the realizations lie between {first:.3g} and {third:.3g}, 90 % between "
        f"{least:.3g} and {most:.3g}. {len(record.paths)} single paths are drawn beneath."
    )
