"""Statistics of a surrogate against closed forms."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.stats import triang

from aleafield.arrays import FloatArray
from aleafield.chaos.search import search
from aleafield.chaos.surrogate import POINTS, Surrogate, sample_points
from aleafield.randomness.laws import Law, LogUniform, Uniform
from tests.sensitivity.known_functions import FRONT, scrambled
from tests.statistical.coverage import least_hits

LAWS: list[Law] = [LogUniform(0.5, 2.0), LogUniform(0.5, 2.0)]
"""The logarithm of their product is triangular on (-2 ln 2, 2 ln 2)."""
WIDTH = math.log(4.0)
LOGARITHM = triang(0.5, -WIDTH, 2 * WIDTH)
MEAN = (1.5 / WIDTH) ** 2
SD = math.sqrt((3.75 / (2 * WIDTH)) ** 2 - MEAN**2)


def product(u: FloatArray) -> FloatArray:
    """One over the product of both inputs at unit points: it has the law of the product."""
    return 1.0 / (LAWS[0].ppf(u[:, 0]) * LAWS[1].ppf(u[:, 1]))


def surrogate(runs: int, seed: int, failed: int = 0) -> Surrogate:
    """Of the product, with 64 held-out runs."""
    u = scrambled(2, runs // 16, seed)[0]
    held = np.random.default_rng(seed).random((64, 2))
    y = product(held)
    y[:failed] = np.nan
    return Surrogate(search(u, product(u)[:, None], LAWS), 0, held, y, seed)


def test_statistics_of_a_product() -> None:
    """Each within its stated error of the closed form, at 99.9 %."""
    one = surrogate(32, 1, failed=2)
    for found, truth in (
        (one.mean(0.999), MEAN),
        (one.corrected_mean(0.999), MEAN),
        (one.sd(0.999), SD),
        (one.quantile(0.05, 0.999), math.exp(LOGARITHM.ppf(0.05))),
        (one.quantile(0.5, 0.999), 1.0),
        (one.quantile(0.95, 0.999), math.exp(LOGARITHM.ppf(0.95))),
        (one.exceedance(2.0, 0.999), 0.125),
    ):
        estimate = found.estimate
        assert estimate.value is not None
        assert estimate.low is not None
        assert estimate.high is not None
        assert estimate.low - found.surrogate <= truth <= estimate.high + found.surrogate
        assert 0 < found.surrogate < 0.02
        assert abs(estimate.value - truth) < 0.01


def test_intervals_of_mean_and_sd_hold_the_truth() -> None:
    """100 designs of the front speed, 32 runs and 64 held out."""
    hits = np.zeros(3)
    truth = np.array([0.07428809578584, 0.07428809578584, math.sqrt(FRONT.variance)])
    for seed in range(100):
        u = scrambled(3, 2, seed)[0]
        held = np.random.default_rng(seed).random((64, 3))
        found = search(u, FRONT.evaluate(u)[:, None], [Uniform(0, 1)] * 3)
        one = Surrogate(found, 0, held, FRONT.evaluate(held), seed)
        stated = [one.mean(0.95), one.corrected_mean(0.95), one.sd(0.95)]
        values = np.array([s.estimate.value for s in stated], dtype=np.float64)
        hits += np.abs(values - truth) <= np.array([s.surrogate for s in stated])
    assert hits.min() >= least_hits(100)


def test_corrected_mean_is_the_mean_plus_the_mean_residual() -> None:
    u = scrambled(2, 2, 3)[0]
    found = search(u, product(u)[:, None], LAWS)
    held = np.random.default_rng(3).random((40, 2))
    shifted = Surrogate(found, 0, held, found.evaluate(held)[:, 0] + 0.25, 3)
    mean, corrected = shifted.mean(0.95), shifted.corrected_mean(0.95)
    assert corrected.estimate.value == pytest.approx(float(found.mean[0]) + 0.25)
    assert mean.surrogate == pytest.approx(0.25, rel=1e-6)
    assert shifted.quantile(0.5, 0.95).surrogate == pytest.approx(0.25, rel=1e-6)
    assert shifted.sd(0.95).surrogate < 1e-12


def test_the_error_of_a_probability_grows_with_the_residuals() -> None:
    """The surrogate u1 + u2 is triangular on (0, 2): P(> 1) moves by 2 r - 2 r^2 when the level moves by 2 r;
    to the standard error of as many plain points, sqrt(0.095 0.905 / 2^17) = 8e-4."""
    u = scrambled(2, 2, 4)[0]
    found = search(u, u.sum(axis=1)[:, None], [Uniform(0, 1)] * 2)
    held = np.random.default_rng(4).random((50, 2))
    r = 0.05
    signs = np.where(np.arange(50) % 2, r, -r)
    one = Surrogate(found, 0, held, held.sum(axis=1) + signs, 4)
    exceedance = one.exceedance(1.0, 0.95)
    assert exceedance.estimate.value == pytest.approx(0.5, abs=1e-4)
    assert exceedance.surrogate == pytest.approx(2 * r - 2 * r**2, abs=8e-4)


def test_sample_points_are_scrambled_sequences_inside_the_cube() -> None:
    points = sample_points(3, 5)
    assert points.shape == (POINTS, 3)
    assert points.min() > 0
    assert points.max() < 1
    assert np.abs(points.mean(axis=0) - 0.5).max() < 1e-5
    np.testing.assert_array_equal(points, sample_points(3, 5))
    one = points[::16]
    counts = np.histogram(one[:, 1], bins=64, range=(0, 1))[0]
    assert set(counts.tolist()) == {len(one) // 64}


def test_without_held_out_runs_there_is_no_statistic() -> None:
    u = scrambled(2, 2, 6)[0]
    found = search(u, product(u)[:, None], LAWS)
    with pytest.raises(ValueError, match="2 held-out runs"):
        Surrogate(found, 0, u[:4], np.array([1.0, 2.0, np.nan, np.nan]), 6)
