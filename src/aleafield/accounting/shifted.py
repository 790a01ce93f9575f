"""The sample as it would be at a finer level, and its statistics."""

from __future__ import annotations

import numpy as np

from aleafield.accounting.statistic import Statistic
from aleafield.arrays import FloatArray
from aleafield.estimates import Sample
from aleafield.estimates.quantile import empirical_quantile
from aleafield.estimates.sd import block_factor, standard_deviation

NEIGHBOURS = 10
"""Samples just inside the margin whose values bound those of samples that come to occur."""


def value_of(statistic: Statistic, values: FloatArray, n_valid: int) -> float | None:
    """The statistic of the values that occur among n_valid samples; None where none occurs and one must."""
    match statistic.kind:
        case "occurs":
            return len(values) / n_valid
        case "exceed":
            return int((values > statistic.at).sum()) / n_valid
    if len(values) == 0:
        return None
    match statistic.kind:
        case "mean":
            return float(values.mean())
        case "sd":
            return standard_deviation(values)
        case _:
            return empirical_quantile(values, statistic.at)


def shifted_values(
    sample: Sample, value_shift: FloatArray | None, margin_shift: FloatArray | None
) -> tuple[FloatArray, ...]:
    """Values that occur once differences are taken off quantity and margin.

    Parameters
    ----------
    sample : Sample
    value_shift : float array (number that occur,) or None
        Taken off the values; None where it is unknown.
    margin_shift : float array (n_valid,) or None
        Taken off the margins; None for a quantity that always occurs.

    Returns
    -------
    tuple of float arrays
        One array, or two that bound what is unknown: samples that come to occur take the smallest and the
        largest value among their neighbours, the samples that occur by the smallest margins (at least 10, and
        as many as come to occur); with an unknown shift every value is minus and plus infinity.
    """
    kept = np.ones(len(sample.given), dtype=np.bool_)
    n_new = 0
    if margin_shift is not None and sample.margin is not None:
        occurred = sample.occurs[sample.valid]
        occurs = sample.margin[sample.valid] - margin_shift >= 0.0
        kept = occurs[occurred]
        n_new = int((occurs & ~occurred).sum())
    if value_shift is None or (n_new and len(sample.given) == 0):
        n = int(kept.sum()) + n_new
        return np.full(n, -np.inf), np.full(n, np.inf)
    values = sample.given - value_shift
    if n_new == 0:
        return (values[kept],)
    assert sample.margin is not None
    n_near = min(max(n_new, NEIGHBOURS), len(values))
    near = values[np.argpartition(sample.margin[sample.occurs], n_near - 1)[:n_near]]
    return tuple(np.append(values[kept], np.full(n_new, end)) for end in (near.min(), near.max()))


def range_of(
    statistic: Statistic,
    sample: Sample,
    value_shift: FloatArray | None,
    margin_shift: FloatArray | None,
) -> tuple[float, float] | None:
    """Smallest and largest value of the statistic over `shifted_values`; None where nothing occurs."""
    found = []
    scale = block_factor(sample) if statistic.kind == "sd" else 1.0
    for values in shifted_values(sample, value_shift, margin_shift):
        value = value_of(statistic, values, sample.n_valid)
        if value is None:
            return None
        found.append(scale * value)
    return min(found), max(found)
