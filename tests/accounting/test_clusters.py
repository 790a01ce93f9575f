"""The error split on samples that come in clusters, and the demand for probes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import t as student_t

from aleafield.accounting import (
    MEAN,
    SD,
    LevelValues,
    Pair,
    PartDifferences,
    PilotDifferences,
    anticipated_factor,
    demand,
    least_number,
    quantile,
    split_error,
)
from aleafield.accounting.measured import MeasuredPart
from aleafield.accounting.regression import fit_differences
from aleafield.estimates import Sample

CLUSTERS, REPEATS, PROBES = 200, 3, 40
CLUSTER = np.arange(CLUSTERS * REPEATS) // REPEATS
GENERATOR = np.random.default_rng(81)
VALUES = GENERATOR.normal(size=CLUSTERS * REPEATS) + np.repeat(GENERATOR.normal(size=CLUSTERS), REPEATS)
DIFFERENCE = 0.1 + 0.05 * np.repeat(GENERATOR.normal(size=CLUSTERS), REPEATS)
"""A difference that all repeats of a parameter sample share."""


def clustered(values: np.ndarray = VALUES) -> Sample:
    return Sample.of(values, replicate=CLUSTER, replicates=CLUSTERS, clustered=True)


def part(probes: int) -> PartDifferences:
    """A part on the first parameter samples with all their repeats."""
    n = probes * REPEATS
    pair = Pair(LevelValues.of(VALUES[:n]), LevelValues.of((VALUES - DIFFERENCE)[:n]))
    return PartDifferences("time", np.arange(n), pair, None, known_factor=2.0)


def test_noise_of_a_bias_rests_on_clusters_of_probes() -> None:
    """F t sd / sqrt(40) over 40 cluster means, drawn from 200: never over 120 realizations."""
    found = split_error(clustered(), [part(PROBES)], MEAN, 0.95)
    means = DIFFERENCE[: PROBES * REPEATS : REPEATS]
    half_width = student_t.ppf(0.975, PROBES - 1) * means.std(ddof=1) / np.sqrt(PROBES)
    assert found.error["time"] == pytest.approx(2.0 * means.mean(), rel=1e-9)
    assert found.error["bias_noise"] == pytest.approx(2.0 * half_width * np.sqrt(1 - 40 / 200), rel=1e-9)


@pytest.mark.parametrize("statistic", [MEAN, SD])
def test_probes_that_are_all_of_the_sample_leave_no_noise(statistic: object) -> None:
    found = split_error(clustered(), [part(CLUSTERS)], statistic, 0.95)  # type: ignore[arg-type]
    assert found.error["bias_noise"] == 0.0


def test_the_square_of_the_sd_is_what_the_design_says() -> None:
    """Clusters know the mean less well than as many independent samples: more is added to the mean square."""
    rows = VALUES.reshape(CLUSTERS, REPEATS)
    found = split_error(clustered(), [], SD, 0.95)
    expected = VALUES.var() + rows.mean(axis=1).var(ddof=1) / CLUSTERS
    assert found.value == pytest.approx(np.sqrt(expected), rel=1e-12)


def test_pairs_count_clusters() -> None:
    """It occurs on all three paths of four probes only: twelve pairs, four of them of their own."""
    margin = np.where(np.arange(CLUSTERS * REPEATS) < 4 * REPEATS, 1.0, -1.0)
    margin[PROBES * REPEATS :] = 1.0
    values = np.where(margin >= 0, VALUES, np.nan)
    sample = Sample.of(values, margin=margin, replicate=CLUSTER, replicates=CLUSTERS, clustered=True)
    n = PROBES * REPEATS
    level = LevelValues.of(values[:n], margin[:n])
    few = PartDifferences("time", np.arange(n), Pair(level, level), None)
    found = split_error(sample, [few], quantile(0.5), 0.95)
    assert found.reason == "the time part cannot be measured: the quantity occurs on too few probes"


def test_a_curve_needs_clusters() -> None:
    """Nine pairs from three parameter samples give a constant; from nine a parabola."""
    n = 3 * REPEATS
    for independent, degree in ((3, 0), (5, 1), (9, 2)):
        fit = fit_differences(VALUES[:n], DIFFERENCE[:n], 0.0, 1.0, False, independent=independent)
        assert len(fit.coefficients) == degree + 1


def test_covariance_of_a_regression_in_clusters() -> None:
    """A constant fitted to D that clusters share: the standard error of 40 cluster means."""
    n = PROBES * REPEATS
    fit = fit_differences(VALUES[:n], DIFFERENCE[:n], 0.0, 1.0, False, independent=1, block=CLUSTER[:n])
    means = DIFFERENCE[:n:REPEATS]
    half_width = student_t.ppf(0.975, PROBES - 1) * means.std(ddof=1) / np.sqrt(PROBES)
    assert fit.half_width(0.95, 1.0)(np.zeros(1))[0] == pytest.approx(half_width, rel=1e-9)
    assert fit.half_width(0.95, 0.5)(np.zeros(1))[0] == pytest.approx(half_width / 2, rel=1e-9)


def test_covariance_of_a_line() -> None:
    """Independent probes with equal residual variance: the textbook's band, up to the sandwich's own chance."""
    generator = np.random.default_rng(82)
    x = generator.normal(size=4000)
    noise = generator.normal(size=4000)
    fit = fit_differences(x, 0.3 * x + noise, 0.0, 1.0, False, independent=6, block=np.arange(4000))
    at = np.array([-1.5, 0.0, 2.0])
    textbook = 1.96 * np.sqrt(1 / 4000 + at**2 / 4000)
    assert fit.half_width(0.95, 1.0)(at) == pytest.approx(textbook, rel=0.1)


def test_plain_samples_are_blocks_of_their_own() -> None:
    sample = Sample.of(VALUES)
    fits = MeasuredPart(sample, replace(part(PROBES), noisy=True)).fits
    assert fits[0].degrees == PROBES * REPEATS - 3
    assert MeasuredPart(sample, part(PROBES)).fits[0].covariance is None


def test_demand_by_hand() -> None:
    """sd(D) / sd(Q) = 1/20 over cluster means and F = 2.25: (2 * 2.25 / 20)^2."""
    base = np.array([1.0, 2.0, 4.0, 5.0])
    spread = np.array([[-1.0, 1.0]])
    pilot = PilotDifferences(base[:, None] + 3.0 * spread, base[::-1, None] / 20 + spread, 2.25)
    small = PilotDifferences(base[:, None], base[:, None] / 1e3, 2.25)
    assert demand([small, pilot]) == pytest.approx((2 * 2.25 / 20) ** 2)


def test_demand_leaves_out_what_says_nothing() -> None:
    gone = np.full((4, 2), np.nan)
    still, moving = np.ones((4, 2)), np.arange(8.0).reshape(4, 2)
    assert demand([PilotDifferences(still, moving, 2.0), PilotDifferences(gone, moving, 2.0)]) == 0.0
    with_gap = moving.copy()
    with_gap[0, 1] = np.nan
    found = demand([PilotDifferences(with_gap, 0.1 * moving, 1.0)])
    kept = np.array([0.0, 2.5, 4.5, 6.5])
    assert found == pytest.approx((2 * (0.1 * kept).std() / kept.std()) ** 2)


@pytest.mark.parametrize(
    ("samples", "wanted", "least"), [(1000, 0.0, 32), (1000, 0.05, 50), (1000, 3.0, 1000), (20, 0.5, 32)]
)
def test_least_number(samples: int, wanted: float, least: int) -> None:
    assert least_number(samples, wanted) == least


def test_anticipated_factors() -> None:
    assert anticipated_factor(1.0, 2.0) == pytest.approx(2.25)
    assert anticipated_factor(None, 2.0) == pytest.approx(1 + 1.25 / 15)
    assert anticipated_factor(1.0, 2.0, 1.7) == 1.7
