"""Samples in clusters: coverage in problem 5.7, and limits that are known exactly.

Each test of coverage fails with probability at most 1e-3 if the true coverage is 0.95.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy.stats import binom, norm
from scipy.stats import t as student_t

from aleafield.estimates import (
    Estimate,
    Sample,
    estimate_exceedance,
    estimate_mean,
    estimate_quantile,
    estimate_sd,
)
from aleafield.estimates.probability import wilson
from tests.statistical import noisy_mode
from tests.statistical.coverage import hits, least_hits
from tests.statistical.noisy_mode import Design

TRIALS = 300
DESIGNS = [Design(*size, noise) for size in ((64, 4), (128, 2), (512, 2)) for noise in noisy_mode.NOISES]
LEVEL = 1.4

STATISTICS: dict[str, tuple[Callable[[Sample], Estimate], Callable[[str], float]]] = {
    "mean": (lambda s: estimate_mean(s, 0.95), lambda _: noisy_mode.MEAN),
    "sd": (lambda s: estimate_sd(s, 0.95), lambda _: float(np.sqrt(noisy_mode.TOTAL))),
    "q05": (lambda s: estimate_quantile(s, 0.05, 0.95), lambda noise: noisy_mode.quantile(0.05, noise)),
    "q50": (lambda s: estimate_quantile(s, 0.5, 0.95), lambda noise: noisy_mode.quantile(0.5, noise)),
    "q95": (lambda s: estimate_quantile(s, 0.95, 0.95), lambda noise: noisy_mode.quantile(0.95, noise)),
    "exceed": (
        lambda s: estimate_exceedance(s, LEVEL, 0.95),
        lambda noise: 1.0 - noisy_mode.below(LEVEL, noise),
    ),
    "rare": (
        lambda s: estimate_exceedance(s, noisy_mode.RARE, 0.95),
        lambda noise: 1.0 - noisy_mode.below(noisy_mode.RARE, noise),
    ),
}


@pytest.mark.parametrize("design", DESIGNS, ids=str)
def test_intervals_cover(design: Design) -> None:
    samples = design.samples(TRIALS, seed=51)
    found = {
        name: hits(samples, estimate, truth(design.noise)) for name, (estimate, truth) in STATISTICS.items()
    }
    assert min(found.values()) >= least_hits(TRIALS), found


@pytest.mark.parametrize("statistic", ["q05", "q50", "q95", "exceed"])
@pytest.mark.parametrize("repeats", [2, 8])
def test_intervals_cover_where_parameters_rule(repeats: int, statistic: str) -> None:
    """Nine tenths of the sd from the parameter: cluster by cluster nearly one value."""
    generator = np.random.default_rng(52)
    rows = np.sqrt(0.99) * np.repeat(generator.normal(size=(TRIALS, 128)), repeats, axis=1)
    rows += 0.1 * generator.normal(size=rows.shape)
    block = np.arange(128 * repeats) // repeats
    samples = [Sample.of(row, replicate=block, replicates=128, clustered=True) for row in rows]
    truth = {"q05": norm.ppf(0.05), "q50": 0.0, "q95": norm.ppf(0.95), "exceed": norm.sf(LEVEL)}
    estimate = STATISTICS[statistic][0]
    assert hits(samples, estimate, float(truth[statistic])) >= least_hits(TRIALS)
    independent = [Sample.of(row) for row in rows]
    assert hits(independent, estimate, float(truth[statistic])) < least_hits(TRIALS)


def test_equal_repeats_are_worth_their_clusters() -> None:
    """400 values four times over: the exact coverage of order statistics of 400 independent values."""
    once = np.random.default_rng(53).normal(size=400)
    repeated = Sample.of(np.repeat(once, 4), replicate=np.arange(1600) // 4, replicates=400, clustered=True)
    found = estimate_quantile(repeated, 0.9, 0.95)
    rank = {end: int(np.searchsorted(np.sort(once), end)) + 1 for end in (found.low, found.high)}
    outside = binom.cdf(rank[found.low] - 1, 400, 0.9) + binom.sf(rank[found.high] - 1, 400, 0.9)
    assert 0.02 < outside < 0.05


def test_what_no_cluster_shows_rests_on_the_number_of_clusters() -> None:
    sample = Sample.of(np.zeros(400), replicate=np.arange(400) // 4, replicates=100, clustered=True)
    found = estimate_exceedance(sample, 1.0, 0.95)
    assert (found.low, found.high) == pytest.approx(wilson(0.0, 100.0, student_t.ppf(0.975, 99)))


def test_independent_repeats_are_worth_the_samples() -> None:
    """Half of each cluster lies above: the clusters agree better than chance, but n is the most that is counted."""
    values = np.tile([0.0, 1.0], 200)
    values[:2] = 0.0
    found = estimate_exceedance(
        Sample.of(values, replicate=np.arange(400) // 2, replicates=200, clustered=True), 0.5, 0.95
    )
    assert (found.low, found.high) == pytest.approx(wilson(199 / 400, 400.0, student_t.ppf(0.975, 199)))


def test_the_mean_rests_on_cluster_means() -> None:
    values = np.random.default_rng(54).normal(size=(20, 3))
    sample = Sample.of(values.ravel(), replicate=np.arange(60) // 3, replicates=20, clustered=True)
    found, means = estimate_mean(sample, 0.95), values.mean(axis=1)
    assert found.value == pytest.approx(means.mean())
    half_width = student_t.ppf(0.975, 19) * means.std(ddof=1) / np.sqrt(20)
    assert found.high == pytest.approx(means.mean() + half_width)


@pytest.mark.parametrize("estimate", [STATISTICS["mean"][0], STATISTICS["q50"][0], STATISTICS["exceed"][0]])
def test_one_cluster_is_no_sample(estimate: Callable[[Sample], Estimate]) -> None:
    values = np.random.default_rng(55).normal(size=100)
    found = estimate(Sample.of(values, replicate=np.zeros(100, dtype=int), clustered=True))
    assert found == Estimate(None, None, None, "not determined by 1 samples")


def test_least_numbers_count_clusters() -> None:
    values = np.random.default_rng(56).normal(size=256)

    def clustered(clusters: int) -> Sample:
        block = np.arange(256) * clusters // 256
        return Sample.of(values, replicate=block, replicates=clusters, clustered=True)

    assert estimate_sd(clustered(64), 0.95).value is not None
    refused = estimate_sd(clustered(32), 0.95)
    assert refused.reason == "not determined by 32 samples: a standard deviation needs 64"
