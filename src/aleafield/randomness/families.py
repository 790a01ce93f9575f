"""Families of points: the main sample, and further runs that are no samples of it.

The points of a family follow from the index within the family, the seed and the inputs alone, as those of the main
sample do.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.randomness.points import Points

Family = Literal["main", "held out", "exchange", "screening"]
"""The main sample; points that no fit sees; points with inputs exchanged; trajectories of elementary effects."""


def exchange_runs(groups: int) -> int:
    """Runs of the exchange family for one row of the main sample, which has the row's first run itself."""
    return 2 * groups + 1


class ExchangePoints(Points):
    """Two points of the inputs, and what becomes of them when groups of inputs are exchanged.

    A row has two points from one point with twice as many coordinates: A its first half, which belongs to the main
    sample, and B its second. With k groups, index = row (2 k + 1) + b: b = 0 is B, b = 1 .. k is A with group b
    of B, b = k + 1 .. 2 k is B with group b - k of A (pick-freeze designs, Sobol' 1993, "Sensitivity estimates for
    nonlinear mathematical models"; from memory).

    Parameters
    ----------
    halves : Points
        With 2 d columns.
    groups : sequence of sequences of int
        Columns that are exchanged together.
    """

    def __init__(self, halves: Points, groups: Sequence[Sequence[int]]) -> None:
        self._halves = halves
        self._groups = groups

    def at(self, indices: IntArray) -> FloatArray:
        groups = len(self._groups)
        row, run = np.divmod(indices, exchange_runs(groups))
        halves = self._halves.at(row)
        d = halves.shape[1] // 2
        member = np.zeros((groups, d), dtype=bool)
        for number, columns in enumerate(self._groups):
            member[number, list(columns)] = True
        of_b = np.concatenate([np.ones((1, d), dtype=bool), member, ~member])[run]
        return np.where(of_b, halves[:, d:], halves[:, :d])
