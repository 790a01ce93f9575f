"""The measures "mean", "integral" and "norm": integrals over the whole domain, exact for the element."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.quantities.timed import WholeFieldQuantity
from aleafield.spaces import Space
from aleafield.units import ACTIVITY


class Integral(WholeFieldQuantity):
    """Integral of u over the domain."""

    measure = "integral"
    dimension = (1, 1, 0)

    def number(self, space: Space) -> Callable[[FloatArray], FloatArray]:
        """The integral of the element."""
        return lambda u: (u * space.integral_weights).sum(axis=-1)


class Mean(WholeFieldQuantity):
    """Integral of u divided by the size of the domain."""

    measure = "mean"
    dimension = ACTIVITY

    def number(self, space: Space) -> Callable[[FloatArray], FloatArray]:
        """The mean of the element."""
        weights = space.integral_weights / space.domain.length
        return lambda u: (u * weights).sum(axis=-1)


class Norm(WholeFieldQuantity):
    """Square root of the integral of u^2.

    Lengths are counted in the study's unit: the norm is that of u as a function of the pure number x / unit,
    so that it carries the unit of activity.  Activity times the root of a length is no unit of UDUNITS, which
    knows whole exponents only.
    """

    measure = "norm"
    dimension = ACTIVITY

    def number(self, space: Space) -> Callable[[FloatArray], FloatArray]:
        """The norm of the element."""
        return lambda u: np.sqrt(space.square_integral(u))
