"""Faults in the error split that the accounting tests must see."""

from __future__ import annotations

import tempfile
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

from aleafield.accounting import MEAN, split
from aleafield.accounting.bias import Bias, bias_of, joint_change
from aleafield.accounting.measured import MeasuredPart
from aleafield.accounting.order import Order, judge_order, observed_order, safety_factor
from aleafield.accounting.records import PartDifferences
from aleafield.accounting.split import combine
from aleafield.estimates import Sample
from aleafield.estimates.blocks import plain_mean
from tests.accounting import (
    test_clusters,
    test_jumps,
    test_mesh,
    test_noise_parts,
    test_order,
    test_split,
    test_split_coverage,
)
from tests.statistical.coverage import least_hits
from tests.teeth.biting import Tooth, assert_bites, everywhere, member, teeth


def means_are_covered() -> None:
    """The stratum where biases dominate: as many intervals hold the mean as stated."""
    held, of = test_split_coverage.always(0.2, 256, False, 33).hits("mean")
    assert held >= least_hits(of)


def a_jump_is_covered() -> None:
    """A box under 127 Fourier modes: next to no change at a point on the finer mesh, but an error there."""
    with tempfile.TemporaryDirectory() as folder:
        test_jumps.test_intervals_hold_the_truth_and_nothing_is_extrapolated("fourier", 127, Path(folder))


def part_left_out(name: str) -> Callable[..., Any]:
    """A statement that knows nothing of one part."""

    def faulty(sample: Any, measured: Any, statistic: Any, confidence: float) -> Any:
        return combine(sample, [m for m in measured if m.part.name != name], statistic, confidence)

    return faulty


def root_sum_square(values: Any) -> float:
    """Biases added as if they were independent noise."""
    return float(np.sqrt(np.sum(np.square(list(values)))))


def without(**changes: Any) -> Callable[..., Any]:
    """Biases with a member that is lost."""

    def faulty(*arguments: Any) -> Any:
        found = bias_of(*arguments)
        return replace(found, **changes) if isinstance(found, Bias) else found

    return faulty


def trusting(part: Any, fine: Any, coarse: Any, round_off: float) -> Order:
    """The expected order is taken as observed, whatever the differences say."""
    found = judge_order(part, fine, coarse, round_off)
    if part.expected_order is None:
        return found
    return replace(found, factor=safety_factor(part.expected_order, part.ratio_fine), message=None)


def forgetful(part: Any, fine: Any, coarse: Any, round_off: float) -> Order:
    """The order is observed although the factor is known."""
    return judge_order(replace(part, known_factor=None), fine, coarse, round_off)


class SumsInQuadrature:
    """The module math, in which a sum is a root of a sum of squares."""

    fsum = staticmethod(root_sum_square)

    def __getattr__(self, name: str) -> Any:
        import math

        return getattr(math, name)


BY_HAND, COVERAGE = test_split.test_mean_by_hand, means_are_covered


@teeth(
    Tooth(
        "no safety: F = 1",
        everywhere(safety_factor, lambda *_: 1.0),
        lambda: test_order.test_factors_where_orders_agree(2.0, 1.0 + 1.25 / 3),
    ),
    Tooth("no safety: F = 1, in a statement", everywhere(safety_factor, lambda *_: 1.0), BY_HAND),
    Tooth("no safety: F = 1, seen by the coverage", everywhere(safety_factor, lambda *_: 1.0), COVERAGE),
    Tooth(
        "the expected order trusted",
        everywhere(judge_order, trusting),
        test_order.test_factors_where_orders_disagree,
    ),
    Tooth(
        "orders observed with the ratio 2 whatever the levels",
        everywhere(observed_order, lambda coarse, fine, *_: float(np.log2(coarse / fine))),
        lambda: test_order.test_observed_order_inverts_the_planted_one(2.0, (3.0, 1.5)),
    ),
    *[
        Tooth(f"the {name} part left out", everywhere(combine, part_left_out(name)), BY_HAND)
        for name in ("time", "space", "quadrature")
    ],
    Tooth("biases added in quadrature", member(split, "math", SumsInQuadrature()), BY_HAND),
    Tooth(
        "biases added in quadrature, seen by the coverage",
        member(split, "math", SumsInQuadrature()),
        COVERAGE,
    ),
    Tooth("the noise of the biases forgotten", everywhere(bias_of, without(noise=0.0)), BY_HAND),
    Tooth(
        "a correction of the wrong sign",
        everywhere(bias_of, without(correction=0.0)),
        test_split.test_corrected_mean,
    ),
    Tooth(
        "a failed probe that counts",
        member(MeasuredPart, "usable", property(lambda self: np.ones(len(self.part.probes), dtype=bool))),
        test_split.test_failed_probes_are_left_out_and_said,
    ),
    Tooth(
        "a cancellation on one mesh believed",
        member(PartDifferences, "order_of_chance", property(lambda self: None)),
        test_mesh.test_a_cancellation_on_one_mesh_alone_is_not_believed,
    ),
    Tooth(
        "a sum that does not converge used",
        everywhere(split._converges, lambda order: True),
        test_mesh.test_a_sum_that_does_not_converge_is_not_used,
    ),
    Tooth(
        "an erratic error that is small on one mesh believed",
        member(PartDifferences, "order_of_chance", property(lambda self: None)),
        a_jump_is_covered,
    ),
    Tooth(
        "probes that count as independent whatever their parameter sample",
        member(Sample, "mean_over", lambda self, values, block: plain_mean(values)),
        test_clusters.test_noise_of_a_bias_rests_on_clusters_of_probes,
    ),
    Tooth(
        "an open side closed",
        member(MeasuredPart, "open_sides", lambda self, statistic: frozenset()),
        lambda: test_noise_parts.test_an_open_side_has_no_bound("above", MEAN),
    ),
    Tooth(
        "a factor that is known, observed all the same",
        everywhere(judge_order, forgetful),
        test_noise_parts.test_a_known_factor_needs_no_coarser_level,
    ),
    Tooth(
        "parts in a tail that are not taken together",
        everywhere(joint_change, lambda *_: 0.0),
        test_split.test_three_shifts_into_a_tail_count_jointly,
    ),
)
def test_split_of_the_error(tooth: Tooth) -> None:
    assert_bites(tooth)
