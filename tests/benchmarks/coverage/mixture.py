"""Exact statistics of a noisy quantity: its law given the inputs, mixed over the inputs by quadrature."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from scipy import optimize, stats

from tests.benchmarks.coverage.truth import FloatArray, Law

PANELS = 24
"""Enough for 1e-4 of a standard deviation (against 64 panels, laws with the steepest ends)."""
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(6)


@dataclass(frozen=True)
class Certain:
    """A number in place of a law."""

    value: float

    @property
    def text(self) -> str:
        """As the study file writes it."""
        return repr(self.value)


Entry = Law | Certain


def grid(entries: Sequence[Entry]) -> tuple[list[FloatArray], FloatArray]:
    """Values of independent entries at the nodes of a product rule, each (K,), and the weights (K,), sum 1.

    Gauss-Legendre panels in the probability, finer towards both ends, where quantile functions are steep.
    """
    edges = 0.5 * (1 - np.cos(np.pi * np.arange(PANELS + 1) / PANELS))
    half = np.diff(edges)[:, None] / 2
    v, w = (edges[:-1, None] + half * (1 + _NODES)).ravel(), (half * _WEIGHTS).ravel()
    one = np.ones(1)
    values = [np.array([e.value]) if isinstance(e, Certain) else np.asarray(e.ppf(v)) for e in entries]
    weights = one
    for entry in entries:
        weights = np.multiply.outer(weights, one if isinstance(entry, Certain) else w)
    meshed = np.meshgrid(*values, indexing="ij")
    return [m.ravel() for m in meshed], np.asarray(weights.ravel())


def normal(mean: FloatArray, variance: FloatArray) -> Any:
    """A normal law for each node (scipy, frozen)."""
    return stats.norm(mean, np.sqrt(variance))


def chi_square(degrees: int) -> Callable[[FloatArray], Any]:
    """A function from the mean to the law of a multiple of a chi-square number (scipy, frozen)."""
    return lambda mean: stats.gamma(degrees / 2, scale=2 * mean / degrees)


@dataclass(frozen=True, eq=False)
class Mixture:
    """A law given the inputs, at nodes of a rule over the inputs.

    Attributes
    ----------
    law : frozen scipy law with K entries
    weights : float array (K,)
    inputs : bool
        Whether anything is uncertain besides the noise.
    """

    law: Any
    weights: FloatArray
    inputs: bool

    occurs = 1.0

    @cached_property
    def mean(self) -> float:
        """Mean."""
        return float(self.weights @ self.law.mean())

    @cached_property
    def _parts(self) -> tuple[float, float]:
        """Variance of the conditional mean, mean of the conditional variance."""
        between = float(self.weights @ (self.law.mean() - self.mean) ** 2)
        return between, float(self.weights @ self.law.var())

    @property
    def sd(self) -> float:
        """Standard deviation."""
        return float(np.sqrt(sum(self._parts)))

    @property
    def variance(self) -> Mapping[str, float]:
        """The members of the parted variance that are stated."""
        between, within = self._parts
        total = between + within
        if not self.inputs:
            return {"noise": within, "total": total}
        return {"parameters": between, "noise": within, "share": between / total, "total": total}

    def quantile(self, p: float) -> float:
        """Quantile: between the least and the largest of the conditional ones."""
        ends = self.law.ppf(p)
        low, high = float(ends.min()), float(ends.max())
        if high - low <= 1e-13 * (abs(low) + abs(high)):
            return low
        return float(
            optimize.brentq(lambda q: float(self.weights @ self.law.cdf(q)) - p, low, high, xtol=1e-14)
        )

    def exceed(self, level: float) -> float:
        """Probability of lying above the level."""
        return float(self.weights @ self.law.sf(level))
