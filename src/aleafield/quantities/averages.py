"""The measures "mean", "integral" and "norm": integrals over the whole domain, exact for the element."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.quantities.in_time import Reading
from aleafield.quantities.quantity import At, When
from aleafield.quantities.timed import TimedQuantity
from aleafield.spaces import Space
from aleafield.units import ACTIVITY, Dimension


@dataclass(frozen=True)
class Integral(TimedQuantity):
    """Integral of u over the domain."""

    measure = "integral"
    name: str
    when: When = At()

    @property
    def dimension(self) -> Dimension:
        """Activity times length."""
        return (1, 1, 0)

    def reading(self, space: Space) -> Reading:
        """The integral of the element."""
        weights = space.integral_weights
        return Reading(lambda u, t, inside: ((u * weights).sum(axis=-1), None))


@dataclass(frozen=True)
class Mean(TimedQuantity):
    """Integral of u divided by the size of the domain."""

    measure = "mean"
    name: str
    when: When = At()

    @property
    def dimension(self) -> Dimension:
        """The unit of activity."""
        return ACTIVITY

    def reading(self, space: Space) -> Reading:
        """The mean of the element."""
        weights = space.integral_weights / space.domain.length
        return Reading(lambda u, t, inside: ((u * weights).sum(axis=-1), None))


@dataclass(frozen=True)
class Norm(TimedQuantity):
    """Square root of the integral of u^2.

    Lengths are counted in the study's unit: the norm is that of u as a function of the pure number x / unit,
    so that it carries the unit of activity.  Activity times the root of a length is no unit of UDUNITS, which
    knows whole exponents only.
    """

    measure = "norm"
    name: str
    when: When = At()

    @property
    def dimension(self) -> Dimension:
        """The unit of activity."""
        return ACTIVITY

    def reading(self, space: Space) -> Reading:
        """The norm of the element."""
        return Reading(lambda u, t, inside: (np.sqrt(space.square_integral(u)), None))
