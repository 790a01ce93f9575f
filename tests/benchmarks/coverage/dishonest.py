"""Intervals that are known to be dishonest, made from what a run states: they must fail where the stated ones hold."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from scipy import stats

from tests.benchmarks.coverage.truth import FloatArray

PARTS = ("space", "quadrature", "time", "noise_modes")
"""Parts of the discretisation error."""
GROUP = 64
"""Parameter samples of a trial of `held_as_independent`; a divisor of the numbers of samples."""
Interval = tuple[float, float]


def parts(statement: Mapping[str, Any]) -> dict[str, float]:
    """The stated bounds of the discretisation parts."""
    return {part: float(statement["error"].get(part) or 0.0) for part in PARTS}


def of_statistic(statement: Mapping[str, Any]) -> dict[str, Interval]:
    """Dishonest intervals of any statistic, by name."""
    value, bounds = statement["value"], parts(statement)
    sampling = statement["error"]["sampling"] or 0.0
    orders = statement.get("orders", {})
    bare = [bound / (orders.get(part, {}).get("factor") or 1.0) for part, bound in bounds.items()]
    half = float(np.sqrt(sum(b**2 for b in bare) + sampling**2))
    untimed = sum(bounds.values()) - bounds["time"] + sampling
    return {
        "sampling alone": (value - sampling, value + sampling),
        "all parts in quadrature, no factors": (value - half, value + half),
        "time part left out": (value - untimed, value + untimed),
    }


def without_noise_taken_off(quantity: Mapping[str, Any], samples: int, repeats: int) -> Interval:
    """Variance of the means over repeats, with its chi-square interval, in place of the variance of the parameters."""
    members = quantity["variance"]
    means = members["total"]["value"] - members["noise"]["value"] * (1 - 1 / repeats)
    degrees = samples - 1
    low, high = degrees * means / stats.chi2.ppf([0.975, 0.025], degrees)
    return float(low), float(high)


def held_as_independent(values: FloatArray, repeats: int, mean: float) -> float:
    """How often mean +- z sd / sqrt(number), all realizations taken as independent, holds the mean of the scheme.

    A run of plain Monte Carlo is cut into groups of `GROUP` parameter samples with all their repeats, each a trial.
    """
    groups = values.reshape(-1, GROUP * repeats)
    half = stats.norm.ppf(0.975) * groups.std(axis=1, ddof=1) / np.sqrt(groups.shape[1])
    return float(np.mean(np.abs(groups.mean(axis=1) - mean) <= half))
