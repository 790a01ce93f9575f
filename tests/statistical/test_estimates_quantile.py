"""Order-statistic intervals against exact binomial coverage, Woodruff against its definition."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import binom, quantile_test
from scipy.stats import t as student_t

from aleafield.errors import InputError
from aleafield.estimates import Estimate, Sample, estimate_quantile
from aleafield.estimates.quantile import order_statistic_ranks


@pytest.mark.parametrize(("p", "least"), [(0.5, 6), (0.9, 36), (0.95, 72), (0.99, 368), (0.05, 72)])
def test_fewest_samples_for_a_95_per_cent_interval(p: float, least: int) -> None:
    """p^n <= .025 (the largest sample lies above the quantile) gives these numbers by hand."""
    values = np.random.default_rng(1).normal(size=least)
    assert estimate_quantile(Sample.of(values), p, 0.95).value is not None
    found = estimate_quantile(Sample.of(values[:-1]), p, 0.95)
    assert found == Estimate(None, None, None, f"not determined by {least - 1} samples")


@pytest.mark.parametrize("confidence", [0.8, 0.95, 0.99])
@pytest.mark.parametrize("p", [0.02, 0.3, 0.5, 0.95])
@pytest.mark.parametrize("n", [40, 128, 1000, 100_000])
def test_ranks_are_the_narrowest_with_binomial_tails(n: int, p: float, confidence: float) -> None:
    """X_(l) > q needs at most l - 1 samples below q, X_(u) <= q at least u of them: K is binomial(n, p)."""
    low, high = order_statistic_ranks(n, p, confidence)
    tail = (1.0 - confidence) / 2 * (1 + 1e-12)
    assert binom.cdf(low - 1, n, p) <= tail < binom.cdf(low, n, p)
    assert binom.sf(high - 1, n, p) <= tail < binom.sf(high - 2, n, p)


def test_interval_agrees_with_the_quantile_test() -> None:
    values = np.random.default_rng(2).exponential(size=150)
    found = estimate_quantile(Sample.of(values), 0.3, 0.95)
    expected = quantile_test(values, p=0.3).confidence_interval(0.95)
    assert (found.low, found.high) == (expected.low, expected.high)


@pytest.mark.parametrize("p", [0.1, 0.5, 0.9])
def test_woodruff_by_its_definition(p: float) -> None:
    values = np.random.default_rng(3).normal(size=16 * 32)
    block = np.arange(len(values)) % 16
    found = estimate_quantile(Sample.of(values, replicate=block, replicates=16), p, 0.95)
    assert found.value == np.quantile(values, p, method="median_unbiased")
    shares = (values <= found.value).reshape(32, 16).mean(axis=0)
    distance = student_t.ppf(0.975, 15) * shares.std(ddof=1) / 4 + 0.5 / len(values)
    low, high = (np.quantile(values, p + side * distance, method="median_unbiased") for side in (-1, 1))
    assert (found.low, found.high) == (low, high)
    assert low < found.value < high


def test_blocks_that_agree_cannot_determine_an_extreme_quantile() -> None:
    """64 samples hold 3.2 below the 5 % quantile: independent samples would not determine it either."""
    values = np.tile(np.arange(4.0), (16, 1)).T.ravel() + np.linspace(0.0, 1e-3, 64)
    sample = Sample.of(values, replicate=np.arange(64) % 16, replicates=16)
    assert estimate_quantile(sample, 0.05, 0.95).value is None
    assert estimate_quantile(sample, 0.5, 0.95).value is not None


def test_a_certain_quantity_is_its_own_quantile() -> None:
    assert estimate_quantile(Sample.of(np.array([2.0]), certain=True), 0.99, 0.95) == Estimate(2.0, 2.0, 2.0)


def test_conditional_quantile_is_that_of_the_values_that_occur() -> None:
    generator = np.random.default_rng(4)
    values, margin = generator.normal(size=300), generator.normal(size=300)
    counts = margin >= 0
    some = estimate_quantile(Sample.of(np.where(counts, values, np.nan), margin=margin), 0.5, 0.95)
    assert some == estimate_quantile(Sample.of(values[counts]), 0.5, 0.95)


@pytest.mark.parametrize("p", [0.0, 1.0, -0.1, 5.0])
def test_impossible_probabilities_are_refused(p: float) -> None:
    with pytest.raises(InputError, match="not between 0 and 1"):
        estimate_quantile(Sample.of(np.arange(10.0)), p, 0.95)
