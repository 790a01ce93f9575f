"""The field at one point."""

from __future__ import annotations

import math

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.geometry import Domain
from aleafield.spaces import PiecewiseLinear, Space

_AT_A_NODE = 1e-9
"""A point nearer to a node than this share of an element is the node."""


class PointEvaluation:
    """The linear functional u -> u(at), with the same bits for a row in every batch.

    Parameters
    ----------
    space : Space
    at : float
        Coordinate in the domain.
    """

    def __init__(self, space: Space, at: float) -> None:
        row = space.evaluation_matrix(np.array([at]))[0]
        self._places = np.flatnonzero(row)
        self._weights = row[self._places]

    def __call__(self, u: FloatArray) -> FloatArray:
        """Values (S,) of the states u (S, n)."""
        return np.asarray((np.take(u, self._places, axis=1) * self._weights).sum(axis=-1))


def refuse_outside(at: float, domain: Domain, key: str) -> None:
    """Raise InputError where a point does not lie in the domain."""
    if not (math.isfinite(at) and domain.low <= at <= domain.high):
        needed = f"a point of the domain, from {domain.low:g} to {domain.high:g}, is needed"
        raise InputError(key, f"{at:g}", needed)


def off_the_nodes(at: float, spaces: tuple[Space, ...]) -> bool:
    """Whether a piecewise-linear space among these does not have the point as a node.

    There the interpolation error jumps from mesh to mesh, and differences of two meshes tell little of it.
    """
    for space in spaces:
        if isinstance(space, PiecewiseLinear):
            nearest = space.domain.distance(space.nodes, np.array(at)).min()
            if nearest > _AT_A_NODE * space.element:
                return True
    return False
