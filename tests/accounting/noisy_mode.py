"""A noisy mode under Euler-Maruyama: its error and its limit in closed form (problem 5.1, mode by mode).

    du = (I - kap u) dt + sqrt(q) dB,    u(0) = 0,    read at t = 4,    I = 0.8,    q = 0.3.

Given kap, n steps of dt leave a normal law of mean I / kap (1 - m^n) and variance q dt (1 - m^2n) / (1 - m^2),
m = 1 - kap dt; the limit has mean I / kap (1 - exp(-kap t)) and variance q (1 - exp(-2 kap t)) / (2 kap).
Levels of different steps see the same path.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq
from scipy.stats import norm

from aleafield.accounting import Clusters, LevelValues, Pair, PartDifferences
from aleafield.estimates import Sample

INPUT, STRENGTH, DURATION, STEP = 0.8, 0.3, 4.0, 0.25
FINEST = STEP / 2.0
Array = NDArray[np.float64]


@dataclass(frozen=True)
class NoisyMode:
    """kap uniform on [slowest, fastest] (equal: no input), clusters by repeats, the first ones probes."""

    slowest: float
    fastest: float
    clusters: int
    repeats: int
    probes: int

    @property
    def cluster(self) -> NDArray[np.int64]:
        """Parameter sample of each realization."""
        return np.arange(self.clusters * self.repeats) // self.repeats

    @property
    def parameters(self) -> bool:
        """Whether kap is uncertain."""
        return self.fastest > self.slowest

    def draw(self, generator: np.random.Generator) -> tuple[Sample, PartDifferences, Clusters]:
        """The run with its time part."""
        rate = np.repeat(generator.uniform(self.slowest, self.fastest, self.clusters), self.repeats)
        steps = round(DURATION / FINEST)
        path = np.sqrt(STRENGTH * FINEST) * generator.normal(size=(steps, len(rate)))
        run = final(rate, path, 2)
        n = self.probes * self.repeats
        levels = [LevelValues.of(final(rate[:n], path[:, :n], joined)) for joined in (4, 2, 1)]
        part = PartDifferences(
            "time",
            np.arange(n),
            Pair(levels[1], levels[2]),
            Pair(levels[0], levels[1]),
            expected_order=1.0,
            noisy=True,
        )
        clustered = self.parameters and self.repeats > 1
        sample = Sample.of(
            run,
            replicate=self.cluster if clustered else None,
            replicates=self.clusters if clustered else 1,
            clustered=clustered,
        )
        return sample, part, Clusters(self.cluster, self.repeats, self.parameters)

    def conditional(self, step: float = 0.0) -> tuple[Array, Array, Array]:
        """Gauss nodes of kap: weights, means and variances, at a step or (0) in the limit."""
        nodes, weights = np.polynomial.legendre.leggauss(60)
        rate = 0.5 * (self.slowest + self.fastest) + 0.5 * (self.fastest - self.slowest) * nodes
        kept, squared = np.exp(-rate * DURATION), 2.0 * rate
        if step > 0.0:
            one = 1.0 - rate * step
            kept, squared = one ** round(DURATION / step), (1.0 - one**2) / step
        return 0.5 * weights, INPUT / rate * (1.0 - kept), STRENGTH * (1.0 - kept**2) / squared

    def truths(self, level: float, step: float = 0.0) -> dict[str, float]:
        """Statistics of the limit, or of a step."""
        weight, mean, variance = self.conditional(step)
        centre, noise = float(weight @ mean), float(weight @ variance)
        parameters = float(weight @ (mean - centre) ** 2)
        total = parameters + noise

        def below(at: float) -> float:
            return float(weight @ norm.cdf(at, mean, np.sqrt(variance)))

        return {
            "mean": centre,
            "sd": float(np.sqrt(total)),
            "q05": float(brentq(lambda at: below(at) - 0.05, -9.0, 9.0)),
            "q50": float(brentq(lambda at: below(at) - 0.5, -9.0, 9.0)),
            "q95": float(brentq(lambda at: below(at) - 0.95, -9.0, 9.0)),
            "exceed": 1.0 - below(level),
            "parameters": parameters,
            "noise": noise,
            "share": parameters / total,
            "total": total,
        }


def final(rate: Array, path: Array, joined: int) -> Array:
    """u at the end, in steps that join so many of the path's (steps, S); rate (S,)."""
    step = FINEST * joined
    u = np.zeros_like(rate)
    for increment in path.reshape(-1, joined, len(rate)).sum(axis=1):
        u = u + step * (INPUT - rate * u) + increment
    return u
