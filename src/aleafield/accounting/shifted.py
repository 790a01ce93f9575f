"""The sample as it would be at a finer level, and its statistics."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from aleafield.accounting.regression import Shift
from aleafield.accounting.statistic import Statistic
from aleafield.arrays import BoolArray, FloatArray
from aleafield.estimates import Sample
from aleafield.estimates.blocks import segments
from aleafield.estimates.quantile import empirical_quantile
from aleafield.estimates.sd import block_factor, standard_deviation

NEIGHBOURS = 10
"""Samples just inside the margin whose values bound those of samples that come to occur."""


def value_of(statistic: Statistic, values: FloatArray, n_valid: int) -> float | None:
    """The statistic of the values that occur among n_valid samples; None where none occurs and one must.

    Reorders the values.
    """
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
    sample: Sample, value_shift: Shift | None, margin_shift: Shift | None
) -> Iterator[FloatArray]:
    """Values that occur once differences are taken off quantity and margin.

    Parameters
    ----------
    sample : Sample
    value_shift : Shift or None
        Taken off the values; None where it is unknown.
    margin_shift : Shift or None
        Taken off the margins; None for a quantity that always occurs.

    Yields
    ------
    float arrays
        One array, or two that bound what is unknown: samples that come to occur take the smallest and the
        largest value among their neighbours, the samples that occur by the smallest margins (at least 10, and
        as many as come to occur); with an unknown shift every value is minus and plus infinity.  Whoever takes
        an array may reorder it.
    """
    n_given = len(sample.given)
    kept, n_new = None, 0
    if margin_shift is not None and sample.margin is not None:
        occurred = sample.occurs[sample.valid]
        occurs = _occurrence(sample.valid_margin, margin_shift)
        kept = occurs[occurred]
        n_new = int((occurs & ~occurred).sum())
    n_kept = n_given if kept is None else int(kept.sum())
    if value_shift is None or (n_new and n_given == 0):
        for end in (-np.inf, np.inf):
            yield np.full(n_kept + n_new, end)
        return
    ends = _ends_beside(sample, value_shift, n_new) if n_new else (0.0,)
    for end in ends:
        values = np.full(n_kept + n_new, end)
        filled = 0
        for cut in segments(n_given):
            some = sample.given[cut] - value_shift(sample.given[cut])
            some = some if kept is None else some[kept[cut]]
            values[filled : filled + len(some)] = some
            filled += len(some)
        yield values


def _occurrence(margin: FloatArray, shift: Shift) -> BoolArray:
    """Where a margin (n,) is not negative once the shift is taken off it."""
    occurs = np.empty(len(margin), dtype=np.bool_)
    for cut in segments(len(margin)):
        occurs[cut] = margin[cut] - shift(margin[cut]) >= 0.0
    return occurs


def _ends_beside(sample: Sample, value_shift: Shift, n_new: int) -> tuple[float, float]:
    """Smallest and largest shifted value of the samples that occur by the smallest margins."""
    assert sample.margin is not None
    margin = sample.margin[sample.occurs]
    n_near = min(max(n_new, NEIGHBOURS), len(margin))
    margin.partition(n_near - 1)
    near = sample.values[sample.occurs & (sample.margin <= margin[n_near - 1])]
    near = near - value_shift(near)
    return float(near.min()), float(near.max())


def range_of(
    statistic: Statistic,
    sample: Sample,
    value_shift: Shift | None,
    margin_shift: Shift | None,
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
