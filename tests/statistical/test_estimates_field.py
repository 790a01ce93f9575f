"""Variance and correlation length of fields whose covariance is known."""

from __future__ import annotations

import math

import numpy as np
import pytest

from aleafield.arrays import FloatArray, IntArray
from aleafield.estimates.field_statistics import FieldStatistics, FieldSums

LENGTH = 10.0
N = 200
POINTS = np.linspace(0.0, LENGTH, N, endpoint=False)
SPACING = LENGTH / N


def statistics_of(
    fields: FloatArray, group: IntArray, groups: int, *, periodic: bool = True, cut: int = 64
) -> FieldStatistics:
    """Of fields (S, n), added in pieces."""
    sums = FieldSums(fields[:1], groups, LENGTH / N if periodic else LENGTH / (N - 1), periodic)
    for start in range(0, len(fields), cut):
        sums.add(fields[start : start + cut, None], group[start : start + cut])
    return sums.statistics(0, 0.95)


def gaussian_fields(covariance: FloatArray, count: int, seed: int) -> FloatArray:
    """Normal fields (count, n) of a covariance (n, n)."""
    root = np.linalg.cholesky(covariance + 1e-10 * np.eye(len(covariance)))
    return np.asarray(np.random.default_rng(seed).standard_normal((count, len(covariance))) @ root.T)


def distances(*, periodic: bool) -> FloatArray:
    """Between all pairs of points, around the ring or along the interval."""
    x = POINTS if periodic else np.linspace(0.0, LENGTH, N)
    apart = np.abs(x[:, None] - x)
    return np.asarray(np.minimum(apart, LENGTH - apart) if periodic else apart)


def in_a_row(count: int, groups: int) -> IntArray:
    """Groups of equal length, one after the other."""
    return np.arange(count, dtype=np.int64) * groups // count


def test_a_wave_of_random_phase_in_closed_form() -> None:
    """a cos(2 pi x / L + phi), phi equally spaced: variance a^2 / 2, correlation cos(2 pi r / L), which is 1/e at
    L arccos(1/e) / (2 pi); the straight line between lags errs by h^2 |C''| / (8 |C'|) at most."""
    phases = 2 * np.pi * np.arange(128) / 128
    fields = 5.0 + 3.0 * np.cos(2 * np.pi * POINTS / LENGTH + phases[:, None])
    group = np.arange(128, dtype=np.int64) % 16  # each group is a wave of equally spaced phases itself
    found = statistics_of(fields, group, 16)
    assert found.variance.value == pytest.approx(4.5, rel=1e-12)
    exact = LENGTH * math.acos(math.exp(-1)) / (2 * np.pi)
    k = 2 * np.pi / LENGTH
    bound = SPACING**2 / 8 * k * math.exp(-1) / math.sin(k * exact) * 1.01
    assert found.correlation_length.value == pytest.approx(exact, abs=bound)


@pytest.mark.parametrize("periodic", [True, False], ids=["ring", "interval"])
@pytest.mark.parametrize(("form", "factor"), [("exponential", 1.0), ("gaussian", math.sqrt(2))])
def test_covariances_of_fields(form: str, factor: float, periodic: bool) -> None:
    """The intervals hold 2^2 and l (sqrt(2) l for a gaussian) at a confidence of 95 % in most of 60 trials.

    For coverage of 0.95 fewer than 51 of 60 have the probability 0.0036 (binomial).
    """
    apart, length = distances(periodic=periodic), 0.7
    correlation = np.exp(-apart / length) if form == "exponential" else np.exp(-((apart / length) ** 2) / 2)
    fields = gaussian_fields(4.0 * correlation, 60 * 256, 3)
    held = np.zeros(2)
    for trial in range(60):
        found = statistics_of(
            fields[256 * trial : 256 * (trial + 1)], in_a_row(256, 64), 64, periodic=periodic
        )
        for which, (one, exact) in enumerate(
            ((found.variance, 4.0), (found.correlation_length, factor * length))
        ):
            assert one.low is not None
            assert one.high is not None
            held[which] += one.low <= exact <= one.high
    assert held.min() >= 51


def test_the_variance_is_unbiased_for_realizations_that_come_in_clusters() -> None:
    """8 clusters of 16 equal fields of variance 1: dividing by n - 1 would give 7/8 on average.

    Fields are constant in space, normal: the mean of 4,000 estimates of variance 2/7 has the standard error
    sqrt(2/7 / 4000) = 0.0085.
    """
    rng = np.random.default_rng(5)
    constant = np.ones(N)
    found = []
    for _ in range(4000):
        levels = np.repeat(rng.standard_normal(8), 2)
        value = statistics_of(levels[:, None] * constant[:4], in_a_row(16, 8), 8).variance.value
        assert value is not None
        found.append(value)
    assert np.mean(found) == pytest.approx(1.0, abs=4 * 0.0085)


def test_pairs_on_an_interval_are_weighted_as_the_trapezoid_rule() -> None:
    """u = a x, a = +-1: the variance averaged over [0, 10] is the trapezoid sum of x^2, over the length."""
    x = np.linspace(0.0, LENGTH, N)
    signs = np.tile([1.0, -1.0], 8)
    found = statistics_of(signs[:, None] * x, in_a_row(16, 8), 8, periodic=False)
    assert found.variance.value == pytest.approx(np.trapezoid(x**2, x) / LENGTH, rel=1e-12)


def test_what_cannot_be_said() -> None:
    flat = np.random.default_rng(1).standard_normal((64, 1)) * np.ones(N)
    found = statistics_of(flat, in_a_row(64, 64), 64)
    assert found.variance.value is not None
    assert found.correlation_length.value is None
    assert "does not fall to 1/e" in str(found.correlation_length.reason)
    still = statistics_of(np.tile(POINTS, (64, 1)), in_a_row(64, 64), 64)
    assert (still.variance.value, still.variance.high) == (0.0, 0.0)
    assert "does not vary" in str(still.correlation_length.reason)
    few = statistics_of(flat[:7], in_a_row(7, 7), 7)
    assert few.variance.value is None
    assert "not determined by 7 samples" in str(few.variance.reason)
    huge = statistics_of(np.where(np.arange(64) == 5, 1e200, 1.0)[:, None] * flat, in_a_row(64, 64), 64)
    assert huge.variance.value is None
    assert "from too few" in str(huge.variance.reason)
