"""Shares of the variance with intervals, from the coefficients of an accepted expansion."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from scipy.special import ndtri

from aleafield.arrays import BoolArray, FloatArray
from aleafield.chaos.expansion import Expansion

_OUTPUTS = 64
"""Outputs that are worked on at a time."""


class Shares(NamedTuple):
    """Shares with the ends of their intervals, each (k, o); nothing is clipped to [0, 1]."""

    value: FloatArray
    low: FloatArray
    high: FloatArray


def share_intervals(
    expansion: Expansion,
    terms: BoolArray,
    error: FloatArray,
    confidence: float,
    weights: FloatArray | None = None,
) -> Shares:
    """Shares I of the variance that sets of terms hold, with intervals [(1 - e) I - z s, (1 - e) I + e + z s].

    s is the standard error that the leave-one-out residuals give the coefficients (the sandwich covariance of
    heteroscedastic regression, MacKinnon and White 1985, from memory), brought to the share to first order;
    e is the upper bound of the surrogate's relative mean square error: so much of the variance may lie in
    terms that the expansion does not hold, and any share of that in each set.  Neither part is enough alone.

    Parameters
    ----------
    expansion : Expansion
    terms : bool array (k, terms)
        As of `Expansion.first_terms`, `total_terms` and so on.
    error : float array (o,)
        `Verdict.error` of the outputs.
    confidence : float in (0, 1)
    weights : float array (o,), optional
        When given, the share of the sum of all outputs' variances with these weights (quadrature weights of a
        field's nodes): one aggregated column, o = 1.

    Returns
    -------
    Shares
        NaN where an output has no variance.
    """
    variance = expansion.variance
    held = terms.astype(np.float64) @ expansion.partial_variance
    if weights is not None:
        whole = np.array([variance @ weights])
        e = np.array([(variance * error) @ weights]) / np.where(whole > 0, whole, np.nan)
        value = (held @ weights)[:, None] / np.where(whole > 0, whole, np.nan)
    else:
        e, value = error, held / np.where(variance > 0, variance, np.nan)
    deviation = float(ndtri(0.5 + 0.5 * confidence)) * _standard_error(expansion, terms, value, weights)
    return Shares(value, (1.0 - e) * value - deviation, (1.0 - e) * value + e + deviation)


def _standard_error(
    expansion: Expansion, terms: BoolArray, value: FloatArray, weights: FloatArray | None
) -> FloatArray:
    """Standard errors of shares (k, o), or (k, 1) of aggregated ones."""
    if expansion.residuals is None or expansion.influence is None:
        return np.zeros_like(value)
    n, outputs = expansion.residuals.shape
    variance = expansion.variance
    result = np.zeros_like(value)
    pooled = np.zeros((n, len(terms)))
    for start in range(0, outputs, _OUTPUTS):
        part = slice(start, min(start + _OUTPUTS, outputs))
        slopes = 2.0 * expansion.coefficients[:, part]
        slopes[0] = 0.0
        residuals = expansion.residuals[:, part]
        everything = expansion.influence @ slopes
        for k, chosen in enumerate(terms):
            own = expansion.influence[:, chosen] @ slopes[chosen]
            if weights is None:
                pulls = residuals * (own - value[k, part] * everything)
                result[k, part] = np.sqrt((pulls**2).sum(axis=0))
            else:
                pooled[:, k] += (residuals * (own - value[k, 0] * everything)) @ weights[part]
    if weights is None:
        return result / np.where(variance > 0, variance, np.nan)
    whole = float(variance @ weights)
    errors: FloatArray = np.sqrt((pooled**2).sum(axis=0))[:, None]
    return errors / (whole if whole > 0 else np.nan)
