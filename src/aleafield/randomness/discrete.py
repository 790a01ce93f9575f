"""The law of a few chosen values with weights."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.randomness.law import Law


@dataclass(frozen=True)
class Discrete(Law):
    """One of several values, with probabilities proportional to weights.

    Parameters
    ----------
    values : sequence of float
        In any order; a tuple once the law is built, like the weights.
    weights : sequence of float, as many
        None negative, one at least positive; they need not sum to 1.
    """

    name = "discrete"
    arguments = ("[values]", "[weights]")
    continuous = False
    values: Sequence[float]
    weights: Sequence[float]

    def _convert(self) -> None:
        for argument, given in (("values", self.values), ("weights", self.weights)):
            listed = isinstance(given, Sequence | np.ndarray) and not isinstance(given, str | bytes)
            if not listed or not len(given):
                raise self._fault(f"has {argument} = {given!r}", f"{argument} is a list of numbers")
            numbers = tuple(self._finite(f"{argument}[{i}]", value) for i, value in enumerate(given))
            object.__setattr__(self, argument, numbers)

    def _check(self) -> None:
        if len(self.values) != len(self.weights):
            raise self._fault(
                f"has {len(self.values)} values and {len(self.weights)} weights", "every value has one weight"
            )
        if min(self.weights) < 0:
            raise self._fault(f"has the weight {min(self.weights)!r}", "weights are not negative")
        if not 0 < math.fsum(self.weights) < math.inf:
            raise self._fault("has weights without a positive finite sum", "one weight at least is positive")

    @property
    def text(self) -> str:
        lists = (", ".join(repr(number) for number in numbers) for numbers in (self.values, self.weights))
        return f"{self.name}({', '.join(f'[{numbers}]' for numbers in lists)})"

    @cached_property
    def _steps(self) -> tuple[FloatArray, FloatArray]:
        """The possible values in order, and the distribution function at each."""
        values = np.array(self.values)
        weights = np.array(self.weights)
        possible = weights > 0
        values, place = np.unique(values[possible], return_inverse=True)
        shares: FloatArray = np.zeros(len(values))
        np.add.at(shares, place, weights[possible] / math.fsum(self.weights))
        reached = np.cumsum(shares)
        reached[-1] = 1.0
        return values, reached

    @property
    def mean(self) -> float:
        shares = np.array(self.weights) / math.fsum(self.weights)
        return math.fsum(shares * np.array(self.values))

    @property
    def sd(self) -> float:
        shares = np.array(self.weights) / math.fsum(self.weights)
        return math.sqrt(math.fsum(shares * (np.array(self.values) - self.mean) ** 2))

    @property
    def support(self) -> tuple[float, float]:
        values = self._steps[0]
        return float(values[0]), float(values[-1])

    def ppf(self, probability: FloatArray) -> FloatArray:
        values, reached = self._steps
        return values[np.searchsorted(reached, np.asarray(probability), side="left")]

    def cdf(self, x: float | FloatArray) -> FloatArray:
        values, reached = self._steps
        return np.concatenate(([0.0], reached))[np.searchsorted(values, np.asarray(x), side="right")]

    def probability_below(self, x: float) -> float:
        values, reached = self._steps
        return float(np.concatenate(([0.0], reached))[np.searchsorted(values, x, side="left")])
