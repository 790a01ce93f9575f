"""Pseudo-spectral projection for few inputs: Gauss nodes on tensor and sparse grids, coefficients by sums.

On a sparse grid (Smolyak 1963) each tensor grid of the combination gives its own coefficients, of the degrees
that it resolves, and these are combined (Constantine, Eldred and Phipps 2012; both from memory): summing all
values with the combined weights instead would mistake high degrees for low ones.  The nodes are those of the
germs, so that the grid belongs to the inputs' own laws; chaospy finds them from the recurrences.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import reduce
from math import comb
from typing import Literal, NamedTuple

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.chaos.basis import Basis
from aleafield.chaos.expansion import Expansion
from aleafield.chaos.germs import Germ, Groups, choose_germs
from aleafield.errors import InputError
from aleafield.randomness.laws import Law

KEY = "sampling.method"
MOST_INPUTS: dict[str, int] = {"tensor": 3, "sparse": 4}
"""Above these the weights of sparse grids amplify the solver's tolerance and regression needs fewer runs."""

GridName = Literal["tensor", "sparse"]


class _Tensor(NamedTuple):
    """One tensor grid of a combination: its factor, nodes in each input, rows of its points, their weights."""

    factor: int
    counts: tuple[int, ...]
    rows: IntArray
    weights: FloatArray


@dataclass(frozen=True, eq=False)
class Grid:
    """Points at which a solver is run for a projection.

    Attributes
    ----------
    germs : tuple of Germ
    points : float array (M, d)
        In the unit cube, before any copula.
    tensors : tuple
        The tensor grids that the points are made of.
    groups : columns that depend on one another
    """

    germs: tuple[Germ, ...]
    points: FloatArray
    tensors: tuple[_Tensor, ...]
    groups: Groups = ()

    @property
    def weights(self) -> FloatArray:
        """Weights of the quadrature rule that the grid is, (M,); they sum to 1 and may be negative."""
        total = np.zeros(len(self.points))
        for tensor in self.tensors:
            np.add.at(total, tensor.rows, tensor.factor * tensor.weights)
        return total


def nodes(laws: Sequence[Law], level: int, grid: GridName = "tensor", groups: Groups = ()) -> Grid:
    """The grid of a level: level + 1 Gauss nodes in each input, or the sparse combination up to these.

    Parameters
    ----------
    laws : of at most 3 (tensor) or 4 (sparse) inputs, all with a density
    level : 0 and up
    grid : "tensor" or "sparse"
    groups : columns that depend on one another

    Raises
    ------
    InputError
        Too many inputs, or a law without a density: between its values no run is possible.
    """
    if len(laws) > MOST_INPUTS[grid]:
        raise InputError(
            KEY,
            f"a {grid} grid in {len(laws)} inputs",
            f"projection is for at most {MOST_INPUTS[grid]}; chaos by regression takes any number",
        )
    for law in laws:
        if not law.continuous:
            raise InputError(
                KEY,
                f"projection with {law.text}",
                "its nodes lie between the possible values; chaos by regression takes such laws",
            )
    germs = choose_germs(laws, groups)
    if grid == "tensor":
        combination = [(1, (level + 1,) * len(laws))]
    else:
        combination = _combination(len(laws), level)
    points: dict[bytes, int] = {}
    places: list[FloatArray] = []
    tensors = []
    for factor, counts in combination:
        rules = [_gauss(germ, count) for germ, count in zip(germs, counts, strict=True)]
        mesh = np.stack(np.meshgrid(*(t for t, _ in rules), indexing="ij"), axis=-1).reshape(-1, len(laws))
        weights = reduce(np.multiply.outer, (w for _, w in rules)).ravel()
        rows = []
        for point in mesh:
            name = (np.round(point, 12) + 0.0).tobytes()
            if name not in points:
                points[name] = len(places)
                places.append(point)
            rows.append(points[name])
        tensors.append(_Tensor(factor, counts, np.array(rows), weights))
    variables = np.array(places)
    unit = np.column_stack([germ.coordinate(variables[:, i]) for i, germ in enumerate(germs)])
    return Grid(germs, unit, tuple(tensors), groups)


def project(grid: Grid, values: FloatArray) -> Expansion:
    """The expansion from values (M, o) at the points of a grid.

    Its `loo` is the share of the variance that terms of the highest degree hold: what would have been missed
    with one degree less.

    Raises
    ------
    ValueError
        A value is not finite: one failed run spoils a grid.
    """
    if not np.isfinite(values).all():
        raise ValueError("a run at a node of the grid gave no value")
    centre = values.mean(axis=0)
    parts: dict[tuple[int, ...], FloatArray] = {}
    for tensor in grid.tensors:
        shape = tuple(tensor.counts)
        indices = np.stack(np.meshgrid(*(np.arange(n) for n in shape), indexing="ij"), axis=-1).reshape(
            -1, len(shape)
        )
        basis = Basis(grid.germs, indices).evaluate(grid.points[tensor.rows])
        coefficients = basis.T @ (tensor.weights[:, None] * (values[tensor.rows] - centre))
        for index, coefficient in zip(map(tuple, indices.tolist()), coefficients, strict=True):
            parts[index] = parts.get(index, 0.0) + tensor.factor * coefficient
    ordered = sorted(parts, key=lambda index: (sum(index), tuple(-degree for degree in index)))
    coefficients = np.array([parts[index] for index in ordered])
    indices = np.array(ordered, dtype=np.int64)
    squares = coefficients**2
    squares[0] = 0.0
    variance = squares.sum(axis=0)
    outer = indices.max(axis=1) == indices.max()
    if len(grid.tensors) > 1:
        outer = indices.sum(axis=1) == indices.sum(axis=1).max()
    coefficients[0] += centre
    last = squares[outer].sum(axis=0) / np.where(variance > 0, variance, 1.0)
    return Expansion(
        Basis(grid.germs, indices), coefficients, last, 1.0, len(grid.points), groups=grid.groups
    )


def _combination(d: int, level: int) -> list[tuple[int, tuple[int, ...]]]:
    """Factors and node counts of the tensor grids of a sparse grid whose rules grow by one node a level."""
    found = []
    for levels in np.ndindex(*(level + 1,) * d):
        short = level - sum(levels)
        if 0 <= short <= d - 1:
            found.append(((-1) ** short * comb(d - 1, short), tuple(n + 1 for n in levels)))
    return found


def _gauss(germ: Germ, count: int) -> tuple[FloatArray, FloatArray]:
    """Gauss nodes in the germ's variable and weights that sum to 1, from its recurrence."""
    import chaospy

    recurrence = np.array([germ.alpha[:count], germ.beta[:count]])
    (places,), (weights,) = chaospy.coefficients_to_quadrature([recurrence])
    return np.asarray(places, dtype=np.float64), np.asarray(weights, dtype=np.float64)
