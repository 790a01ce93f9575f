"""Which statistic of a quantity is meant."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from aleafield.estimates import (
    Estimate,
    Sample,
    estimate_exceedance,
    estimate_mean,
    estimate_occurrence,
    estimate_quantile,
    estimate_sd,
)


@dataclass(frozen=True)
class Statistic:
    """A statistic of one quantity.

    Attributes
    ----------
    kind : "mean", "sd", "quantile", "exceed" or "occurs"
        Mean, sd and quantiles are given that the quantity occurs; exceed is not.
    at : float
        The probability of a quantile, the level (units of the quantity) of an exceedance; else unused and 0.
    """

    kind: Literal["mean", "sd", "quantile", "exceed", "occurs"]
    at: float = 0.0

    @property
    def is_probability(self) -> bool:
        """Whether its values lie in [0, 1]."""
        return self.kind in ("exceed", "occurs")

    @property
    def has_influence(self) -> bool:
        """Whether its bias is a mean of influence values: not so for quantiles and probabilities."""
        return self.kind in ("mean", "sd")

    @property
    def limits(self) -> tuple[float, float]:
        """Smallest and largest possible value."""
        return (
            0.0 if self.is_probability or self.kind == "sd" else -math.inf,
            1.0 if self.is_probability else math.inf,
        )

    def estimate(self, sample: Sample, confidence: float) -> Estimate:
        """The statistic of a sample with its sampling interval."""
        match self.kind:
            case "mean":
                return estimate_mean(sample, confidence)
            case "sd":
                return estimate_sd(sample, confidence)
            case "quantile":
                return estimate_quantile(sample, self.at, confidence)
            case "exceed":
                return estimate_exceedance(sample, self.at, confidence)
            case "occurs":
                return estimate_occurrence(sample, confidence)


MEAN = Statistic("mean")
SD = Statistic("sd")
OCCURS = Statistic("occurs")


def quantile(p: float) -> Statistic:
    """The p quantile, given that the quantity occurs."""
    return Statistic("quantile", float(p))


def exceed(level: float) -> Statistic:
    """The probability that the quantity occurs and lies above the level."""
    return Statistic("exceed", float(level))
