"""Readings along a curve: what it says at a place, for the reader who points there."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.report.svg import Drawing, Frame, box

PLACES = 48
"""Places along a curve that tell their values."""


def add_readings(
    drawing: Drawing,
    frame: Frame,
    symbol: str,
    along: FloatArray,
    curves: FloatArray,
    middle: str,
    those: str,
) -> None:
    """Strips that tell a middle curve and the two that hold 90 % about it; silent where one has a gap.

    Parameters
    ----------
    drawing, frame : where
    symbol : name of what runs along the frame
    along : float array (P,)
    curves : float array (3, P), middle, lower and upper curve; NaN where there is none
    middle : what the middle curve is, as in "mean"
    those : what the curves are about, as in "samples"
    """
    width = frame.width / PLACES
    low, high = frame.x_range
    for number in range(PLACES):
        place = low + (high - low) * (number + 0.5) / PLACES
        centre, least, most = (float(np.interp(place, along, curve)) for curve in curves)
        if np.isfinite([centre, least, most]).all():
            says = (
                f"{symbol} = {place:.3g}: {middle} {centre:.3g}; 90 % of {those} between {least:.3g} and "
                f"{most:.3g}"
            )
            drawing.add(box(frame.left + number * width, frame.top, width, frame.height, "probe", says))
