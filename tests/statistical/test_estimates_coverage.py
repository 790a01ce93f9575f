"""Coverage of the intervals over repeated experiments with known truth.

Each test fails with probability at most 1e-3 if the true coverage is 0.95 (exact binomial, `least_hits`).
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy.stats import norm

from aleafield.estimates import (
    Estimate,
    Sample,
    estimate_exceedance,
    estimate_mean,
    estimate_quantile,
    estimate_sd,
)
from tests.statistical.coverage import hits, least_hits, normal_scramblings

TRIALS = 400
WEIGHTS = np.array([0.8, 0.6])
"""A linear function of two normals with these weights is standard normal: every truth is known."""

TRUTHS: dict[str, tuple[Callable[[Sample], Estimate], float]] = {
    "mean": (lambda s: estimate_mean(s, 0.95), 0.0),
    "sd": (lambda s: estimate_sd(s, 0.95), 1.0),
    "median": (lambda s: estimate_quantile(s, 0.5, 0.95), 0.0),
    "quantile .95": (lambda s: estimate_quantile(s, 0.95, 0.95), float(norm.ppf(0.95))),
    "exceed .3": (lambda s: estimate_exceedance(s, float(norm.isf(0.3)), 0.95), 0.3),
    "exceed .02": (lambda s: estimate_exceedance(s, float(norm.isf(0.02)), 0.95), 0.02),
}


@pytest.fixture(scope="module")
def plain() -> list[Sample]:
    return [Sample.of(row) for row in np.random.default_rng(11).normal(size=(TRIALS, 128))]


@pytest.fixture(scope="module")
def scrambled() -> list[Sample]:
    rows = normal_scramblings(TRIALS, 32, 2, seed=12) @ WEIGHTS
    block = np.arange(512) % 16
    return [Sample.of(row, replicate=block, replicates=16) for row in rows]


@pytest.fixture(scope="module")
def repeated() -> list[Sample]:
    """128 parameter samples of 2 noise paths: N(0, .8^2) between and N(0, .6^2) within."""
    generator = np.random.default_rng(13)
    between = np.repeat(generator.normal(size=(TRIALS, 128)), 2, axis=1)
    rows = 0.8 * between + 0.6 * generator.normal(size=(TRIALS, 256))
    return [Sample.of(row, replicate=np.arange(256) // 2, replicates=128, clustered=True) for row in rows]


@pytest.mark.parametrize("statistic", list(TRUTHS))
@pytest.mark.parametrize("kind", ["plain", "scrambled", "repeated"])
def test_intervals_cover(kind: str, statistic: str, request: pytest.FixtureRequest) -> None:
    estimate, truth = TRUTHS[statistic]
    assert hits(request.getfixturevalue(kind), estimate, truth) >= least_hits(TRIALS)


def test_sd_of_a_skew_law_covers_where_chi_square_does_not() -> None:
    """exp(z / 2): the normal-theory interval is the negative control."""
    rows = np.exp(0.5 * np.random.default_rng(14).normal(size=(TRIALS, 256)))
    truth = float(np.sqrt(np.expm1(0.25) * np.exp(0.25)))
    samples = [Sample.of(row) for row in rows]
    assert hits(samples, lambda s: estimate_sd(s, 0.95), truth) >= least_hits(TRIALS)
    from scipy.stats import chi2

    ratio = rows.var(axis=1, ddof=1) / truth**2 * 255
    normal_theory = ((chi2.ppf(0.025, 255) <= ratio) & (ratio <= chi2.ppf(0.975, 255))).sum()
    assert normal_theory < least_hits(TRIALS)


def test_scramblings_narrow_the_interval(scrambled: list[Sample], plain: list[Sample]) -> None:
    """For a linear function the mean's interval is below a tenth of that of as many independent samples."""

    def width(samples: list[Sample]) -> float:
        found = [estimate_mean(s, 0.95) for s in samples]
        return float(np.median([e.high - e.low for e in found if e.high is not None and e.low is not None]))

    assert width(scrambled) < 0.1 * width(plain) / 2.0


def test_repeats_taken_as_independent_do_not_cover(repeated: list[Sample]) -> None:
    """Negative control: equal repeats counted as 256 independent samples."""
    doubled = [Sample.of(np.repeat(s.values[::2], 2)) for s in repeated]
    truth_of_mean = 0.0
    assert hits(doubled, lambda s: estimate_mean(s, 0.95), truth_of_mean) < least_hits(TRIALS)


def test_conditional_mean_over_scramblings_covers() -> None:
    """E[x + y | x > .3] = phi(.3) / (1 - Phi(.3)) for independent standard normals."""
    rows = normal_scramblings(TRIALS, 32, 2, seed=15)
    block = np.arange(512) % 16
    samples = [
        Sample.of(
            np.where(z[:, 0] >= 0.3, z.sum(axis=1), np.nan),
            margin=z[:, 0] - 0.3,
            replicate=block,
            replicates=16,
        )
        for z in rows
    ]
    truth = float(norm.pdf(0.3) / norm.sf(0.3))
    assert hits(samples, lambda s: estimate_mean(s, 0.95), truth) >= least_hits(TRIALS)
