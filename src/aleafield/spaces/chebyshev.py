"""Polynomials by their values at Chebyshev extremal points."""

from __future__ import annotations

from functools import cached_property

import numpy as np
from scipy.fft import dct

from aleafield.arrays import FloatArray
from aleafield.geometry import Domain, Interval, Refinement
from aleafield.quadrature import Rule, clenshaw_curtis, extremal_points, gauss_legendre
from aleafield.spaces.prolongation import Prolongation
from aleafield.spaces.space import agree, apply_each
from aleafield.spaces.spectral import SpectralSpace

_TRANSFORM_PAYS = 2**19
"""n P above which two cosine transforms cost less than a matrix product, from our own trials."""

_HIT = 1e-200
"""Share of the length below which a point is a node: 1 / way would overflow near a node at 0."""


class CosineProlongation(Prolongation):
    """From n extremal points to more of them: cosine transform, zeros appended, transform back."""

    name = "cosine transform"

    def __init__(self, n: int, n_points: int) -> None:
        self._n, self._n_points = n, n_points

    def apply(self, u: FloatArray) -> FloatArray:
        """Values at the finer extremal points."""
        padded = np.zeros((u.shape[0], self._n_points))
        padded[:, : self._n] = dct(u, type=1, axis=-1)
        padded[:, self._n - 1] *= 0.5
        padded *= 0.5 / (self._n - 1)
        return np.asarray(dct(padded, type=1, axis=-1))


class Chebyshev(SpectralSpace):
    """Polynomials of degree n - 1; the unknowns are the values at the n extremal points, ascending.

    Interpolation converges faster than any power for analytic functions and like n^-k in the sup norm for
    functions whose k-th derivative has bounded variation.

    Parameters
    ----------
    domain : Interval
    n : int, at least 2

    Raises
    ------
    InputError
        For fewer than two points.

    References
    ----------
    Berrut and Trefethen 2004, "Barycentric Lagrange interpolation", SIAM Review 46: evaluation and
    differentiation matrix; Trefethen 2013, "Approximation theory and approximation practice": rates (both
    from memory).
    """

    projector = "chebyshev"
    domains = (Interval,)

    def __init__(self, domain: Interval, n: int) -> None:
        super().__init__(domain, n)
        rule = clenshaw_curtis(domain, n)
        self._interval = domain
        self.nodes = rule.points
        self.integral_weights = rule.weights
        self._barycentric = np.where(np.arange(n) % 2 == 0, 1.0, -1.0)
        self._barycentric[[0, -1]] *= 0.5

    @classmethod
    def refinement(cls, domain: Domain) -> Refinement:
        """n -> 2n - 1 points, and back to (n + 1)/2."""
        return Refinement(both_ends=True, smallest=2, key="scheme.nodes")

    @cached_property
    def _gauss(self) -> Rule:
        """n Gauss points: exact for the product of two elements."""
        return gauss_legendre(self._interval, self.n)

    def _cardinal(self, x: FloatArray) -> FloatArray:
        """Lagrange polynomials of the nodes at x (...,); shape (..., n)."""
        way = x[..., None] - self.nodes
        hit = np.abs(way) <= _HIT * self._interval.length
        quotient = self._barycentric / np.where(hit, 1.0, way)
        values = quotient / quotient.sum(axis=-1, keepdims=True)
        return np.asarray(np.where(hit.any(axis=-1, keepdims=True), hit.astype(np.float64), values))

    def _differentiation(self, order: int) -> FloatArray:
        """Matrix (n, n) from nodal values to those of the derivative of that order."""
        return np.asarray(np.linalg.matrix_power(self._first_derivative, order))

    @cached_property
    def _first_derivative(self) -> FloatArray:
        way = self.nodes[:, None] - self.nodes[None, :]
        np.fill_diagonal(way, 1.0)
        matrix = (self._barycentric[None, :] / self._barycentric[:, None]) / way
        np.fill_diagonal(matrix, 0.0)
        np.fill_diagonal(matrix, -matrix.sum(axis=1))
        return matrix

    def evaluation_matrix(self, x: FloatArray) -> FloatArray:
        """Lagrange polynomials at x (P,) by the barycentric formula; shape (P, n)."""
        return self._cardinal(x)

    def derivative_matrix(self, x: FloatArray, order: int = 1) -> FloatArray:
        """Derivatives of the Lagrange polynomials at x (P,); shape (P, n)."""
        return self._cardinal(x) @ self._differentiation(order)

    def _profiles(self, x: FloatArray) -> FloatArray:
        """Lagrange polynomials of the nodes, by the barycentric formula."""
        return self._cardinal(x)

    def _amplitudes(self, u: FloatArray, order: int) -> FloatArray:
        """The derivative's nodal values."""
        return u if order == 0 else apply_each(self._differentiation(order), u)

    def square_integral(self, u: FloatArray) -> FloatArray:
        """By n Gauss points, exact for the square, whose degree is 2n - 2; shape (S,)."""
        values = self.evaluate(u, self._gauss.points)
        return np.asarray((values * values * self._gauss.weights).sum(axis=-1))

    @cached_property
    def search_grid(self) -> FloatArray:
        """4n - 3 extremal points: they hold the nodes and crowd at the ends, as zeros of polynomials do."""
        return extremal_points(self._interval, 4 * self.n - 3)

    def _prolongation_to(self, points: FloatArray) -> Prolongation:
        n_points = len(points)
        transform_pays = n_points > self.n and self.n * n_points >= _TRANSFORM_PAYS
        if transform_pays and agree(points, extremal_points(self._interval, n_points), self._interval.length):
            return CosineProlongation(self.n, n_points)
        return super()._prolongation_to(points)
