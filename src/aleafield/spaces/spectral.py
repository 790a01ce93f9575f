"""Spaces of smooth functions: an element is a sum of amplitudes times profiles, and so is each derivative."""

from __future__ import annotations

from abc import abstractmethod
from collections.abc import Callable

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.spaces.space import Space, apply_each

Jets = Callable[[IntArray, FloatArray], tuple[FloatArray, FloatArray, FloatArray]]
"""(numbers of the elements (M,), a point for each (M,)) -> value, slope and curvature there, each (M,)."""


class SpectralSpace(Space):
    """A space whose elements have derivatives of every order, with profiles that all orders share."""

    @abstractmethod
    def _profiles(self, x: FloatArray) -> FloatArray:
        """The functions that elements are sums of, at x (...,); shape (..., K); NaN where x is not finite."""

    @abstractmethod
    def _amplitudes(self, u: FloatArray, order: int) -> FloatArray:
        """Factors (S, K) of the profiles in the derivative of that order of the elements u (S, n)."""

    def evaluate_each(self, u: FloatArray, x: FloatArray) -> FloatArray:
        """Values of u (S, n) at x (S, P); shape (S, P)."""
        return self.differentiate_each(u, x, 0)

    def differentiate_each(self, u: FloatArray, x: FloatArray, order: int = 1) -> FloatArray:
        """Derivatives of u (S, n) at x (S, P); shape (S, P)."""
        return apply_each(self._profiles(x), self._amplitudes(u, order))

    def jets(self, u: FloatArray) -> Jets:
        """Values and derivatives of elements u (S, n), for searches: amplitudes once, profiles for all orders.

        The bits of an element's numbers are its own.
        """
        amplitudes = np.stack([self._amplitudes(u, order) for order in range(3)], axis=1)

        def at(which: IntArray, x: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
            own = amplitudes if len(which) == len(amplitudes) else amplitudes[which]
            found = apply_each(own, self._profiles(x))
            return found[:, 0], found[:, 1], found[:, 2]

        return at
