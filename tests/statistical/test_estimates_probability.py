"""Wilson's interval against scipy, and the rules for its effective number over blocks."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import binom, binomtest
from scipy.stats import t as student_t

from aleafield.estimates import Estimate, Sample, estimate_exceedance, estimate_occurrence
from aleafield.estimates.probability import wilson


@pytest.mark.parametrize("confidence", [0.8, 0.95, 0.99])
@pytest.mark.parametrize(("hits", "n"), [(0, 10), (1, 64), (32, 64), (63, 64), (64, 64), (999, 100_000)])
def test_plain_interval_is_wilsons(hits: int, n: int, confidence: float) -> None:
    expected = binomtest(hits, n).proportion_ci(confidence, method="wilson")
    found = estimate_exceedance(Sample.of((np.arange(n) < hits).astype(float)), 0.5, confidence)
    assert found.value == hits / n
    assert (found.low, found.high) == pytest.approx((expected.low, expected.high), rel=1e-10, abs=1e-15)


def exact_coverage(probability: float, n: int, interval: str) -> float:
    """Coverage of an interval for a probability, summed over all numbers of hits."""
    hits = np.arange(n + 1)
    if interval == "wilson":
        ends = np.array([wilson(k / n, n, 1.959963984540054) for k in hits])
    else:
        share = hits / n
        half = 1.959963984540054 * np.sqrt(share * (1 - share) / n)
        ends = np.column_stack([share - half, share + half])
    holds = (ends[:, 0] <= probability) & (probability <= ends[:, 1])
    return float(binom.pmf(hits[holds], n, probability).sum())


def test_wilson_covers_a_rare_event_and_wald_does_not() -> None:
    """P = .02, exact sums.  Wald's interval is the negative control: it must fail this test."""
    for n in (16, 64, 256, 1024):
        assert exact_coverage(0.02, n, "wilson") > 0.93
    assert exact_coverage(0.02, 16, "wald") < 0.4
    assert exact_coverage(0.02, 64, "wald") < 0.8


def test_exceed_is_strict_and_unconditional() -> None:
    values = np.array([1.0, 2.0, 3.0, np.nan, np.nan])
    margin = np.array([1.0, 1.0, 1.0, -1.0, 1.0])
    valid = np.array([True, True, True, True, False])
    sample = Sample.of(values, margin=margin, valid=valid)
    assert estimate_exceedance(sample, 2.0, 0.95).value == 0.25
    assert estimate_occurrence(sample, 0.95).value == 0.75


def in_blocks(hits_per_block: list[int], length: int) -> Sample:
    """16 blocks of 0/1 values with given numbers of hits, block i % 16."""
    rows = np.array([[float(i < hits) for hits in hits_per_block] for i in range(length)])
    return Sample.of(rows.ravel(), replicate=np.arange(16 * length) % 16, replicates=16)


def expected_interval(share: float, effective: float) -> tuple[float, float]:
    return wilson(share, effective, float(student_t.ppf(0.975, 15)))


def test_effective_number_from_the_spread_of_blocks() -> None:
    hits = [15, 17] * 8
    shares = np.array(hits) / 32
    effective = 0.25 / (shares.var(ddof=1) / 16)
    assert 512 < effective < 50 * 512
    found = estimate_exceedance(in_blocks(hits, 32), 0.5, 0.95)
    assert (found.low, found.high) == pytest.approx(expected_interval(0.5, effective), rel=1e-10)


def test_few_hits_may_not_claim_more_than_independent_samples() -> None:
    hits = [1, 0] * 4 + [0] * 8
    found = estimate_exceedance(in_blocks(hits, 32), 0.5, 0.95)
    shares = np.array(hits) / 32
    share = shares.mean()
    effective = min(512.0, share * (1 - share) / (shares.var(ddof=1) / 16))
    assert (found.low, found.high) == pytest.approx(expected_interval(share, effective), rel=1e-10)


def test_gain_is_at_most_fifty() -> None:
    found = estimate_exceedance(in_blocks([512] * 15 + [513], 1024), 0.5, 0.95)
    n = 16 * 1024
    share = (512 * 15 + 513) / n
    assert (found.low, found.high) == pytest.approx(expected_interval(share, 50.0 * n), rel=1e-10)


@pytest.mark.parametrize("hits", [0, 12, 32])
def test_blocks_that_all_agree_count_as_independent_samples(hits: int) -> None:
    found = estimate_exceedance(in_blocks([hits] * 16, 32), 0.5, 0.95)
    assert (found.low, found.high) == pytest.approx(expected_interval(hits / 32, 512.0), rel=1e-12, abs=1e-15)


def test_a_certain_quantity_has_probability_zero_or_one() -> None:
    sample = Sample.of(np.array([2.0]), certain=True)
    assert estimate_exceedance(sample, 1.0, 0.95) == Estimate(1.0, 1.0, 1.0)
    assert estimate_exceedance(sample, 2.0, 0.95) == Estimate(0.0, 0.0, 0.0)


def test_no_valid_sample() -> None:
    sample = Sample.of(np.array([np.nan]), valid=np.array([False]))
    assert estimate_exceedance(sample, 1.0, 0.95).reason == "not determined: all samples failed"
