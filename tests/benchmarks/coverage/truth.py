"""What is known of a quantity, and its exact statistics where it is a monotone function of one input."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray
from scipy import optimize, stats

FloatArray = NDArray[np.float64]
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(20)


class Known(Protocol):
    """A quantity whose statistics are known."""

    @property
    def mean(self) -> float:
        """Mean given that it occurs."""

    @property
    def sd(self) -> float:
        """Standard deviation given that it occurs."""

    @property
    def occurs(self) -> float:
        """Probability of occurrence."""

    @property
    def variance(self) -> Mapping[str, float]:
        """Members of the variance, parted into parameters and noise; empty without noise."""

    def quantile(self, p: float) -> float:
        """Quantile given that it occurs."""

    def exceed(self, level: float) -> float:
        """Probability that it occurs and lies above the level."""


@dataclass(frozen=True)
class Law:
    """A law as the study file writes it, with its quantile function taken from scipy directly."""

    text: str
    ppf: Callable[[FloatArray], FloatArray]


def random_law(rng: np.random.Generator, low: float, high: float) -> Law:
    """A law on [low, high]: uniform, triangular, truncated normal or beta."""
    kind = rng.integers(4)
    span = high - low
    if kind == 0:
        return Law(f"uniform({low!r}, {high!r})", stats.uniform(low, span).ppf)
    if kind == 1:
        mode = low + span * float(rng.uniform(0.2, 0.8))
        return Law(
            f"triangular({low!r}, {mode!r}, {high!r})", stats.triang((mode - low) / span, low, span).ppf
        )
    if kind == 2:
        mean, sd = low + 0.5 * span, span * float(rng.uniform(0.2, 0.6))
        a, b = (low - mean) / sd, (high - mean) / sd
        return Law(
            f"truncated_normal({mean!r}, {sd!r}, {low!r}, {high!r})", stats.truncnorm(a, b, mean, sd).ppf
        )
    p, q = float(rng.uniform(1.5, 4)), float(rng.uniform(1.5, 4))
    return Law(f"beta({p!r}, {q!r}, {low!r}, {high!r})", stats.beta(p, q, low, span).ppf)


@dataclass(frozen=True)
class Truth:
    """Exact statistics of Q = value(ppf(v)), v uniform on (0, 1).

    The quantity occurs for v in (first, last); within, it increases or decreases with v.
    """

    value: Callable[[FloatArray], FloatArray]
    ppf: Callable[[FloatArray], FloatArray]
    increasing: bool
    first: float = 0.0
    last: float = 1.0

    def at(self, v: FloatArray | float) -> FloatArray:
        """Q at probabilities v of the input."""
        return np.asarray(self.value(np.asarray(self.ppf(np.asarray(v, dtype=np.float64)))))

    @property
    def occurs(self) -> float:
        """Probability of occurrence."""
        return self.last - self.first

    @property
    def variance(self) -> Mapping[str, float]:
        """Nothing is parted without noise."""
        return {}

    def moment(self, function: Callable[[FloatArray], FloatArray]) -> float:
        """Mean of function(Q) given that Q occurs, by panels refined towards both ends."""
        edges = 0.5 * (1 - np.cos(np.pi * np.arange(129) / 128))
        edges = self.first + self.occurs * edges
        half = np.diff(edges) / 2
        v = (edges[:-1] + half)[:, None] + half[:, None] * _NODES
        return float((function(self.at(v)) * half[:, None] * _WEIGHTS).sum() / self.occurs)

    @property
    def mean(self) -> float:
        """Mean given that it occurs."""
        return self.moment(lambda q: q)

    @property
    def sd(self) -> float:
        """Standard deviation given that it occurs."""
        mean = self.mean
        return float(np.sqrt(self.moment(lambda q: (q - mean) ** 2)))

    def quantile(self, p: float) -> float:
        """Quantile given that it occurs."""
        share = p if self.increasing else 1 - p
        return float(self.at(self.first + self.occurs * share))

    def exceed(self, level: float) -> float:
        """Probability that it occurs and lies above the level."""
        low, high = self.first + 1e-13, self.last - 1e-13
        ends = float(self.at(low)) - level, float(self.at(high)) - level
        if min(ends) >= 0:
            return self.occurs
        if max(ends) <= 0:
            return 0.0
        root = optimize.brentq(lambda v: float(self.at(v)) - level, low, high, xtol=1e-14)
        return self.last - root if self.increasing else root - self.first
