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


def point_evaluation(space: Space, at: float) -> FloatArray:
    """Weights (n,) of the functional u -> u(at) for elements of the space, at a coordinate of the domain."""
    return np.asarray(space.evaluation_matrix(np.array([at]))[0])


def value_at(at: float) -> str:
    """Name of the functional u -> u(at)."""
    return f"the value at {at!r}"


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
