"""Continuous functions that are linear on each of equal elements."""

from __future__ import annotations

from functools import cached_property

import numpy as np

from aleafield.arrays import ComplexArray, FloatArray, IntArray
from aleafield.geometry import Domain, Interval, Refinement, Ring, interval_grid, ring_grid
from aleafield.spaces.prolongation import GatherProlongation, Prolongation
from aleafield.spaces.space import Space, agree


class PiecewiseLinear(Space):
    """Linear finite elements on a uniform mesh; the unknowns are the values at the nodes.

    On an interval n nodes bound n - 1 elements, both ends included; on a ring n nodes j length / n start n
    elements.  Interpolation and orthogonal projection have error h^2 for functions with two derivatives.

    Parameters
    ----------
    domain : Interval or Ring
    n : int, at least 3

    Attributes
    ----------
    element : float
        Size h of an element, units of length.
    """

    projector = "piecewise linear"
    domains = (Interval, Ring)

    def __init__(self, domain: Domain, n: int) -> None:
        super().__init__(domain, n)
        if isinstance(domain, Interval):
            self._origin = domain.low
            self._elements = n - 1
            self.nodes = interval_grid(domain, n - 1)
        else:
            self._origin = 0.0
            self._elements = n
            self.nodes = ring_grid(domain, n)
        self.element = domain.length / self._elements
        self.integral_weights = np.full(n, self.element)
        if not domain.periodic:
            self.integral_weights[[0, -1]] *= 0.5

    @classmethod
    def refinement(cls, domain: Domain) -> Refinement:
        """n -> 2n - 1 nodes on an interval, n -> 2n on a ring; the elements of a coarser level are unions."""
        return Refinement(not domain.periodic, smallest=3, key="scheme.nodes", unions=True)

    def locate(self, x: FloatArray) -> tuple[IntArray, IntArray, FloatArray]:
        """Left and right node of the element that holds each point, and the fraction of the way between them.

        Points within rounding of a node are moved onto it, so that nodal values are reproduced to the bit.
        """
        finite = np.isfinite(x)
        way = np.where(finite, x, self._origin) - self._origin
        if self.domain.periodic:
            way = np.mod(way, self.domain.length)
        steps = way / self.element
        nearest = np.rint(steps)
        rounding = 8 * np.finfo(np.float64).eps * (self._elements + np.abs(self._origin) / self.element)
        steps = np.where(np.abs(steps - nearest) <= rounding, nearest, steps)
        left = np.clip(np.floor(steps), 0, self._elements - 1).astype(np.int64)
        right = (left + 1) % self.n
        return left, right, np.where(finite, steps - left, np.nan)

    def _two_diagonals(self, x: FloatArray, of_left: FloatArray, of_right: FloatArray) -> FloatArray:
        left, right, _ = self.locate(x)
        rows = np.arange(len(x))
        matrix = np.zeros((len(x), self.n))
        matrix[rows, left] += of_left
        matrix[rows, right] += of_right
        return matrix

    def evaluation_matrix(self, x: FloatArray) -> FloatArray:
        """Values of the hat functions at x (P,); shape (P, n), two entries in a row."""
        fraction = self.locate(x)[2]
        return self._two_diagonals(x, 1.0 - fraction, fraction)

    def derivative_matrix(self, x: FloatArray, order: int = 1) -> FloatArray:
        """Slopes of the hat functions at x (P,), at a node those to its right; 0 above order 1."""
        slope = np.full(len(x), 1.0 / self.element if order == 1 else 0.0)
        return self._two_diagonals(x, -slope, slope)

    def evaluate_each(self, u: FloatArray, x: FloatArray) -> FloatArray:
        """Linear interpolation of u (S, n) at x (S, P); shape (S, P)."""
        left, right, fraction = self.locate(x)
        of_left = np.take_along_axis(u, left, axis=1) * (1.0 - fraction)
        return of_left + np.take_along_axis(u, right, axis=1) * fraction

    def differentiate_each(self, u: FloatArray, x: FloatArray, order: int = 1) -> FloatArray:
        """Slope of u (S, n) in the element of x (S, P), at a node that to its right; 0 above order 1."""
        left, right, fraction = self.locate(x)
        if order > 1:
            return 0.0 * fraction
        rise = np.take_along_axis(u, right, axis=1) - np.take_along_axis(u, left, axis=1)
        return np.where(np.isfinite(fraction), rise / self.element, np.nan)

    def square_integral(self, u: FloatArray) -> FloatArray:
        """h / 3 times the sum of a^2 + a b + b^2 over the elements with end values a and b; shape (S,)."""
        if self.domain.periodic:
            left, right = u, np.roll(u, -1, axis=1)
        else:
            left, right = u[:, :-1], u[:, 1:]
        return np.asarray((left * left + left * right + right * right).sum(axis=-1) * (self.element / 3.0))

    def fourier_coefficient(self, u: FloatArray, k: int) -> ComplexArray:
        """The discrete coefficient times that of a hat, (sin(pi k / n) / (pi k / n))^2; shape (S,)."""
        if not self.domain.periodic:
            return super().fourier_coefficient(u, k)
        turns = (np.arange(self.n) * k) % self.n
        discrete = (u * np.exp(-2j * np.pi * turns / self.n)).sum(axis=-1) / self.n
        return np.asarray(discrete * np.sinc(k / self.n) ** 2)

    @cached_property
    def search_grid(self) -> FloatArray:
        """The nodes, ascending: between two of them an element is linear."""
        return self.nodes[self.display_order]

    def _prolongation_to(self, points: FloatArray) -> Prolongation:
        if agree(points, self.nodes, self.domain.length):
            return super()._prolongation_to(points)
        return GatherProlongation(*self.locate(points))
