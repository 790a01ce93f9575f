"""Synthetic fields whose discretisation error is planted: every order, size and truth is chosen here.

A quantity at level (n, q, dt) is

    Q = Q* + space(z) n^-p_s + quadrature(z) q^-p_q + time(z) dt^p_t,    Q* = mu + sigma z,

z standard normal, each coefficient a quadratic in z; a second term one order higher (by default a tenth of
the first at the run's level) makes the observed orders differ a little from the expected ones.  All truths
are those of N(mu, sigma^2).
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from scipy.stats import norm

from aleafield.accounting import LevelValues, Pair, PartDifferences
from aleafield.estimates import Sample

Level = tuple[float, float, float]
"""Refinement of unknowns, of quadrature points and of steps, relative to the run: (1, 1, 1) is the run."""

RUN: Level = (1.0, 1.0, 1.0)
PAIRS: dict[str, tuple[tuple[Level, Level], tuple[Level, Level]]] = {
    "quadrature": (((1, 1, 1), (1, 2, 1)), ((0.5, 0.5, 1), (0.5, 1, 1))),
    "space": (((1, 2, 1), (2, 2, 1)), ((0.5, 1, 1), (1, 1, 1))),
    "time": (((1, 1, 1), (1, 1, 2)), ((1, 1, 0.5), (1, 1, 1))),
    "mesh": (((1, 1, 1), (2, 2, 1)), ((0.5, 0.5, 1), (1, 1, 1))),
}
"""The finer and the coarser pair of each part."""
DIRECTION = {"space": 0, "quadrature": 1, "time": 2}


@dataclass(frozen=True)
class PlantedField:
    """A quantity with planted errors.

    `errors` maps a part to (order, coefficients of 1, z, z^2 at the run's level).
    """

    mean: float
    sd: float
    errors: dict[str, tuple[float, NDArray[np.float64]]] = field(default_factory=dict)
    higher: float = 0.1

    def error(self, part: str, z: NDArray[np.float64], refinement: float) -> NDArray[np.float64]:
        """Error of one part at a refinement (1: the run)."""
        order, coefficients = self.errors[part]
        leading = np.polynomial.polynomial.polyval(z, coefficients)
        return np.asarray(leading * (refinement**-order + self.higher * refinement ** -(order + 1.0)))

    def values(self, z: NDArray[np.float64], level: Level = RUN) -> NDArray[np.float64]:
        """The quantity on samples z (S,) at a level."""
        total = self.mean + self.sd * z
        for part in self.errors:
            total = total + self.error(part, z, level[DIRECTION[part]])
        return total

    def sample(self, z: NDArray[np.float64], replicates: int = 1) -> Sample:
        """The run; realization i belongs to scrambling i % replicates."""
        return Sample.of(self.values(z), replicate=np.arange(len(z)) % replicates, replicates=replicates)

    def part(self, name: str, z: NDArray[np.float64], n_probes: int = 32, **other: object) -> PartDifferences:
        """One part on the first n_probes samples, the planted order expected."""
        pairs = [
            Pair(*(LevelValues.of(self.values(z[:n_probes], level)) for level in pair))
            for pair in PAIRS[name]
        ]
        order = self.errors[name][0] if name in self.errors else 2.0
        settings = {"expected_order": order, **other}
        return PartDifferences(name, np.arange(n_probes), pairs[0], pairs[1], **settings)  # type: ignore[arg-type]

    def parts(self, z: NDArray[np.float64], n_probes: int = 32) -> list[PartDifferences]:
        """All planted parts."""
        return [self.part(name, z, n_probes) for name in self.errors]


def random_field(generator: np.random.Generator, relative_bias: float) -> PlantedField:
    """A random field: three parts, biases of random signs around `relative_bias` standard deviations."""
    errors = {}
    for name, order in (("space", 2.0), ("quadrature", generator.choice([2.0, 4.0])), ("time", 4.0)):
        size = relative_bias * np.exp(generator.normal(0.0, 0.5)) * generator.choice([-1.0, 1.0])
        coefficients = size * np.array([1.0, generator.uniform(-0.5, 0.5), generator.uniform(-0.2, 0.2)])
        errors[name] = (float(order), coefficients)
    return PlantedField(float(generator.normal()), 1.0, errors, higher=float(generator.uniform(-0.1, 0.1)))


def truths(planted: PlantedField, level: float) -> dict[str, float]:
    """Exact statistics of the limit N(mean, sd^2)."""
    return {
        "mean": planted.mean,
        "sd": planted.sd,
        "q05": float(norm.ppf(0.05, planted.mean, planted.sd)),
        "q50": planted.mean,
        "q95": float(norm.ppf(0.95, planted.mean, planted.sd)),
        "exceed": float(norm.sf(level, planted.mean, planted.sd)),
    }
