"""The standard deviation with a jackknife interval of its logarithm."""

from __future__ import annotations

import math

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.estimates.blocks import BlockArray, block_counts, block_mean, segments
from aleafield.estimates.estimate import Estimate, exact, nothing_given, undetermined
from aleafield.estimates.positive import log_interval
from aleafield.estimates.sample import Sample

LEAST_SAMPLES = 64
"""Below this the jackknife of a skew quantity's sd covers too seldom; it is refused."""


def standard_deviation(values: FloatArray) -> float:
    """Standard deviation with divisor n - 1; exactly 0 for equal values and for one value."""
    if len(values) < 2 or values.min() == values.max():
        return 0.0
    return float(values.std(ddof=1))


def block_factor(sample: Sample) -> float:
    """What the standard deviation with divisor n - 1 is multiplied by where samples come in blocks.

    The mean square about the sample's mean falls short of the variance by the variance of that mean.  For
    independent samples the divisor n - 1 makes up for it; scrambled points know their mean far better, and
    n - 1 would then leave a bias of s / (2 n), more than their whole error; clusters know it less well.  So the
    square of the standard error that the blocks show is added instead.  For A clusters of R repeats the square
    of the result is the sum of the noise and the parameter part of the variance, see `variance_parts`.
    """
    values = sample.given
    n = len(values)
    s = standard_deviation(values)
    if sample.plain or s == 0.0:
        return 1.0
    error = block_mean(values, sample.given_block, sample.replicates).standard_error
    return math.sqrt((n - 1) / n + (error / s) ** 2) if math.isfinite(error) else 1.0


def estimate_sd(sample: Sample, confidence: float) -> Estimate:
    """Standard deviation s of the quantity, given that it occurs, with a jackknife interval of its logarithm.

    The jackknife leaves out one sample (plain Monte Carlo) or one block at a time; see `log_interval`.  With
    blocks the divisor is n, see `block_factor`.  The chi-square interval of normal theory does not cover for
    skew quantities.

    Parameters
    ----------
    sample : Sample
    confidence : float in (0, 1)

    Returns
    -------
    Estimate
        In the units of the quantity; not determined by fewer than 64 samples (clusters count once), nor where
        one sample or block alone makes the spread.  A certain quantity, and samples that are all equal, have
        sd 0 exactly.
    """
    values = sample.given
    n = len(values)
    if n == 0:
        return nothing_given(sample.n_valid)
    if sample.certain:
        return exact(0.0)
    if sample.independent < LEAST_SAMPLES:
        return undetermined(sample.independent, f"a standard deviation needs {LEAST_SAMPLES}")
    s = standard_deviation(values) * block_factor(sample)
    if s == 0.0:
        return exact(0.0)
    variances = (
        _variances_without_one(values)
        if sample.plain
        else _variances_without_block(values, sample.given_block, sample.replicates)
    )
    parts = len(variances)
    if parts < 2 or not (variances > 1e-12 * s**2).all():
        return undetermined(sample.independent, "the spread comes from one of them")
    logarithms = np.log(variances, out=variances)
    logarithms *= 0.5
    return log_interval(s, logarithms, confidence)


def _variances_without_one(values: FloatArray) -> FloatArray:
    """Sample variance of the others, for each of n values, shape (n,)."""
    n = len(values)
    square: FloatArray = values - values.mean()
    square *= square
    total = square.sum()
    square *= n / (n - 1)
    np.subtract(total, square, out=square)
    square /= n - 2
    return square


def _variances_without_block(values: FloatArray, block: BlockArray, n_blocks: int) -> FloatArray:
    """Sample variance of the others, for each block that holds a value."""
    mean = values.mean()
    count, first, second = block_counts(block, n_blocks), np.zeros(n_blocks), np.zeros(n_blocks)
    for cut in segments(len(values)):
        centred = values[cut] - mean
        np.add.at(first, block[cut], centred)
        np.add.at(second, block[cut], centred**2)
    held = count > 0
    first, second = first[held], second[held]
    rest = len(values) - count[held]
    if (rest < 2).any():
        return np.zeros(0)
    first, second = first.sum() - first, second.sum() - second
    remaining: FloatArray = (second - first**2 / rest) / (rest - 1)
    return remaining
