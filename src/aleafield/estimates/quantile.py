"""Quantiles with order-statistic or Woodruff intervals."""

from __future__ import annotations

import math

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.estimates.blocks import FEW, block_mean, normal, number_in_clusters, student
from aleafield.estimates.estimate import Estimate, exact, nothing_given, undetermined
from aleafield.estimates.sample import Sample


def empirical_quantile(values: FloatArray, p: float) -> float:
    """The p quantile of values (n,), n >= 1, nearly median-unbiased for every law; reorders the values.

    Definition 8 of Hyndman and Fan 1996: linear between order statistics at rank n p + (p + 1) / 3.
    """
    values.partition(_neighbours(len(values), p)[:2])
    return ordered_quantile(values, p)


def ordered_quantile(ordered: FloatArray, p: float) -> float:
    """`empirical_quantile` of values (n,) that increase."""
    left, right, fraction = _neighbours(len(ordered), p)
    low, high = float(ordered[left]), float(ordered[right])
    if low == high:
        return low
    step = high - low
    return low + step * fraction if fraction < 0.5 else high - step * (1.0 - fraction)


def _neighbours(n: int, p: float) -> tuple[int, int, float]:
    """Indices of the order statistics beside the p quantile of n values, and how far it is from the first."""
    index = min(max(n * p + (p + 1.0) / 3.0 - 1.0, 0.0), n - 1.0)
    left = int(index)
    return left, min(left + 1, n - 1), index - left


def order_statistic_ranks(n: int, p: float, confidence: float) -> tuple[int, int]:
    """Ranks l < u (from 1) of the order statistics that enclose the p quantile of n independent samples.

    With K binomial(n, p): l is the largest rank with P(K <= l - 1) <= alpha / 2, u the smallest with
    P(K >= u) <= alpha / 2, alpha = 1 - confidence.  l = 0 or u = n + 1 says that no sample is far enough out:
    both stand for infinity.  Exact coverage at least the confidence for every continuous law.
    """
    from scipy.stats import binom

    tail = 0.5 * (1.0 - confidence)
    low = int(binom.ppf(tail, n, p))
    if binom.cdf(low, n, p) <= tail:
        low += 1
    high = int(binom.ppf(1.0 - tail, n, p)) + 1
    if binom.sf(high - 1, n, p) > tail:
        high += 1
    return low, high


def estimate_quantile(sample: Sample, p: float, confidence: float) -> Estimate:
    """The p quantile of the quantity, given that it occurs.

    Plain Monte Carlo: order statistics with binomial tails of at most alpha / 2 each.  Blocks: Woodruff's
    interval (Woodruff 1952), the pooled quantiles at p -+ d with

        d = t sd(F_r(q)) / sqrt(R) + 1 / (2 n),

    F_r the empirical distribution of block r and t on R - 1 degrees of freedom; where fewer than 10 samples
    lie beyond the quantile the wider of this and the order statistics.  Clusters: the order statistics of as
    many independent samples as know F(q) equally well, their ranks brought to the pooled samples (Korn and
    Graubard 1998, from memory); Woodruff's interval is symmetric and often not determined there.  The
    percentile bootstrap and clipping to the range of the samples miss extreme quantiles far too often.

    Parameters
    ----------
    sample : Sample
    p : float in (0, 1)
    confidence : float in (0, 1)

    Returns
    -------
    Estimate
        In the units of the quantity; not determined where an end would lie outside the samples.

    Raises
    ------
    InputError
        When p is not between 0 and 1.
    """
    if not 0.0 < p < 1.0:
        needed = "give probabilities such as 0.95"
        raise InputError("report.quantiles", f"{p!r} is not between 0 and 1", needed)
    n = len(sample.given)
    if n == 0:
        return nothing_given(sample.n_valid)
    if sample.certain:
        return exact(float(sample.given[0]))
    if sample.clustered:
        return _from_clusters(sample, p, confidence)
    ordered = sample.ordered
    value = ordered_quantile(ordered, p)
    few = n * min(p, 1.0 - p) < FEW
    if sample.plain or few:
        low, high = order_statistic_ranks(n, p, confidence)
        if low < 1 or high > n:
            return undetermined(n)
        ends = float(ordered[low - 1]), float(ordered[high - 1])
        if sample.plain:
            return Estimate(value, *ends)
    else:
        ends = value, value
    share = block_mean(sample.given <= value, sample.given_block, sample.replicates)
    distance = share.half_width(confidence) + 0.5 / n
    # the pooled quantile at a probability is known from the samples where its rank lies among theirs
    if not (1.0 / n <= p - distance and p + distance <= 1.0 - 1.0 / n):
        return undetermined(n)
    below, above = (ordered_quantile(ordered, p + side * distance) for side in (-1.0, 1.0))
    return Estimate(value, min(below, ends[0]), max(above, ends[1]))


def _from_clusters(sample: Sample, p: float, confidence: float) -> Estimate:
    """Order statistics for the effective number of independent samples, with t in place of the normal."""
    ordered, n = sample.ordered, len(sample.given)
    value = ordered_quantile(ordered, p)
    share = block_mean(sample.given <= value, sample.given_block, sample.replicates)
    if share.degrees < 1:
        return undetermined(sample.independent)
    shorter = (normal(confidence) / student(confidence, share.degrees)) ** 2
    effective = int(number_in_clusters(p, n, share) * shorter)
    low, high = order_statistic_ranks(effective, p, confidence)
    if low < 1 or high > effective:
        return undetermined(sample.independent)
    # at least low of effective lie below exactly where at least low n / effective of n do
    first, last = math.floor(low * n / effective), math.ceil((high - 1) * n / effective)
    return Estimate(value, float(ordered[first - 1]), float(ordered[last]))
