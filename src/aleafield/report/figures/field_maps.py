"""The field over space and time: maps of its mean and of its spread."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.report.data import FieldRecord
from aleafield.report.svg import Drawing, Frame, labelled
from aleafield.units import Units

_ROWS, _COLUMNS = 220, 360


def mean_map(record: FieldRecord, units: Units) -> Drawing:
    """Mean of u over all samples, x across and t upwards."""
    return _map("field-mean", "Mean of the field", "mean of u", record, record.mean, units)


def spread_map(record: FieldRecord, units: Units) -> Drawing:
    """Standard deviation of u over all samples, x across and t upwards."""
    return _map("field-spread", "Spread of the field", "standard deviation of u", record, record.sd, units)


def even_grid(values: FloatArray, t: FloatArray, x: FloatArray) -> FloatArray:
    """Values (K, n) at times t and points x, brought to an even grid of pixels by linear interpolation.

    Pixels stand at their middles; there are no more of them than a screen shows.

    Returns
    -------
    array (rows, columns), row 0 at the earliest time
    """
    rows, columns = min(_ROWS, 4 * len(t)), min(_COLUMNS, 4 * len(x))
    at_t = t[0] + (t[-1] - t[0]) * (np.arange(rows) + 0.5) / rows
    at_x = x[0] + (x[-1] - x[0]) * (np.arange(columns) + 0.5) / columns
    across = np.stack([np.interp(at_x, x, row) for row in values])
    return np.stack([np.interp(at_t, t, column) for column in across.T], axis=1)


def _map(name: str, title: str, what: str, record: FieldRecord, values: FloatArray, units: Units) -> Drawing:
    low, high = float(values.min()), float(values.max())
    both_signs = low < 0 < high and min(-low, high) > 0.1 * max(-low, high)
    span = (-max(-low, high), max(-low, high)) if both_signs else (low, high)
    drawing = Drawing(
        name,
        title,
        f"Map of the {what} over x from {record.x[0]:g} to {record.x[-1]:g} and t from {record.t[0]:g} to "
        f"{record.t[-1]:g}; values from {low:.3g} to {high:.3g}.",
        width=560,
        height=380,
    )
    frame = Frame(
        70, 14, 380, 310, (float(record.x[0]), float(record.x[-1])), (float(record.t[0]), float(record.t[-1]))
    )
    drawing.add(frame.colour_map(even_grid(values, record.t, record.x), span, both_signs))
    drawing.add(*frame.left_axis(labelled("t", units.time), grid=False))
    drawing.add(*frame.bottom_axis(labelled("x", units.length)))
    drawing.add(*frame.colour_bar(span, both_signs, labelled(what, units.activity)))
    return drawing
