"""The observed order of a difference, and the factor that turns it into a bound."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from aleafield.accounting.records import LARGEST_SPECTRAL_ORDER, PartDifferences
from aleafield.arrays import FloatArray

AGREEMENT = 0.3
SMALLEST_ORDER = 0.5
LARGEST_UNPROVEN_ORDER = 2.0
SAFETY = 1.25
CAUTIOUS_SAFETY = 3.0
SEARCHED_ORDERS = (-10.0, 60.0)
RELATIVE_ROUND_OFF = 1e-13
"""Differences below this share of the largest value (of the domain, for a length) are rounding."""


@dataclass(frozen=True)
class Order:
    """Observed and expected order of one part, and the factor that follows.

    Attributes
    ----------
    observed : float or None
        p^ from three levels; None where it cannot be seen.
    expected : float or None
        None for faster than any power, and where no order is proven.
    factor : float
        F: the error of the run's level is at most about F times the difference.
    message : str or None
        What a reader must know, where the orders do not agree.
    """

    observed: float | None
    expected: float | None
    factor: float
    message: str | None


def safety_factor(order: float, ratio: float, safety: float = SAFETY) -> float:
    """F = 1 + safety / (ratio^order - 1).

    With safety 1 this is Richardson's limit: an error c h^order differs by its 1 - ratio^-order part from the
    one at h / ratio.  The safety factors 1.25 and 3 are those of the grid convergence index (Roache 1994).
    """
    return 1.0 + safety / math.expm1(order * math.log(ratio))


def reduction(order: float, ratio_fine: float, ratio_coarse: float) -> float:
    """By what the coarser difference exceeds the finer one when the error is c h^order.

    (ratio_coarse^p - 1) / (1 - ratio_fine^-p); 2^p when both ratios are 2.
    """
    coarse, fine = math.log(ratio_coarse), math.log(ratio_fine)
    if order == 0.0:
        return coarse / fine
    return math.expm1(order * coarse) / -math.expm1(-order * fine)


def observed_order(coarse: float, fine: float, ratio_coarse: float, ratio_fine: float) -> float:
    """The order p at which `reduction` is coarse / fine (sizes > 0), within SEARCHED_ORDERS.

    `reduction` grows with the order, so bisection finds it; for equal ratios it is log(coarse / fine) /
    log(ratio).
    """
    low, high = SEARCHED_ORDERS
    wanted = coarse / fine
    for _ in range(60):
        middle = 0.5 * (low + high)
        if reduction(middle, ratio_fine, ratio_coarse) < wanted:
            low = middle
        else:
            high = middle
    return 0.5 * (low + high)


def judge_order(part: PartDifferences, fine: FloatArray, coarse: FloatArray, round_off: float) -> Order:
    """Order and factor of one part.

    Parameters
    ----------
    part : PartDifferences
    fine, coarse : float arrays
        Differences per probe on the finer and the coarser pair; may be empty.
    round_off : float
        Size up to which a difference is rounding.

    Returns
    -------
    Order
        The order p^ is observed from root mean squares of per-probe differences, which a cancelling mean does
        not disturb.  With p the expected order and rho the ratio of the finer pair, F is

        - 1 + 1.25 / (rho^p - 1) where |p^ - p| <= 0.3;
        - 1 + 1.25 / (rho^p^ - 1) where 0.5 <= p^ < p - 0.3 (pre-asymptotic);
        - 1 + 3 / (rho^0.5 - 1) where p^ < 0.5 (not converging);
        - 1 + 3 / (rho^p - 1) where p^ > p + 0.3;
        - 1 + 1.25 / (rho^p' - 1), p' = p^ within [0.5, 4], for faster than any power;
        - the same with p' = p^ within [0.5, 2] where no order is proven (safety 3 below 0.5);
        - 1 + 3 / (rho^p - 1) where the order cannot be seen for want of a coarser level (p = 1/2 without an
          expected order);
        - the first of these at the expected order where the difference is rounding;

        where it is known beforehand it is that, and for a part with an open side that of order 1: what no order
        bounds lies on the other side;

        and never below `least_factor`, nor, for an erratic part, below 1 + 3 / (rho^0.5 - 1): it may look as if it
        converged.
    """
    size_fine, size_coarse = root_mean_square(fine), root_mean_square(coarse)
    if part.known_factor is not None:
        order = Order(None, None, part.known_factor, None)
    elif part.open:
        order = Order(None, 1.0, safety_factor(1.0, part.ratio_fine), None)
    elif size_fine <= round_off:
        order = _unseen_at_round_off(part)
    elif size_coarse == 0.0 and len(coarse) == 0:
        order = _unseen(part)
    else:
        observed = SEARCHED_ORDERS[0]
        if size_coarse > 0.0:
            observed = observed_order(size_coarse, size_fine, part.ratio_coarse, part.ratio_fine)
        order = _seen(part, observed)
    least = part.least_factor
    if part.erratic:
        least = max(least, safety_factor(SMALLEST_ORDER, part.ratio_fine, CAUTIOUS_SAFETY))
    return Order(order.observed, order.expected, max(order.factor, least), order.message)


def anticipated_factor(
    expected_order: float | None, ratio: float, known_factor: float | None = None
) -> float:
    """The factor of a part before its order is observed: as if it were the expected one.

    Parameters
    ----------
    expected_order : float or None
        None for faster than any power.
    ratio : of mesh widths or steps, coarser over finer, > 1
    known_factor : as in `PartDifferences`
    """
    if known_factor is not None:
        return known_factor
    return safety_factor(LARGEST_SPECTRAL_ORDER if expected_order is None else expected_order, ratio)


def root_mean_square(values: FloatArray) -> float:
    """Root mean square; 0 for no values."""
    return float(np.sqrt(np.mean(values**2))) if len(values) else 0.0


def _unseen_at_round_off(part: PartDifferences) -> Order:
    expected = None if part.observed_only else part.expected_order
    order = LARGEST_SPECTRAL_ORDER if expected is None else expected
    if part.observed_only:
        order = SMALLEST_ORDER
    message = "the difference is at round-off level; its order cannot be observed"
    return Order(None, expected, safety_factor(order, part.ratio_fine), message)


def _unseen(part: PartDifferences) -> Order:
    expected = None if part.observed_only else part.expected_order
    order = SMALLEST_ORDER if expected is None else expected
    message = "the order could not be observed: no coarser level to compare"
    return Order(None, expected, safety_factor(order, part.ratio_fine, CAUTIOUS_SAFETY), message)


def _seen(part: PartDifferences, observed: float) -> Order:
    rho = part.ratio_fine
    if part.observed_only:
        used = min(max(observed, SMALLEST_ORDER), LARGEST_UNPROVEN_ORDER)
        if observed < SMALLEST_ORDER:
            message = f"not converging (observed order {observed:.2g}, none is proven)"
            return Order(observed, None, safety_factor(used, rho, CAUTIOUS_SAFETY), message)
        return Order(observed, None, safety_factor(used, rho), None)
    if part.expected_order is None:
        used = min(max(observed, SMALLEST_ORDER), LARGEST_SPECTRAL_ORDER)
        message = ""
        if observed < SMALLEST_ORDER:
            message = f"not converging (observed order {observed:.2g}, faster than any power expected)"
        elif observed < LARGEST_SPECTRAL_ORDER:
            message = f"slower than expected (observed order {observed:.2g}, faster than any power expected)"
        least = safety_factor(LARGEST_SPECTRAL_ORDER, 2.0)
        return Order(observed, None, max(safety_factor(used, rho), least), message or None)
    expected = part.expected_order
    said = f"observed order {observed:.2g}, expected {expected:g}"
    if abs(observed - expected) <= AGREEMENT:
        return Order(observed, expected, safety_factor(expected, rho), None)
    if observed < SMALLEST_ORDER:
        factor = safety_factor(SMALLEST_ORDER, rho, CAUTIOUS_SAFETY)
        return Order(observed, expected, factor, f"not converging ({said})")
    if observed < expected:
        return Order(observed, expected, safety_factor(observed, rho), f"pre-asymptotic ({said})")
    factor = safety_factor(expected, rho, CAUTIOUS_SAFETY)
    return Order(observed, expected, factor, f"falls faster than expected ({said}); judged with caution")
