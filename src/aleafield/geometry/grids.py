"""Equally spaced points, computed so that a finer grid holds the coarser one to the bit."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.geometry.interval import Interval
from aleafield.geometry.ring import Ring


def interval_grid(interval: Interval, panels: int) -> FloatArray:
    """Ends of equal panels, ascending, both ends of the interval exact; shape (panels + 1,)."""
    points = interval.low + (np.arange(panels + 1) * interval.length) / panels
    points[-1] = interval.high
    return points


def ring_grid(ring: Ring, n: int) -> FloatArray:
    """The points j length / n wrapped into the ring, in the order j = 0 .. n - 1 (not sorted); shape (n,)."""
    return ring.wrap((np.arange(n) * ring.length) / n)
