"""Faults in sampling and intervals that the statistical tests must see."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.estimates import Estimate, Sample, estimate_mean, probability, quantile, sd, variance_parts
from aleafield.estimates.blocks import BlockMean, normal, number_in_clusters, plain_mean, student
from aleafield.randomness.copula import Copula
from aleafield.randomness.points import PlainPoints, SobolPoints
from aleafield.randomness.streams import bit_generator, generator
from tests.statistical import (
    test_design,
    test_estimates_clusters,
    test_estimates_coverage,
    test_estimates_mean,
    test_estimates_probability,
    test_estimates_quantile,
    test_estimates_sd,
    test_variance_parts,
)
from tests.statistical.coverage import least_hits
from tests.teeth.biting import Check, Tooth, assert_bites, everywhere, member, teeth

PLAIN, NETS, TIED = (
    test_design.TestMonteCarlo(),
    test_design.TestQuasiMonteCarlo(),
    test_design.TestDependence(),
)


def in_pairs(real: Callable[..., Any]) -> Callable[..., Any]:
    """Number 2k + 1 is number 2k again."""
    return lambda self, number: real(self, number - number % 2)


def after_one_another(self: PlainPoints, indices: IntArray) -> FloatArray:
    """Points from one running generator: what a sample is depends on what was asked before."""
    running = vars(self).setdefault("running", generator(self._seed, "parameter samples"))
    return np.asarray(running.random((len(indices), self._columns)))


def rank_taken_for_latent(real: Callable[..., None]) -> Callable[..., None]:
    """Spearman's correlation in the place of the latent one."""

    def constructed(self: Copula, paths: Any, pairs: Any) -> None:
        real(self, paths, [(a, b, float(np.arcsin(rho / 2) * 6 / np.pi)) for a, b, rho in pairs])

    return constructed


@teeth(
    Tooth(
        "a reused seed: two scramblings alike",
        member(SobolPoints, "_sequence", in_pairs(SobolPoints._sequence)),
        NETS.test_scramblings_are_independent,
    ),
    Tooth(
        "a reused seed: two scramblings alike, seen by the coverage",
        member(SobolPoints, "_sequence", in_pairs(SobolPoints._sequence)),
        NETS.test_t_intervals_over_scramblings_cover,
    ),
    Tooth(
        "two samples alike",
        member(PlainPoints, "at", in_pairs(PlainPoints.at)),
        PLAIN.test_mean_square_error,
    ),
    Tooth(
        "a seed that is not read",
        everywhere(bit_generator, lambda seed, purpose, *numbers: bit_generator(1, purpose, *numbers)),
        PLAIN.test_the_seed_decides_and_nothing_else,
    ),
    Tooth(
        "a running generator in the place of a counter",
        member(PlainPoints, "at", after_one_another),
        PLAIN.test_any_part_in_any_order_is_the_same_to_the_bit,
    ),
    Tooth(
        "correlations that are not used",
        member(Copula, "correlate", lambda self, points: points),
        lambda: TIED.test_rank_correlations_are_reached_and_laws_kept("monte carlo"),
    ),
    Tooth(
        "a rank correlation taken for the latent one",
        member(Copula, "__init__", rank_taken_for_latent(Copula.__init__)),
        TIED.test_latent_correlation,
    ),
)
def test_samples(tooth: Tooth) -> None:
    assert_bites(tooth)


def half_as_wide(estimate: Callable[..., Estimate]) -> Callable[..., Estimate]:
    """Both ends of an interval half as far from the value."""

    def narrowed(*arguments: Any) -> Estimate:
        found = estimate(*arguments)
        if found.value is None or found.low is None or found.high is None:
            return found
        middle = found.value
        return replace(found, low=0.5 * (middle + found.low), high=0.5 * (middle + found.high))

    return narrowed


def mean_of_four_blocks_covers() -> None:
    """400 trials of 4 blocks of 8 normal values each, counted as the suite counts its coverage."""
    rows = np.random.default_rng(17).normal(size=(test_estimates_coverage.TRIALS, 32))
    block = np.arange(32) % 4
    samples = [Sample.of(row, replicate=block, replicates=4) for row in rows]
    held = test_estimates_coverage.hits(samples, *test_estimates_coverage.TRUTHS["mean"])
    assert held >= least_hits(test_estimates_coverage.TRIALS)


def wald(share: float, effective: float, z: float) -> tuple[float, float]:
    """The interval that is too short for rare events."""
    half = z * float(np.sqrt(share * (1 - share) / effective))
    return share - half, share + half


def guessed_ranks(n: int, p: float, confidence: float) -> tuple[int, int]:
    """Ranks cut to what there is: a guess where the samples do not determine the interval."""
    reach = normal(confidence) * float(np.sqrt(n * p * (1 - p)))
    return max(1, int(n * p - reach)), min(n, int(n * p + reach) + 1)


T_TEST: Check = lambda: test_estimates_mean.test_plain_interval_is_that_of_the_t_test(0.95)  # noqa: E731
WILSON: Check = lambda: test_estimates_probability.test_plain_interval_is_wilsons(1, 64, 0.95)  # noqa: E731


@teeth(
    Tooth(
        "z in the place of t over 4 replicates",
        everywhere(student, lambda confidence, _: normal(confidence)),
        mean_of_four_blocks_covers,
    ),
    Tooth(
        "z in the place of t, seen by the t test",
        everywhere(student, lambda confidence, _: normal(confidence)),
        T_TEST,
    ),
    Tooth("a mean's interval halved", everywhere(estimate_mean, half_as_wide(estimate_mean)), T_TEST),
    Tooth(
        "a mean's interval halved, seen by the coverage",
        everywhere(estimate_mean, half_as_wide(estimate_mean)),
        mean_of_four_blocks_covers,
    ),
    Tooth(
        "a standard error without its root",
        member(
            BlockMean,
            "half_width",
            lambda self, confidence: student(confidence, self.degrees) * self.standard_error**2,
        ),
        T_TEST,
    ),
    Tooth(
        "repeats that count as independent",
        member(Sample, "mean_over", lambda self, values, block: plain_mean(values)),
        test_estimates_mean.test_repeats_of_a_parameter_sample_do_not_count_as_independent,
    ),
    Tooth(
        "repeats that count as independent, in a quantile",
        everywhere(number_in_clusters, lambda share, n, hits: float(n)),
        lambda: test_estimates_clusters.test_intervals_cover_where_parameters_rule(8, "q05"),
    ),
    Tooth(
        "variance of cluster means taken for the parameter part",
        member(variance_parts._Table, "noise", lambda self, confidence: Estimate(1e-9, 1e-9, 1e-9)),
        lambda: test_variance_parts.test_intervals_cover(test_variance_parts.DESIGNS[0]),
    ),
    Tooth(
        "the divisor n - 1 under scrambled points",
        everywhere(sd.block_factor, lambda sample: 1.0),
        test_estimates_sd.test_many_scrambled_points_leave_no_bias_of_the_divisor,
    ),
    Tooth(
        "an sd's interval halved",
        everywhere(sd.estimate_sd, half_as_wide(sd.estimate_sd)),
        lambda: test_estimates_sd.test_plain_interval_is_the_jackknife_over_samples(0.95),
    ),
    Tooth("Wald's interval for a probability", everywhere(probability.wilson, wald), WILSON),
    Tooth(
        "Wald's interval, seen by the coverage",
        everywhere(probability.wilson, wald),
        test_estimates_probability.test_wilson_covers_a_rare_event_and_wald_does_not,
    ),
    Tooth(
        "a clipped guess for an extreme quantile",
        everywhere(quantile.order_statistic_ranks, guessed_ranks),
        lambda: test_estimates_quantile.test_fewest_samples_for_a_95_per_cent_interval(0.95, 72),
    ),
    Tooth(
        "a NaN that counts as a value",
        member(Sample, "given", property(lambda self: self.values[self.valid])),
        test_estimates_mean.test_failed_and_missing_values_do_not_count,
    ),
    Tooth(
        "a failed sample that counts",
        member(Sample, "n_valid", property(lambda self: len(self.values))),
        test_estimates_probability.test_exceed_is_strict_and_unconditional,
    ),
)
def test_intervals(tooth: Tooth) -> None:
    assert_bites(tooth)
