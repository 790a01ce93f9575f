"""Polynomials by their coefficients in Legendre polynomials."""

from __future__ import annotations

from functools import cached_property

import numpy as np
from numpy.polynomial.legendre import legder, legvander

from aleafield.arrays import FloatArray, batch_product
from aleafield.geometry import Domain, Interval, Refinement
from aleafield.quadrature import extremal_points, gauss_legendre
from aleafield.spaces.prolongation import DenseProlongation, Prolongation
from aleafield.spaces.space import apply_each
from aleafield.spaces.spectral import SpectralSpace


class Legendre(SpectralSpace):
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

    def _reference(self, x: FloatArray) -> FloatArray:
        """x on [-1, 1]."""
        return np.asarray((2.0 * x - (self._interval.low + self._interval.high)) / self._interval.length)

    def _derivative(self, order: int) -> FloatArray:
        """Matrix (n, n) from the unknowns to the coefficients, in Legendre polynomials, of a derivative."""
        found = self._derivatives.get(order)
        if found is None:
            found = np.zeros((self.n, self.n))
            if order < self.n:
                scale = (2.0 / self._interval.length) ** order * self._scale
                found[: self.n - order] = legder(np.eye(self.n), order) * scale
            self._derivatives[order] = found
        return found

    def _basis(self, x: FloatArray) -> FloatArray:
        """The basis functions at x (...,); shape (..., n)."""
        return np.asarray(self._profiles(x) * self._scale)

    def evaluation_matrix(self, x: FloatArray) -> FloatArray:
        """Orthonormal Legendre polynomials at x (P,); shape (P, n)."""
        return self._basis(x)

    def derivative_matrix(self, x: FloatArray, order: int = 1) -> FloatArray:
        """Derivatives of the orthonormal Legendre polynomials at x (P,); shape (P, n)."""
        return self._profiles(x) @ self._derivative(order)

    def _profiles(self, x: FloatArray) -> FloatArray:
        """Legendre polynomials."""
        return np.ascontiguousarray(legvander(self._reference(x), self.n - 1))

    def _amplitudes(self, u: FloatArray, order: int) -> FloatArray:
        """Coefficients of the derivative in Legendre polynomials."""
        return u * self._scale if order == 0 else apply_each(self._derivative(order), u)

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

    @cached_property
    def search_grid(self) -> FloatArray:
        """4n + 1 extremal points, which crowd at the ends as the zeros of polynomials do."""
        return extremal_points(self._interval, 4 * self.n + 1)

    def _prolongation_to(self, points: FloatArray) -> Prolongation:
        return DenseProlongation(self._basis(points))
