"""The field along a line: over space at the end, and over time where it spreads most."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.report.data import FieldRecord
from aleafield.report.figures.readings import add_readings
from aleafield.report.findings import with_units
from aleafield.report.svg import Drawing, Frame, labelled
from aleafield.units import Units

_POINTS = 400
"""A curve has no more vertices than a screen shows."""


def profile(record: FieldRecord, units: Units) -> Drawing:
    """Mean of the field over x at the last time, with its bands."""
    title = f"The field at t = {with_units(f'{record.t[-1]:g}', units.time)}"
    bands = record.band[:, -1, :]
    return _curve("field-profile", title, ("x", units.length), record.x, record.mean[-1], bands, units)


def course(record: FieldRecord, units: Units) -> Drawing:
    """Mean of the field over t at the point where the spread is largest, with its bands."""
    point = int(np.argmax(record.sd.max(axis=0)))
    title = f"The field at x = {with_units(f'{record.x[point]:.4g}', units.length)}, where it spreads most"
    bands = record.band[:, :, point]
    return _curve("field-course", title, ("t", units.time), record.t, record.mean[:, point], bands, units)


def _curve(
    name: str,
    title: str,
    axis: tuple[str, str],
    along: FloatArray,
    mean: FloatArray,
    bands: FloatArray,
    units: Units,
) -> Drawing:
    symbol, unit = axis
    chosen = np.unique(np.linspace(0, len(along) - 1, min(len(along), _POINTS)).round().astype(np.int64))
    along, mean, bands = along[chosen], mean[chosen], bands[:, chosen]
    if not np.isfinite(bands).all():
        bands = np.tile(mean, (4, 1))
    low, high = min(mean.min(), bands.min()), max(mean.max(), bands.max())
    pad = 0.06 * (high - low)
    drawing = Drawing(
        name,
        title,
        f"Curve of the mean of u over {symbol} from {along[0]:g} to {along[-1]:g}, between {mean.min():.3g} "
        "and "
        f"{mean.max():.3g}, with the bands that hold the middle 50 % and 90 % of samples.",
        width=560,
        height=330,
    )
    frame = Frame(
        76, 14, 466, 260, (float(along[0]), float(along[-1])), (float(low - pad), float(high + pad))
    )
    drawing.add(*frame.left_axis(labelled("u", units.activity)))
    drawing.add(frame.band(along, bands[0], bands[3]))
    drawing.add(frame.band(along, bands[1], bands[2], "band inner"))
    drawing.add(frame.curve(along, mean))
    drawing.add(*frame.bottom_axis(labelled(symbol, unit)))
    add_readings(drawing, frame, symbol, along, np.stack([mean, bands[0], bands[3]]), "mean", "samples")
    return drawing
