"""From a sample's index to its inputs.

What a sample is depends on its index, the seed and the inputs alone: not on the other samples asked for,
their order, or what was asked before.
"""

from __future__ import annotations

import os.path
from collections.abc import Sequence
from typing import Literal, NamedTuple

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.errors import InputError
from aleafield.randomness.copula import KEY, Copula
from aleafield.randomness.families import ExchangePoints, Family
from aleafield.randomness.inputs import Dependence, Input
from aleafield.randomness.points import PlainPoints, Points, SobolPoints
from aleafield.randomness.sampled import Sampled
from aleafield.randomness.trajectories import TrajectoryPoints

Method = Literal["monte carlo", "quasi-monte carlo"]

TOGETHER = "dependence.sampled_together"
"""The entry that joins columns of one file."""


class Follower(NamedTuple):
    """A column whose row another input, the leader, chooses; the values are in the leader's order."""

    leader: int
    law: Sampled
    values: FloatArray


class Design:
    """The inputs of every parameter sample, and of the further runs of each family.

    Quasi-Monte Carlo: sample i is point i // 16 of scrambling i mod 16. Monte Carlo: independent points.
    Points have twice as many columns as there are inputs; the second half serves the family that exchanges
    inputs.

    Parameters
    ----------
    inputs : sequence of Input
        With different paths.
    dependence : Dependence
        Rank correlations, and whether columns of one file are drawn together: then one coordinate, that of
        the first of them, chooses the row.
    method : "monte carlo" or "quasi-monte carlo"
    seed : int
    groups : sequence of sequences of int, optional
        Columns that the exchange family exchanges together as one input, by default each alone. They need not be
        all columns.

    Attributes
    ----------
    inputs, dependence, method, seed, groups
        As given; groups as tuples.

    Raises
    ------
    InputError
        The dependence does not fit the inputs.
    """

    def __init__(
        self,
        inputs: Sequence[Input],
        dependence: Dependence,
        method: Method,
        seed: int,
        groups: Sequence[Sequence[int]] | None = None,
    ) -> None:
        self.inputs = tuple(inputs)
        d = len(self.inputs)
        self.groups = tuple((column,) for column in range(d)) if groups is None else tuple(map(tuple, groups))
        self.dependence = dependence
        self.method: Method = method
        self.seed = seed
        self._copula = Copula([entry.path for entry in self.inputs], dependence.rank_correlation)
        self._followers = _followers(self.inputs, dependence) if dependence.sampled_together else {}
        points = PlainPoints if method == "monte carlo" else SobolPoints
        self._points: Points = points(2 * d, seed)
        self._further: dict[Family, Points] = {
            "held out": PlainPoints(d, seed, "held out"),
            "exchange": ExchangePoints(self._points, self.groups),
            "screening": TrajectoryPoints(d, seed),
        }

    def unit_points(self, indices: IntArray) -> FloatArray:
        """Independent uniform points of the samples.

        Parameters
        ----------
        indices : int array, (S,)
            Any samples in any order; contiguous ranges are quick.

        Returns
        -------
        float array, (S, 2 d)
            Strictly between 0 and 1; d is the number of inputs.
        """
        return self._points.at(_checked(indices))

    def points(self, family: Family, indices: IntArray) -> FloatArray:
        """Points of the unit cube of the inputs of a family's runs.

        Parameters
        ----------
        family : Family
        indices : int array, (S,)
            Within the family, in any order.

        Returns
        -------
        float array, (S, d)
            Strictly between 0 and 1, one column for every input.
        """
        if family == "main":
            return self.unit_points(indices)[:, : len(self.inputs)]
        return self._further[family].at(_checked(indices))

    def values(self, indices: IntArray) -> dict[str, FloatArray]:
        """The inputs of the samples: path -> (S,), in the units of each input."""
        return self.values_at(self.points("main", indices))

    def values_at(self, points: FloatArray) -> dict[str, FloatArray]:
        """The inputs at points of the unit cube, through dependence and laws.

        Parameters
        ----------
        points : float array, (S, d)
            Strictly between 0 and 1, one column for every input.

        Returns
        -------
        dict of path to float array (S,)
        """
        dependent = np.asfortranarray(self._copula.correlate(points))
        values: dict[str, FloatArray] = {}
        for column, entry in enumerate(self.inputs):
            follower = self._followers.get(column)
            if follower is None:
                values[entry.path] = entry.law.ppf(dependent[:, column])
            else:
                values[entry.path] = follower.values[follower.law.rank(dependent[:, follower.leader])]
        return values


def _checked(indices: IntArray) -> IntArray:
    wanted = np.asarray(indices, dtype=np.int64)
    if wanted.ndim != 1 or (wanted < 0).any():
        raise ValueError("indices of samples are a list of integers that are not negative")
    return wanted


def _followers(inputs: Sequence[Input], dependence: Dependence) -> dict[int, Follower]:
    """The columns of files of which an earlier input is a column too, by their position among the inputs."""
    correlated = {path for pair in dependence.rank_correlation for path in pair[:2]}
    leaders: dict[str, tuple[int, Sampled]] = {}
    followers: dict[int, Follower] = {}
    for position, entry in enumerate(inputs):
        if not isinstance(entry.law, Sampled):
            continue
        leader, law = leaders.setdefault(os.path.normpath(entry.law.path), (position, entry.law))
        if leader == position:
            continue
        first = inputs[leader].path
        if len(law.values) != len(entry.law.values):
            raise InputError(
                TOGETHER,
                f"{first} has {len(law.values)} rows and {entry.path} {len(entry.law.values)}",
                "columns that are drawn together have equally many rows",
            )
        if entry.path in correlated:
            raise InputError(
                KEY,
                f"{entry.path!r} follows the rows that {first!r} chooses",
                f"correlate with {first!r} instead",
            )
        order = np.argsort(np.array(law.values), kind="stable")
        followers[position] = Follower(leader, law, np.array(entry.law.values)[order])
    if not followers:
        raise InputError(
            TOGETHER,
            "true, but no two inputs are columns of one file",
            "leave it out, or write two inputs as columns of one file",
        )
    return followers
