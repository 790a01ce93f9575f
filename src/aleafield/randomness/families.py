"""Families of points: the main sample, and further runs that are no samples of it.

The points of a family follow from the index within the family, the seed and the inputs alone, as those of the main
sample do.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.randomness.points import PlainPoints, Points

Family = Literal["main", "held out", "exchange", "screening"]
"""The main sample; points that no fit sees; points with inputs exchanged; trajectories of elementary effects."""

LOWER_LEVELS = (1 / 12, 3 / 12)
STEP = 2 / 3
"""Of screening, in probability: the four levels 1/12, 3/12, 9/12 and 11/12, and the distance of two of a pair."""


def exchange_runs(groups: int) -> int:
    """Runs of the exchange family for one row of the main sample, which has the row's first run itself."""
    return 2 * groups + 1


def screening_runs(inputs: int) -> int:
    """Runs of one trajectory: its start, and one for each input."""
    return inputs + 1


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


class TrajectoryPoints(Points):
    """Trajectories on which one coordinate changes at a time, each coordinate once, by 2/3.

    Morris 1991, "Factorial sampling plans for preliminary computational experiments" (from memory), with four
    levels and the step 2/3. His levels 0, 1/3, 2/3, 1 hold the ends of the cube, where a law may have no value;
    these lie inside, and with the same step. Index = trajectory (d + 1) + step. Level, direction and place in the
    order are drawn for each coordinate of each trajectory.

    Parameters
    ----------
    columns : int
        d.
    seed : int
    """

    def __init__(self, columns: int, seed: int) -> None:
        self._columns = columns
        self._draws = PlainPoints(3 * columns, seed, "screening")

    def at(self, indices: IntArray) -> FloatArray:
        trajectory, step = np.divmod(indices, screening_runs(self._columns))
        draws = self._draws.at(trajectory).reshape(len(indices), 3, self._columns)
        low = np.where(draws[:, 0] < 0.5, *LOWER_LEVELS)
        place = draws[:, 2].argsort(axis=1).argsort(axis=1)
        moved = place < step[:, None]
        downwards = draws[:, 1] < 0.5
        return np.asarray(low + STEP * (moved ^ downwards))
