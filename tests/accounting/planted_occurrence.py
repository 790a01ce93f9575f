"""A quantity that may not occur, with planted errors in its value and in its margin.

Q = x + y, it occurs where x >= START; x and y are independent standard normals.  At a mesh refined by n both
carry an error: the value `value_error` n^-2 (1 + x / 4), the margin `margin_error` n^-2.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.integrate import quad
from scipy.optimize import brentq
from scipy.stats import norm

from aleafield.accounting import LevelValues, Pair, PartDifferences
from aleafield.estimates import Sample

START = 0.3


@dataclass(frozen=True)
class PlantedOccurrence:
    """One part (space, order 2) with planted errors of value and margin."""

    value_error: float
    margin_error: float

    def margin(self, xy: NDArray[np.float64], n: float) -> NDArray[np.float64]:
        """Continuous quantity that is >= 0 where Q occurs, (S,)."""
        return np.asarray(xy[:, 0] - START + self.margin_error / n**2)

    def values(self, xy: NDArray[np.float64], n: float) -> NDArray[np.float64]:
        """Q at a refinement, NaN where it does not occur, (S,)."""
        value = xy.sum(axis=1) + self.value_error / n**2 * (1.0 + xy[:, 0] / 4.0)
        return np.where(self.margin(xy, n) >= 0.0, value, np.nan)

    def sample(self, xy: NDArray[np.float64], replicates: int = 1) -> Sample:
        """The run."""
        return Sample.of(
            self.values(xy, 1.0),
            margin=self.margin(xy, 1.0),
            replicate=np.arange(len(xy)) % replicates,
            replicates=replicates,
        )

    def part(self, xy: NDArray[np.float64], n_probes: int = 32) -> PartDifferences:
        """The space part on the first n_probes samples."""
        levels = {
            n: LevelValues.of(self.values(xy[:n_probes], n), self.margin(xy[:n_probes], n))
            for n in (0.5, 1.0, 2.0)
        }
        return PartDifferences(
            "space", np.arange(n_probes), Pair(levels[1.0], levels[2.0]), Pair(levels[0.5], levels[1.0])
        )


def above(level: float) -> float:
    """P(Q occurs and Q > level) in the limit, by quadrature over x."""
    return float(quad(lambda x: norm.pdf(x) * norm.sf(level - x), START, np.inf, epsabs=1e-12)[0])


def occurrence_truths(level: float) -> dict[str, float]:
    """Statistics of the limit; mean and variance of a truncated normal in closed form."""
    share = float(norm.sf(START))
    mills = float(norm.pdf(START)) / share
    return {
        "mean": mills,
        "sd": float(np.sqrt(2.0 + START * mills - mills**2)),
        "q50": float(brentq(lambda q: above(q) - share / 2, -5.0, 8.0)),
        "exceed": above(level),
        "occurs": share,
    }
