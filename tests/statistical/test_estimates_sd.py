"""The sd's interval against a jackknife written as a loop."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import qmc
from scipy.stats import skew as scipy_skewness
from scipy.stats import t as student_t

from aleafield.estimates import Estimate, Sample, estimate_sd
from tests.statistical.coverage import least_hits


def jackknife_of_log_sd(
    values: np.ndarray, block: np.ndarray, confidence: float, s: float
) -> tuple[float, float]:
    """s exp(-+ t SE), leaving each block out in turn; the upper end moved for skewness."""
    blocks = np.unique(block)
    n = len(blocks)
    logs = np.array([np.log(values[block != b].std(ddof=1)) for b in blocks])
    error = np.sqrt((n - 1) / n * ((logs - logs.mean()) ** 2).sum())
    t = student_t.ppf(0.5 + confidence / 2, n - 1)
    further = max(0.0, scipy_skewness(-logs)) / (6 * np.sqrt(n)) * (2 * t**2 + 1)
    return s * np.exp(-t * error), s * np.exp((t + further) * error)


@pytest.mark.parametrize("confidence", [0.8, 0.95])
def test_plain_interval_is_the_jackknife_over_samples(confidence: float) -> None:
    values = 1e3 + np.random.default_rng(1).lognormal(size=80)
    found = estimate_sd(Sample.of(values), confidence)
    assert found.value == pytest.approx(values.std(ddof=1), rel=1e-13)
    assert (found.low, found.high) == pytest.approx(
        jackknife_of_log_sd(values, np.arange(80), confidence, values.std(ddof=1)), rel=1e-9
    )


def test_interval_over_blocks_is_the_jackknife_over_blocks() -> None:
    generator = np.random.default_rng(2)
    values, margin = generator.normal(size=256), generator.normal(1.0, 1.0, size=256)
    block = np.arange(256) % 16
    found = estimate_sd(
        Sample.of(np.where(margin >= 0, values, np.nan), margin=margin, replicate=block, replicates=16), 0.95
    )
    counts = margin >= 0
    given, of = values[counts], block[counts]
    left_out = np.array([given[of != b].mean() for b in range(16)])
    mean_error = 15 / 16 * ((left_out - left_out.mean()) ** 2).sum()
    s = np.sqrt(given.var() + mean_error)  # the mean square about the mean, and the variance of that mean
    assert found.value == pytest.approx(s, rel=1e-12)
    expected = jackknife_of_log_sd(given, of, 0.95, s)
    assert (found.low, found.high) == pytest.approx(expected, rel=1e-9)


def test_many_scrambled_points_leave_no_bias_of_the_divisor() -> None:
    """With the divisor n - 1 the error would be s / (2 n) = 3.5e-5, above the half-width of most intervals."""
    held = 0
    for trial in range(40):
        rng = np.random.default_rng([4, trial])
        columns = [qmc.Sobol(1, scramble=True, rng=rng).random(256)[:, 0] for _ in range(16)]
        values = np.column_stack(columns).ravel()
        found = estimate_sd(Sample.of(values, replicate=np.arange(4096) % 16, replicates=16), 0.95)
        assert found.low is not None
        assert found.high is not None
        held += found.low <= 1 / np.sqrt(12) <= found.high
    assert held >= least_hits(40)


def test_too_few_samples_are_refused() -> None:
    values = np.random.default_rng(3).normal(size=64)
    assert estimate_sd(Sample.of(values), 0.95).value is not None
    found = estimate_sd(Sample.of(values[:63]), 0.95)
    assert found.value is None
    assert found.low is None
    assert found.reason == "not determined by 63 samples: a standard deviation needs 64"


def test_no_spread_is_exactly_zero() -> None:
    assert estimate_sd(Sample.of(np.array([3.0]), certain=True), 0.95) == Estimate(0.0, 0.0, 0.0)
    assert estimate_sd(Sample.of(np.full(100, 0.1)), 0.95) == Estimate(0.0, 0.0, 0.0)


def test_a_spread_from_one_sample_alone_is_not_determined() -> None:
    values = np.zeros(100)
    values[17] = 1.0
    found = estimate_sd(Sample.of(values), 0.95)
    assert found.value is None
    assert found.reason is not None
    assert found.reason.startswith("not determined by 100 samples")
