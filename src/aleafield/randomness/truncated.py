"""The Gaussian law cut to an interval, accurate however far the interval lies in the tail."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.randomness.law import Law

_MOMENT_POINTS = 100
"""Gauss points of the two moment integrals; rounding is reached with fewer than 60."""
_NEGLIGIBLE = 80.0
"""The moment integrals end where the density is exp(-80 / 2) = 4e-18 of its largest value."""


@dataclass(frozen=True)
class TruncatedNormal(Law):
    """A Gaussian number with mean `mu` and standard deviation `sigma`, given that it lies in (low, high).

    `mean` and `sd` of the law are those after the cut. Probabilities are taken in the smaller tail and as
    logarithms, so that nothing cancels far from the mean.
    """

    name = "truncated_normal"
    arguments = ("mean", "sd", "low", "high")
    mu: float
    sigma: float
    low: float
    high: float

    def _check(self) -> None:
        self._require_positive("sd", self.sigma)
        self._require_increasing(self.low, self.high)
        from scipy.special import log_ndtr

        if not math.isfinite(log_ndtr(self._tail()[1])):
            raise self._fault("has all of its interval beyond reach", "low and high must lie near the mean")

    @property
    def _reflected(self) -> bool:
        """Whether the interval lies more to the right, so that its mirror image is the accurate one."""
        return self.low - self.mu > self.mu - self.high

    def _tail(self) -> tuple[float, float]:
        """Ends of the standardised interval, reflected where that makes it lie more to the left."""
        a, b = (self.low - self.mu) / self.sigma, (self.high - self.mu) / self.sigma
        return (-b, -a) if self._reflected else (a, b)

    def _moments(self) -> tuple[float, float]:
        a, b = self._tail()
        peak = min(max(0.0, a), b)
        reach = math.hypot(peak, math.sqrt(_NEGLIGIBLE))
        ends = max(a, -reach), min(b, reach)
        # The density falls off with the offset from its peak; forming that first keeps narrow cuts exact.
        first, last = ends[0] - peak, ends[1] - peak
        nodes, weights = np.polynomial.legendre.leggauss(_MOMENT_POINTS)
        offset = (first + last) / 2 + (last - first) / 2 * nodes
        mass = weights * np.exp(-offset * (peak + offset / 2))
        mass /= mass.sum()
        mean = float((mass * offset).sum())
        variance = float((mass * (offset - mean) ** 2).sum())
        return peak + mean, math.sqrt(variance)

    @property
    def mean(self) -> float:
        standard = self._moments()[0]
        value = self.mu + self.sigma * (-standard if self._reflected else standard)
        return min(max(value, self.low), self.high)

    @property
    def sd(self) -> float:
        return self.sigma * self._moments()[1]

    @property
    def support(self) -> tuple[float, float]:
        return self.low, self.high

    def ppf(self, probability: FloatArray) -> FloatArray:
        from scipy.special import log_ndtr, ndtri_exp

        a, b = self._tail()
        p = np.asarray(probability)
        share = 1 - p if self._reflected else p
        below = math.exp(float(log_ndtr(a)) - float(log_ndtr(b)))
        logarithm = float(log_ndtr(b)) + np.log(below + share * (1 - below))
        standard = np.asarray(ndtri_exp(np.minimum(logarithm, float(log_ndtr(b)))))
        value = self.mu + self.sigma * (-standard if self._reflected else standard)
        return np.clip(value, self.low, self.high)

    def cdf(self, x: float | FloatArray) -> FloatArray:
        from scipy.special import log_ndtr

        a, b = self._tail()
        standard = (np.clip(x, self.low, self.high) - self.mu) / self.sigma
        if self._reflected:
            standard = -standard
        below = math.exp(float(log_ndtr(a)) - float(log_ndtr(b)))
        share = (np.exp(log_ndtr(standard) - float(log_ndtr(b))) - below) / (1 - below)
        share = np.clip(share, 0.0, 1.0)
        return 1 - share if self._reflected else share
