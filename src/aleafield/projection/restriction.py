"""From values at the test points to the unknowns: what the projector P_n does to a sampled function."""

from __future__ import annotations

from abc import ABC, abstractmethod

import numpy as np
from scipy.linalg.lapack import dpttrf, dpttrs

from aleafield.arrays import FloatArray, IntArray
from aleafield.errors import InputError
from aleafield.quadrature import Rule
from aleafield.spaces import PiecewiseLinear, Space


class Restriction(ABC):
    """Linear map from values (S, T) at the test points to unknowns (S, n), the same for all samples.

    Attributes
    ----------
    operations : float
        Floating-point operations for one sample.
    """

    operations: float

    @abstractmethod
    def apply(self, values: FloatArray) -> FloatArray:
        """Unknowns (S, n) of the projection of a function with these values (S, T).

        A row's bits do not depend on the other rows.
        """

    def fold(self, matrix: FloatArray) -> FloatArray:
        """The product of the projection and a matrix (.., T, Q), shape (.., n, Q)."""
        columns = np.ascontiguousarray(np.moveaxis(matrix, -1, -2))
        unknowns = self.apply(columns.reshape(-1, columns.shape[-1]))
        return np.moveaxis(unknowns.reshape(*columns.shape[:-1], -1), -1, -2)


class NodalRestriction(Restriction):
    """Collocation: the test points are the nodes and the values there are the unknowns."""

    operations = 0.0

    def apply(self, values: FloatArray) -> FloatArray:
        """The values themselves."""
        return values

    def fold(self, matrix: FloatArray) -> FloatArray:
        """The matrix itself."""
        return matrix


class ModalRestriction(Restriction):
    """Spectral Galerkin: inner products by the space's own rule, whose points are its nodes.

    Parameters
    ----------
    space : Space
        Its `coefficients` are the discrete projection.
    """

    def __init__(self, space: Space) -> None:
        self._space = space
        self.operations = 2.0 * space.n**2

    def apply(self, values: FloatArray) -> FloatArray:
        """Coefficients by the space's own rule."""
        return self._space.coefficients(values)


class MassRestriction(Restriction):
    """Piecewise-linear Galerkin: M^-1 Phi' W, the mass matrix M = Phi' W Phi by the same rule.

    Phi holds the hat functions at the points of the rule, W its weights.  M is tridiagonal (on a ring with
    two corners, solved with a rank-one change); with the trapezoid rule at the nodes it would be diagonal
    and the scheme that of collocation.

    Parameters
    ----------
    space : PiecewiseLinear
    rule : Rule
        Its points in the order of the mesh.

    Raises
    ------
    InputError
        Where the points are too few to tell the hat functions apart.

    References
    ----------
    Golub and Van Loan 2013, "Matrix Computations", sections 2.1.4 and 4.3.6: rank-one change, tridiagonal
    systems (from memory).
    """

    def __init__(self, space: PiecewiseLinear, rule: Rule) -> None:
        left, right, fraction = space.locate(rule.points)
        of_left, of_right = rule.weights * (1.0 - fraction), rule.weights * fraction
        n = space.n
        self._index, self._weight = _supports(left, right, of_left, of_right, n)
        diagonal = np.bincount(left, of_left * (1.0 - fraction), n) + np.bincount(
            right, of_right * fraction, n
        )
        beside = np.bincount(left, of_left * fraction, n)
        self._correction: FloatArray | None = None
        self._ends = np.zeros(2)
        if space.domain.periodic:
            corner, shift = float(beside[-1]), float(diagonal[0])
            self._ends = np.array([1.0, -corner / shift])
            diagonal[0] += shift
            diagonal[-1] += corner**2 / shift
        self._diagonal, self._beside, info = dpttrf(diagonal, beside[:-1])
        if info != 0 or self._diagonal.min() <= 1e-12 * self._diagonal.max():
            raise InputError(
                "scheme.quadrature_points",
                f"{len(rule.points)} points under {n} hat functions",
                "the mass matrix is singular: at least one point in every element is needed, and two in some",
            )
        if space.domain.periodic:
            column = np.zeros((1, n))
            column[0, [0, -1]] = -shift, corner
            solved = self._solve(column)[0]
            self._correction = solved / (1.0 + solved[0] * self._ends[0] + solved[-1] * self._ends[1])
        self.operations = (2.0 * len(self._index) + 5.0) * n

    def _solve(self, load: FloatArray) -> FloatArray:
        """Tridiagonal systems with the rows of load (S, n), which is overwritten."""
        solution, _ = dpttrs(self._diagonal, self._beside, load.T, overwrite_b=True)
        return np.asarray(solution.T)

    def apply(self, values: FloatArray) -> FloatArray:
        """Inner products with the hat functions, then the mass matrix."""
        load = np.take(values, self._index[0], axis=1)
        load *= self._weight[0]
        for index, weight in zip(self._index[1:], self._weight[1:], strict=True):
            term = np.take(values, index, axis=1)
            term *= weight
            load += term
        return self.of_load(load)

    def of_load(self, load: FloatArray) -> FloatArray:
        """Unknowns (S, n) from inner products with the hat functions (S, n), which are overwritten."""
        unknowns = self._solve(load)
        if self._correction is not None:
            ends = unknowns[:, :1] * self._ends[0] + unknowns[:, -1:] * self._ends[1]
            unknowns = unknowns - ends * self._correction
        return unknowns


def _supports(
    left: IntArray, right: IntArray, of_left: FloatArray, of_right: FloatArray, n: int
) -> tuple[IntArray, FloatArray]:
    """For every hat function the points in its support and their weights, both (K, n).

    Hat functions with fewer than K points are filled up with weight 0 at a point of their own.
    """
    points = np.arange(len(left))
    point = np.concatenate((points, points))
    hat = np.concatenate((left, right))
    weight = np.concatenate((of_left, of_right))
    counted = weight != 0.0
    point, hat, weight = point[counted], hat[counted], weight[counted]
    order = np.lexsort((point, hat))
    point, hat, weight = point[order], hat[order], weight[order]
    counts = np.bincount(hat, minlength=n)
    starts = np.cumsum(counts) - counts
    rank = np.arange(len(hat)) - starts[hat]
    most = int(counts.max())
    index = np.tile(point[np.minimum(starts, len(point) - 1)], (most, 1))
    weights = np.zeros((most, n))
    index[rank, hat] = point
    weights[rank, hat] = weight
    return index.astype(np.int64), weights
