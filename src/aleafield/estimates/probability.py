"""Probabilities with Wilson intervals."""

from __future__ import annotations

import math

import numpy as np

from aleafield.arrays import BoolArray
from aleafield.estimates.blocks import ALL_AGREE, FEW, block_mean, normal, number_in_clusters, student
from aleafield.estimates.estimate import Estimate, exact, nothing_given, undetermined
from aleafield.estimates.sample import Sample

MOST_GAIN = 50.0
"""No claim of more than this many times the number of samples, however well the blocks agree."""


def wilson(share: float, n: float, deviate: float) -> tuple[float, float]:
    """Wilson's score interval (Wilson 1927) of a probability.

    Parameters
    ----------
    share : observed share in [0, 1]
    n : number of independent trials, > 0; need not be whole
    deviate : half-width in standard errors

    Returns
    -------
    low, high : within [0, 1]
    """
    weight = deviate**2 / n
    centre = (share + 0.5 * weight) / (1.0 + weight)
    half = deviate / (1.0 + weight) * math.sqrt(share * (1.0 - share) / n + 0.25 * weight / n)
    low = 0.0 if share == 0.0 else max(0.0, centre - half)
    high = 1.0 if share == 1.0 else min(1.0, centre + half)
    return low, high


def estimate_occurrence(sample: Sample, confidence: float) -> Estimate:
    """Probability that the quantity occurs; see `estimate_exceedance` for the interval."""
    return _probability(sample, sample.occurs, confidence)


def estimate_exceedance(sample: Sample, level: float, confidence: float) -> Estimate:
    """Probability that the quantity occurs *and* lies above the level (in the units of the quantity).

    Plain Monte Carlo: Wilson with a normal quantile.  Blocks: Wilson with t on R - 1 degrees of freedom and
    the number of independent samples that would have the standard error se of the block shares,

        n_eff = P (1 - P) / se^2,

    at most the number n of samples with fewer than 10 hits or misses, at most 50 n otherwise, and n where all
    blocks agree; for A clusters at least A and at most n, and A where all agree.  Not
    used: Wald's interval P +- z se and t over block shares, which both miss rare events far too often.

    Parameters
    ----------
    sample : Sample
    level : float
    confidence : float in (0, 1)

    Returns
    -------
    Estimate
        A probability with an interval inside [0, 1]; not determined without a valid sample.
    """
    above = np.zeros_like(sample.occurs)
    above[sample.occurs] = sample.given > level
    return _probability(sample, above, confidence)


def _probability(sample: Sample, hits: BoolArray, confidence: float) -> Estimate:
    """Wilson's interval of the share of hits (S,) among the valid samples."""
    n = sample.n_valid
    if n == 0:
        return nothing_given(n)
    n_hits = int(hits.sum())
    share = n_hits / n
    if sample.certain:
        return exact(share)
    if sample.plain:
        return Estimate(share, *wilson(share, n, normal(confidence)))
    blocks = block_mean(hits[sample.valid], sample.replicate[sample.valid], sample.replicates)
    if blocks.degrees < 1:
        return undetermined(blocks.degrees + 1)
    effective = float(n)
    if sample.clustered:
        effective = number_in_clusters(share, n, blocks)
    elif n * blocks.standard_error > ALL_AGREE:
        most = n if min(n_hits, n - n_hits) < FEW else MOST_GAIN * n
        effective = min(share * (1.0 - share) / blocks.standard_error**2, most)
    return Estimate(share, *wilson(share, effective, student(confidence, blocks.degrees)))
