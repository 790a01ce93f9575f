"""Margins: continuous quantities that are >= 0 exactly where something occurs."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray


def margin_above(highest: FloatArray, level: float | FloatArray) -> FloatArray:
    """highest - level, which occurs where it is positive: at equality the margin is just below zero; (S,)."""
    difference = highest - level
    return np.where(difference == 0, -np.finfo(np.float64).tiny, difference)
