"""Studies of fields in closed form, and what causes their spread, by quadrature of the closed form."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from itertools import combinations
from pathlib import Path
from typing import Any

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

from aleafield.runs.run import run
from aleafield.study.reading import read_text
from tests.examples.summary_shape import read_summary

Array = NDArray[np.float64]

PATHS = ("amplitude", "kernel.coefficients.1", "dynamics.time_constant")
LEVEL = 1.25
"""The peak lies above it in about 46 % of the draws."""

RING = """
title = "A linear ring with three uncertain numbers"
seed = {seed}
[parameters]
amplitude = "uniform(0.8, 1.2)"
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = [0.0, "uniform(0.1, 0.2)"]
[rate]
form = "linear"
[drive]
formula = "amplitude * cos(x)"
[dynamics]
time_constant = "uniform(8, 12)"
duration = 20.0
[scheme]
nodes = 8
time_step = 1.0
{quantities}
[sampling]
method = "{method}"
samples = {samples}
{more}
"""
"""tau du/dt = -u + a pi u_1 cos x + amplitude cos x from rest: u = cos(x) A(t), A as in `peak`."""
PEAK = '[[quantity]]\nname = "peak"\nmeasure = "maximum"\n'
ABOVE = f'[[quantity]]\nname = "above"\nmeasure = "formula"\nformula = "where(u > {LEVEL}, 1, 0)"\n'
ABOVE += 'in_space = "value"\nat = 0.0\n'


def ring(
    quantities: str = PEAK, samples: int = 256, method: str = "auto", more: str = "", seed: int = 5
) -> str:
    """Study text of the ring."""
    return RING.format(quantities=quantities, samples=samples, method=method, more=more, seed=seed)


def peak(amplitude: Array, coefficient: Array, time_constant: Array) -> Array:
    """A(20) in closed form."""
    decay = 1.0 - np.pi * coefficient
    return np.asarray(amplitude * -np.expm1(-decay * 20.0 / time_constant) / decay)


def summary_of(text: str, folder: Path) -> dict[str, Any]:
    """Run a study text into a folder and read its summary, whose shape is checked."""
    run(read_text(text), folder, workers=1)
    return read_summary((folder / "summary.json").read_text())


def holds(statement: Mapping[str, Any], truth: float) -> bool:
    """Whether the interval of a statement holds a number."""
    low, high = statement["interval"]
    return bool(low <= truth <= high)


@dataclass(frozen=True, eq=False)
class Spread:
    """Where the spread of a function of independent inputs comes from, by tensor Gauss quadrature.

    Attributes
    ----------
    values : float array, one axis for each input
        At Gauss points of probability, half of them below and half above the middle of each input.
    weight : float array (n,)
        Of the points of one axis; they sum to 1.
    """

    values: Array
    weight: Array

    @staticmethod
    def of_peak(points: int = 24) -> Spread:
        """The peak of the ring: smooth, so that a few points give all digits."""
        reference, weights = leggauss(points)
        half = 0.25 * (reference + 1.0)
        u = np.concatenate((half, half + 0.5))
        a, k, tau = np.meshgrid(0.8 + 0.4 * u, 0.1 + 0.1 * u, 8 + 4 * u, indexing="ij")
        return Spread(peak(a, k, tau), np.concatenate((weights, weights)) / 4)

    @staticmethod
    def of_above(points: int = 240) -> Spread:
        """Whether the peak lies above LEVEL, averaged over cells of the amplitude, in which it is closed.

        A midpoint rule in the two others.  On each line one cell is crossed by the jump and holds the share above it:
        a variance, 0.25 in all, loses at most 0.25 / points, and an index of a ratio of them at most 2 / points.
        """
        edges = np.linspace(0.8, 1.2, points + 1)
        u = (np.arange(points) + 0.5) / points
        k, tau = np.meshgrid(0.1 + 0.1 * u, 8 + 4 * u, indexing="ij")
        least = LEVEL / peak(np.ones_like(k), k, tau)
        width = edges[1] - edges[0]
        values = np.clip((edges[1:, None, None] - least) / width, 0.0, 1.0)
        return Spread(values, np.full(points, 1.0 / points))

    @property
    def inputs(self) -> range:
        return range(self.values.ndim)

    def averaged(self, over: tuple[int, ...], of: Array | None = None) -> Array:
        """The mean over some inputs, their axes of length 1."""
        found = self.values if of is None else of
        for axis in over:
            shape = [1] * self.values.ndim
            shape[axis] = -1
            found = (found * self.weight.reshape(shape)).sum(axis=axis, keepdims=True)
        return found

    @cached_property
    def mean(self) -> float:
        return float(self.averaged(tuple(self.inputs)).item())

    def explained(self, subset: tuple[int, ...]) -> float:
        """Variance of the mean given the inputs of a subset."""
        others = tuple(i for i in self.inputs if i not in subset)
        squares = (self.averaged(others) - self.mean) ** 2
        return float(self.averaged(subset, squares).item())

    @cached_property
    def variance(self) -> float:
        return self.explained(tuple(self.inputs))

    def first(self, i: int) -> float:
        return self.explained((i,)) / self.variance

    def total(self, i: int) -> float:
        return 1.0 - self.explained(tuple(j for j in self.inputs if j != i)) / self.variance

    def second(self, i: int, j: int) -> float:
        return self.explained((i, j)) / self.variance - self.first(i) - self.first(j)

    def shapley(self, i: int) -> float:
        """Mean gain over all orders in which inputs become known (Owen 2014, from memory)."""
        others, d = [j for j in self.inputs if j != i], self.values.ndim
        gains = [
            (self.explained((*known, i)) - self.explained(known)) / math.comb(d - 1, len(known))
            for size in range(d)
            for known in combinations(others, size)
        ]
        return math.fsum(gains) / d / self.variance

    def known(self, i: int) -> float:
        """Root of the expected variance once an input is known."""
        return math.sqrt(self.variance - self.explained((i,)))

    def halved(self, i: int) -> float:
        """Root of the expected variance once it is known in which half of its law an input lies."""
        others = tuple(j for j in self.inputs if j != i)
        line = self.averaged(others).ravel()
        n = len(line) // 2
        low, high = (float(2 * line[cut] @ self.weight[cut]) for cut in (slice(n), slice(n, None)))
        return math.sqrt(self.variance - (high - low) ** 2 / 4)
