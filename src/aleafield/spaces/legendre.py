"""Polynomials by their coefficients in Legendre polynomials."""

from __future__ import annotations

import numpy as np
from numpy.polynomial.legendre import legder, legvander

from aleafield.arrays import FloatArray, batch_product
from aleafield.geometry import Domain, Interval, Refinement
from aleafield.quadrature import extremal_points, gauss_legendre
from aleafield.spaces.prolongation import DenseProlongation, Prolongation
from aleafield.spaces.space import Space, apply_each


class Legendre(Space):
    """Polynomials of degree n - 1 in the Legendre basis that is orthonormal in L2 of the interval.

    The unknowns are the coefficients in phi_k(x) = sqrt((2k + 1) / length) P_k((2x - low - high) / length),
    k = 0 .. n - 1, in units of the element times sqrt(length); the mass matrix is the identity.  The nodes
    are the n Gauss points, and `coefficients` and `nodal` pass between values there and coefficients.

    The orthogonal projection converges faster than any power for analytic functions.

    Parameters
    ----------
    domain : Interval
    n : int, at least 1

    Raises
    ------
    InputError
        For n < 1.
    """

    projector = "legendre"
    domains = (Interval,)

    def __init__(self, domain: Interval, n: int) -> None:
        super().__init__(domain, n)
        rule = gauss_legendre(domain, n)
        self._interval = domain
        self._scale = np.sqrt((2.0 * np.arange(n) + 1.0) / domain.length)
        self._derivatives: dict[int, FloatArray] = {}
        self.nodes = rule.points
        self.integral_weights = np.zeros(n)
        self.integral_weights[0] = np.sqrt(domain.length)
        at_nodes = self._basis(rule.points)
        self._to_nodal = np.ascontiguousarray(at_nodes.T)
        self._to_coefficients = at_nodes * rule.weights[:, None]

    @classmethod
    def refinement(cls, domain: Domain) -> Refinement:
        """n -> 2n, degree n - 1 -> 2n - 1."""
        return Refinement(both_ends=False, smallest=1, key="scheme.nodes")

    def _basis(self, x: FloatArray, order: int = 0) -> FloatArray:
        """The basis functions, or their derivative of that order, at x (...,); shape (..., n)."""
        reference = (2.0 * x - (self._interval.low + self._interval.high)) / self._interval.length
        if order == 0:
            return np.asarray(np.ascontiguousarray(legvander(reference, self.n - 1)) * self._scale)
        if order >= self.n:
            return np.zeros((*x.shape, self.n)) * x[..., None]
        derivative = self._derivatives.get(order)
        if derivative is None:
            scale = (2.0 / self._interval.length) ** order * self._scale
            derivative = self._derivatives[order] = legder(np.eye(self.n), order) * scale
        return np.asarray(np.ascontiguousarray(legvander(reference, self.n - 1 - order)) @ derivative)

    def evaluation_matrix(self, x: FloatArray) -> FloatArray:
        """Orthonormal Legendre polynomials at x (P,); shape (P, n)."""
        return self._basis(x)

    def derivative_matrix(self, x: FloatArray, order: int = 1) -> FloatArray:
        """Derivatives of the orthonormal Legendre polynomials at x (P,); shape (P, n)."""
        return self._basis(x, order)

    def evaluate_each(self, u: FloatArray, x: FloatArray) -> FloatArray:
        """Values of u (S, n) at x (S, P); shape (S, P)."""
        return apply_each(self._basis(x), u)

    def differentiate_each(self, u: FloatArray, x: FloatArray, order: int = 1) -> FloatArray:
        """Derivatives of u (S, n) at x (S, P); shape (S, P)."""
        return apply_each(self._basis(x, order), u)

    def coefficients(self, nodal: FloatArray) -> FloatArray:
        """Coefficients (S, n) of the polynomials with values nodal (S, n) at the Gauss points.

        For values of a function that is no element this is its projection with inner products by the n-point
        Gauss rule.
        """
        return batch_product(nodal, self._to_coefficients)

    def nodal(self, u: FloatArray) -> FloatArray:
        """Values (S, n) at the Gauss points."""
        return batch_product(u, self._to_nodal)

    def square_integral(self, u: FloatArray) -> FloatArray:
        """Sum of the squared coefficients (Parseval); shape (S,)."""
        return np.asarray((u * u).sum(axis=-1))

    @property
    def search_grid(self) -> FloatArray:
        """4n + 1 extremal points, which crowd at the ends as the zeros of polynomials do."""
        return extremal_points(self._interval, 4 * self.n + 1)

    def _prolongation_to(self, points: FloatArray) -> Prolongation:
        return DenseProlongation(self._basis(points))
