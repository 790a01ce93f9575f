"""Problem 5.7: a mode with a random decay rate and stationary noise, whose every truth is an integral.

    Q = I / kap + sqrt(q / (2 kap)) e,    kap ~ U(0.5, 1.5),    I = 0.8,    q = 0.3,

e of mean 0 and variance 1: standard normal (an Ornstein-Uhlenbeck amplitude in stationarity) or, for skew noise,
exponential less 1.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq
from scipy.stats import expon, norm, qmc

from aleafield.estimates import Sample

INPUT, STRENGTH, SLOWEST, FASTEST = 0.8, 0.3, 0.5, 1.5
LOGARITHM = float(np.log(FASTEST / SLOWEST) / (FASTEST - SLOWEST))
MEAN = INPUT * LOGARITHM
PARAMETERS = INPUT**2 * (1.0 / (SLOWEST * FASTEST) - LOGARITHM**2)
NOISE = 0.5 * STRENGTH * LOGARITHM
TOTAL = PARAMETERS + NOISE
PARTS = {"parameters": PARAMETERS, "noise": NOISE, "share": PARAMETERS / TOTAL, "total": TOTAL}
"""Truths of the parts of the variance."""
RATE, WEIGHT = np.polynomial.legendre.leggauss(400)
RATE, WEIGHT = 0.5 * (SLOWEST + FASTEST) + 0.5 * (FASTEST - SLOWEST) * RATE, 0.5 * WEIGHT
"""A Gauss rule over the decay rate; the distribution function of skew noise has a kink, so it is long."""
Distribution = Callable[[NDArray[np.float64]], NDArray[np.float64]]
NOISES: dict[str, tuple[Callable[[np.random.Generator, tuple[int, ...]], NDArray[np.float64]], Distribution]]
NOISES = {
    "normal": (lambda g, shape: g.normal(size=shape), norm.cdf),
    "skew": (lambda g, shape: g.exponential(size=shape) - 1.0, lambda e: expon.cdf(e + 1.0)),
}
"""By name: draws of e and its distribution function."""


def below(level: float, noise: str) -> float:
    """P(Q <= level), by a Gauss rule over the decay rate."""
    standardised = (level - INPUT / RATE) / np.sqrt(STRENGTH / (2.0 * RATE))
    return float(WEIGHT @ NOISES[noise][1](standardised))


def quantile(p: float, noise: str) -> float:
    """The level that Q exceeds with probability 1 - p."""
    return float(brentq(lambda level: below(level, noise) - p, -10.0, 20.0, xtol=1e-10))


RARE = quantile(0.99, "skew")
"""A level that skew noise exceeds once in a hundred times, normal noise less often."""


@dataclass(frozen=True)
class Design:
    """Clusters by repeats: plain, or in 16 scramblings of Sobol' points."""

    clusters: int
    repeats: int
    noise: str = "normal"
    scrambled: bool = False

    @property
    def cluster(self) -> NDArray[np.int64]:
        """Parameter sample of each realization."""
        return np.arange(self.clusters * self.repeats) // self.repeats

    def values(self, trials: int, seed: int) -> NDArray[np.float64]:
        """Q on (trials, realizations)."""
        generator = np.random.default_rng(seed)
        uniform = generator.random((trials, self.clusters))
        if self.scrambled:
            points = self.clusters // 16
            for trial in range(trials):
                columns = [qmc.Sobol(1, rng=generator).random(points)[:, 0] for _ in range(16)]
                uniform[trial] = np.column_stack(columns).ravel()
        rate = (SLOWEST + (FASTEST - SLOWEST) * uniform)[..., None]
        noise = NOISES[self.noise][0](generator, (trials, self.clusters, self.repeats))
        values = INPUT / rate + np.sqrt(STRENGTH / (2.0 * rate)) * noise
        return np.asarray(values.reshape(trials, -1))

    def sample(self, values: NDArray[np.float64], **other: NDArray[np.float64] | NDArray[np.bool_]) -> Sample:
        """The sample of a row of `values`; margin and valid may be given."""
        block = self.cluster % 16 if self.scrambled else self.cluster
        number = 16 if self.scrambled else self.clusters
        return Sample.of(values, replicate=block, replicates=number, clustered=not self.scrambled, **other)  # type: ignore[arg-type]

    def samples(self, trials: int, seed: int) -> list[Sample]:
        """One sample a trial."""
        return [self.sample(row) for row in self.values(trials, seed)]
