"""Intervals of positive statistics, from jackknife values of their logarithm."""

from __future__ import annotations

import math

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.estimates.blocks import student
from aleafield.estimates.estimate import Estimate


def log_interval(value: float, logarithms: FloatArray, confidence: float) -> Estimate:
    """A positive statistic v with the interval from v exp(-t SE) to v exp((t + k (2 t^2 + 1)) SE).

    SE is the jackknife standard error of ln v (Quenouille, Tukey), t has as many degrees of freedom as there
    are jackknife values, less one, and

        k = max(0, skewness of the jackknife deviations) / (6 sqrt(parts)),

    after the correction of t for skewness of Johnson 1978: samples of a skew quantity often miss its tail, and
    then both v and SE are too small.

    Parameters
    ----------
    value : float > 0
    logarithms : float array (parts,), parts >= 2
        Logarithm of the statistic without one part at a time; overwritten.
    confidence : float in (0, 1)
    """
    parts = len(logarithms)
    deviation = logarithms
    deviation -= deviation.mean()
    error = float(np.sqrt((parts - 1) / parts * (deviation @ deviation)))
    t = student(confidence, parts - 1)
    upward = t if error == 0.0 else t - _skewness(deviation) / (6.0 * math.sqrt(parts)) * (2.0 * t**2 + 1.0)
    return Estimate(value, value * math.exp(-t * error), value * math.exp(max(t, upward) * error))


def _skewness(deviation: FloatArray) -> float:
    """Skewness of deviations from their mean (n,), not all 0."""
    return float(np.mean(deviation**3) / np.mean(deviation**2) ** 1.5)
