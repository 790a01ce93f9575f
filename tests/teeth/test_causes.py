"""Faults in surrogates and in sensitivity estimators that the tests must see."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.chaos import acceptance
from aleafield.chaos.expansion import Expansion
from aleafield.chaos.regression import Fit, fit
from aleafield.sensitivity.exchange import ExchangeSums
from aleafield.sensitivity.next_measurement import may_be_fixed
from aleafield.sensitivity.ratios import Indices, Ratios
from aleafield.sensitivity.shapley import shapley_weights
from tests.chaos import test_acceptance, test_regression, test_search
from tests.sensitivity import test_indices, test_next_measurement, test_shapley
from tests.sensitivity.known_functions import ISHIGAMI
from tests.teeth.biting import Tooth, assert_bites, everywhere, member, teeth


def seen_residuals(values: FloatArray, y: FloatArray) -> Fit:
    """Residuals of the rows that were fitted, as if they had been left out."""
    found = fit(values, y)
    return replace(found, residuals=y - values @ found.coefficients)


def total_is_first(self: Expansion) -> FloatArray:
    """Total indices without the terms of several inputs."""
    return self.first()


def uncentred_pairs(self: ExchangeSums) -> Ratios:
    """Total indices in place of those of first order."""
    return ExchangeSums.total(self)


def by_value(total: Indices, threshold: float = 0.01) -> np.ndarray:
    """An input is fixed where the estimate of its index is small, whatever its interval."""
    return np.asarray(total.value < threshold)


def equal_weights(players: int) -> FloatArray:
    """Every subset counts alike, whatever its size."""
    real = shapley_weights(players)
    return np.asarray(np.sign(real) / 2.0 ** (players - 1))


@teeth(
    Tooth(
        "leave-one-out residuals are those of the fit",
        everywhere(fit, seen_residuals),
        test_regression.test_leave_one_out_is_what_leaving_one_out_gives,
    ),
    Tooth(
        "a surrogate may be wrong by half of the variance",
        member(acceptance, "LARGEST_ERROR", 0.5),
        test_acceptance.test_the_smooth_field_is_accepted_and_the_bistable_one_is_not,
    ),
    Tooth(
        "total indices without interactions",
        member(Expansion, "total", total_is_first),
        lambda: test_search.test_indices_of_known_functions(ISHIGAMI, 512, 1.1e-3, 1.5e-4),
    ),
)
def test_surrogates(tooth: Tooth) -> None:
    assert_bites(tooth)


@teeth(
    Tooth(
        "first-order indices of the exchange are total ones",
        member(ExchangeSums, "first", uncentred_pairs),
        lambda: test_indices.test_known_indices_lie_inside(ISHIGAMI),
    ),
    Tooth(
        "an input is fixed by its estimate alone",
        everywhere(may_be_fixed, by_value),
        test_next_measurement.test_fixing_is_seldom_wrong,
    ),
    Tooth(
        "subsets of every size count alike in a Shapley effect",
        everywhere(shapley_weights, equal_weights),
        test_shapley.test_weights_on_exact_variances,
    ),
)
def test_indices_and_what_follows(tooth: Tooth) -> None:
    assert_bites(tooth)
