"""The mean's interval against scipy's t test, and the jackknife over blocks against leaving out by hand."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import t as student_t
from scipy.stats import ttest_1samp

from aleafield.estimates import Estimate, Sample, estimate_mean


@pytest.mark.parametrize("confidence", [0.5, 0.95, 0.999])
def test_plain_interval_is_that_of_the_t_test(confidence: float) -> None:
    values = np.random.default_rng(1).gamma(2.0, size=37)
    expected = ttest_1samp(values, 0.0).confidence_interval(confidence)
    found = estimate_mean(Sample.of(values), confidence)
    assert found.value == pytest.approx(values.mean(), rel=1e-14)
    assert (found.low, found.high) == pytest.approx((expected.low, expected.high), rel=1e-12)


def test_equal_blocks_give_the_t_test_of_their_means() -> None:
    values = np.random.default_rng(2).normal(3.0, 1.0, size=16 * 8)
    block = np.arange(len(values)) % 16
    means = values.reshape(8, 16).mean(axis=0)
    expected = ttest_1samp(means, 0.0).confidence_interval(0.9)
    found = estimate_mean(Sample.of(values, replicate=block, replicates=16), 0.9)
    assert (found.low, found.high) == pytest.approx((expected.low, expected.high), rel=1e-11)


def test_unequal_blocks_give_the_pooled_ratio_with_its_jackknife() -> None:
    generator = np.random.default_rng(3)
    values = generator.normal(3.0, 1.0, size=16 * 8)
    margin = generator.normal(size=len(values))
    values[margin < 0] = np.nan
    valid = np.arange(len(values)) != 5
    block = np.arange(len(values)) % 16
    counts = valid & (margin >= 0)
    left_out = np.array([values[counts & (block != r)].mean() for r in range(16)])
    error = np.sqrt(15 / 16 * ((left_out - left_out.mean()) ** 2).sum())
    found = estimate_mean(Sample.of(values, margin=margin, valid=valid, replicate=block, replicates=16), 0.95)
    centre = values[counts].mean()
    half = student_t.ppf(0.975, 15) * error
    assert found.value == pytest.approx(centre, rel=1e-13)
    assert (found.low, found.high) == pytest.approx((centre - half, centre + half), rel=1e-11)


def test_failed_and_missing_values_do_not_count() -> None:
    values = np.array([1.0, np.nan, np.inf, 4.0, 5.0])
    margin = np.array([0.0, -1.0, 1.0, 2.0, 3.0])
    valid = np.array([True, True, False, True, True])
    found = estimate_mean(Sample.of(values, margin=margin, valid=valid), 0.95)
    assert found == estimate_mean(Sample.of(np.array([1.0, 4.0, 5.0])), 0.95)


def test_equal_values_have_an_interval_of_width_zero() -> None:
    for values in (np.full(100, 0.1), np.full(64, 1.0 / 3.0)):
        for replicates in (1, 16):
            sample = Sample.of(values, replicate=np.arange(len(values)) % replicates, replicates=replicates)
            assert estimate_mean(sample, 0.95) == Estimate(values[0], values[0], values[0])


def test_a_certain_quantity_is_exact_and_one_random_value_is_not() -> None:
    one = np.array([2.5])
    assert estimate_mean(Sample.of(one, certain=True), 0.95) == Estimate(2.5, 2.5, 2.5)
    found = estimate_mean(Sample.of(one), 0.95)
    assert found == Estimate(None, None, None, "not determined by 1 samples")


def test_nothing_occurs() -> None:
    found = estimate_mean(Sample.of(np.full(9, np.nan), margin=np.full(9, -1.0)), 0.95)
    assert found.value is None
    assert found.reason == "not determined by 9 samples: it does not occur in any of them"


def test_repeats_of_a_parameter_sample_do_not_count_as_independent() -> None:
    """Two repeats that are equal give the interval of the parameter samples alone, with t on those."""
    once = np.random.default_rng(4).normal(size=50)
    twice = Sample.of(np.repeat(once, 2), replicate=np.arange(100) // 2, replicates=50)
    expected = ttest_1samp(once, 0.0).confidence_interval(0.95)
    found = estimate_mean(twice, 0.95)
    assert (found.low, found.high) == pytest.approx((expected.low, expected.high), rel=1e-11)


@pytest.mark.parametrize(
    "broken",
    [
        {"margin": np.zeros(2)},
        {"valid": np.array([True, True])},
        {"replicate": np.zeros((3, 1), dtype=int)},
        {"margin": np.array([1.0, 1.0, 1.0])},
        {},
    ],
)
def test_contradictions_are_refused(broken: dict[str, np.ndarray]) -> None:
    with pytest.raises(ValueError, match=r"shape|margin|not finite"):
        Sample.of(np.array([1.0, np.nan, 2.0]), **broken)


def test_occurrence_must_agree_with_the_margin() -> None:
    values, yes = np.array([1.0, 2.0]), np.array([True, True])
    with pytest.raises(ValueError, match="margin"):
        Sample(values, yes, yes, np.array([1.0, -1.0]), np.zeros(2, dtype=np.int64))
