"""Means over independent blocks, and the quantiles of their standardised errors."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri, stdtrit

from aleafield.arrays import BoolArray, FloatArray

BlockArray = NDArray[np.signedinteger[Any]]
"""Labels of blocks, in as few bytes as they need."""
SEGMENT = 1 << 12
"""Samples that are worked on at a time where whole columns would only serve as scratch."""
FEW = 10
"""With fewer hits or misses, or samples beyond a quantile, than this, blocks are not trusted alone."""
ALL_AGREE = 1e-6
"""A standard error below this share of one hit is rounding: one hit more in one block gives far more."""


def segments(n: int) -> Iterator[slice]:
    """Slices of at most SEGMENT samples that cover n of them, in order."""
    return (slice(first, min(first + SEGMENT, n)) for first in range(0, n, SEGMENT))


def block_counts(block: BlockArray, n_blocks: int) -> FloatArray:
    """Number of entries of each block, (n_blocks,)."""
    counts = np.zeros(n_blocks)
    for cut in segments(len(block)):
        np.add.at(counts, block[cut], 1.0)
    return counts


def student(confidence: float, degrees: int) -> float:
    """Two-sided quantile of Student's t: the half-width in standard errors at a confidence."""
    return float(stdtrit(degrees, 0.5 + 0.5 * confidence))


def normal(confidence: float) -> float:
    """Two-sided quantile of the standard normal law."""
    return float(ndtri(0.5 + 0.5 * confidence))


@dataclass(frozen=True)
class BlockMean:
    """A mean with the standard error that the spread between blocks gives.

    Attributes
    ----------
    value : float
    standard_error : float
        Infinite with fewer than two blocks.
    degrees : int
        Degrees of freedom, the number of blocks that hold a value, less one.
    """

    value: float
    standard_error: float
    degrees: int

    def half_width(self, confidence: float) -> float:
        """Half-width of the t interval; infinite with fewer than two blocks."""
        if self.degrees < 1:
            return float("inf")
        return student(confidence, self.degrees) * self.standard_error


def plain_mean(values: FloatArray) -> BlockMean:
    """Mean of independent values (n,), n >= 1, and its standard error s / sqrt(n)."""
    n = len(values)
    if n < 2:
        return BlockMean(float(values[0]), float("inf"), 0)
    if values.min() == values.max():
        return BlockMean(float(values[0]), 0.0, n - 1)
    return BlockMean(float(values.mean()), float(values.std(ddof=1) / np.sqrt(n)), n - 1)


def block_mean(values: FloatArray | BoolArray, block: BlockArray, n_blocks: int) -> BlockMean:
    """Pooled mean of values (n,) or share of hits, n >= 1, with the jackknife over blocks.

    The mean is the ratio of the sum to the count, and each block in turn is left out of both.  For blocks of
    equal length this is the mean of the block means, with their standard deviation over the root of their
    number.  Blocks without a value are left out: they carry no information on a mean of what occurs.
    """
    centre = float(values[0]) if values.min() == values.max() else float(values.mean())
    count = block_counts(block, n_blocks)
    total = np.zeros(n_blocks)
    for cut in segments(len(values)):
        np.add.at(total, block[cut], values[cut] - centre)
    total, count = total[count > 0], count[count > 0]
    n = len(count)
    if n < 2:
        return BlockMean(centre, float("inf"), 0)
    left_out = (total.sum() - total) / (count.sum() - count)
    deviation = left_out - left_out.mean()
    error = float(np.sqrt((n - 1) / n * (deviation @ deviation)))
    return BlockMean(centre, error, n - 1)


def number_in_clusters(share: float, n: int, hits: BlockMean) -> float:
    """How many independent samples would know a probability as well as n samples in clusters do.

    P (1 - P) / se^2 is n over the design effect (Kish 1965).  Repeats of one parameter sample are never of
    unlike minds on average, nor more alike than equal, so it lies between the number of clusters and n; where
    all clusters agree nothing is seen of it, and it is the number of clusters.

    Parameters
    ----------
    share : pooled share of hits
    n : samples that count
    hits : the share with its standard error over clusters
    """
    clusters = hits.degrees + 1.0
    if n * hits.standard_error <= ALL_AGREE:
        return clusters
    return min(max(share * (1.0 - share) / hits.standard_error**2, clusters), float(n))
