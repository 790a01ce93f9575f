"""Observed orders and factors against powers planted by hand and against the recipe's table."""

from __future__ import annotations

import numpy as np
import pytest

from aleafield.accounting import LevelValues, Pair, PartDifferences
from aleafield.accounting.order import Order, judge_order, observed_order, reduction, safety_factor

SPREAD = np.array([1.0, -2.0, 0.5, 1.5])
"""Errors of four probes whose mean nearly cancels; their root mean square does not."""


def judged(order: float | None, planted: float, size: float = 1e-2, **settings: object) -> Order:
    """Judgement of exact differences of an error size * SPREAD * h^planted at widths 2, 1, 1/2."""
    ratio_fine = float(settings.get("ratio_fine", 2.0))  # type: ignore[arg-type]
    ratio_coarse = float(settings.get("ratio_coarse", 2.0))  # type: ignore[arg-type]
    level = LevelValues.of(np.zeros(4))
    part = PartDifferences(
        "space",
        np.arange(4),
        Pair(level, level),
        Pair(level, level),
        expected_order=order,
        **settings,  # type: ignore[arg-type]
    )
    fine = size * SPREAD * (1.0 - ratio_fine**-planted)
    coarse = size * SPREAD * (ratio_coarse**planted - 1.0)
    return judge_order(part, fine, coarse, 1e-13)


@pytest.mark.parametrize("ratios", [(2.0, 2.0), (2.0, 65 / 32), (1.9, 2.2), (3.0, 1.5)])
@pytest.mark.parametrize("order", [-1.0, 0.0, 0.5, 1.0, 2.0, 4.0, 9.0])
def test_observed_order_inverts_the_planted_one(order: float, ratios: tuple[float, float]) -> None:
    fine, coarse = ratios
    if order == 0.0:
        sizes = np.log(coarse), np.log(fine)
    else:
        sizes = abs(coarse**order - 1.0), abs(1.0 - fine**-order)
    assert observed_order(*sizes, coarse, fine) == pytest.approx(order, abs=1e-9)
    assert reduction(order, fine, coarse) == pytest.approx(sizes[0] / sizes[1], rel=1e-12)


def test_equal_ratios_give_the_logarithm() -> None:
    assert observed_order(8.0, 1.0, 2.0, 2.0) == pytest.approx(3.0, abs=1e-9)
    assert reduction(2.0, 2.0, 2.0) == pytest.approx(4.0)


@pytest.mark.parametrize(("order", "factor"), [(1.0, 2.25), (2.0, 1.0 + 1.25 / 3), (4.0, 1.0 + 1.25 / 15)])
def test_factors_where_orders_agree(order: float, factor: float) -> None:
    """2.25, 1.42 and 1.08 of the recipe."""
    for planted in (order - 0.29, order, order + 0.29):
        found = judged(order, planted)
        assert found.factor == pytest.approx(factor, rel=1e-12)
        assert found.message is None
        assert found.observed == pytest.approx(planted, abs=1e-9)


def test_factors_where_orders_disagree() -> None:
    early = judged(2.0, 1.2)
    assert early.factor == pytest.approx(1.0 + 1.25 / (2**1.2 - 1.0))
    assert early.message == "pre-asymptotic (observed order 1.2, expected 2)"
    stuck = judged(2.0, 0.2)
    assert stuck.factor == pytest.approx(8.2426, abs=1e-4)
    assert stuck.message is not None
    assert stuck.message.startswith("not converging")
    quick = judged(2.0, 3.0)
    assert quick.factor == pytest.approx(2.0)
    assert quick.message is not None


def test_faster_than_any_power() -> None:
    assert judged(None, 9.0).factor == pytest.approx(1.0 + 1.25 / 15)
    assert judged(None, 9.0).message is None
    assert judged(None, 2.0).factor == pytest.approx(1.0 + 1.25 / 3)
    assert (
        judged(None, 2.0).message == "slower than expected (observed order 2, faster than any power expected)"
    )
    assert judged(None, 0.1).factor == pytest.approx(1.0 + 1.25 / (2**0.5 - 1.0))


def test_only_observed_orders_are_claimed() -> None:
    assert judged(2.0, 3.0, observed_only=True).factor == pytest.approx(1.0 + 1.25 / 3)
    assert judged(2.0, 1.0, observed_only=True).factor == pytest.approx(2.25)
    assert judged(2.0, 1.0, observed_only=True).expected is None
    assert judged(2.0, 0.1, observed_only=True).factor == pytest.approx(8.2426, abs=1e-4)


@pytest.mark.parametrize("ratio", [1.5, 2.0, 64 / 31])
def test_the_factor_bounds_the_error_for_every_ratio(ratio: float) -> None:
    """F times the difference exceeds the planted error by a quarter of what the finer level leaves."""
    found = judged(2.0, 2.0, ratio_fine=ratio)
    difference = 1.0 - ratio**-2.0
    assert found.factor * difference == pytest.approx(1.0 + 0.25 * ratio**-2.0, rel=1e-12)
    assert safety_factor(2.0, ratio, 1.0) * difference == pytest.approx(1.0, rel=1e-12)


def test_the_least_factor_holds() -> None:
    assert judged(2.0, 2.0, least_factor=2.0).factor == 2.0
    assert judged(1.0, 1.0, least_factor=2.0).factor == pytest.approx(2.25)


def test_round_off_hides_the_order() -> None:
    found = judged(2.0, 0.0, size=1e-20)
    assert found.observed is None
    assert found.factor == pytest.approx(1.0 + 1.25 / 3)
    assert found.message is not None
    assert "round-off" in found.message


@pytest.mark.parametrize(
    ("order", "observed_only", "factor"), [(2.0, False, 2.0), (None, False, 8.2426), (2.0, True, 8.2426)]
)
def test_without_a_coarser_level_safety_is_three(
    order: float | None, observed_only: bool, factor: float
) -> None:
    level = LevelValues.of(np.zeros(4))
    part = PartDifferences(
        "space", np.arange(4), Pair(level, level), None, expected_order=order, observed_only=observed_only
    )
    found = judge_order(part, 1e-2 * SPREAD, np.zeros(0), 1e-13)
    assert found.factor == pytest.approx(factor, abs=1e-4)
    assert found.observed is None


def test_a_coarser_difference_of_zero_is_no_convergence() -> None:
    level = LevelValues.of(np.zeros(4))
    part = PartDifferences("space", np.arange(4), Pair(level, level), Pair(level, level))
    found = judge_order(part, 1e-2 * SPREAD, np.zeros(4), 1e-13)
    assert found.factor == pytest.approx(8.2426, abs=1e-4)


def test_bad_records_are_refused() -> None:
    level = LevelValues.of(np.zeros(4))
    pair = Pair(level, level)
    with pytest.raises(ValueError, match="above 1"):
        PartDifferences("space", np.arange(4), pair, None, ratio_fine=1.0)
    with pytest.raises(ValueError, match="shape"):
        PartDifferences("space", np.arange(5), pair, None)
    with pytest.raises(ValueError, match="none of the parts"):
        PartDifferences("grid", np.arange(4), pair, None)
