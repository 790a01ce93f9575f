"""The measures "mean", "integral" and "norm": integrals over the whole domain, exact for the element."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.quantities.quantity import At, When
from aleafield.quantities.timed import LinearQuantity, WholeFieldQuantity
from aleafield.spaces import Space
from aleafield.units import ACTIVITY


@dataclass(frozen=True)
class Integral(LinearQuantity):
    """Integral of u over the domain.

    Parameters
    ----------
    name : str
    when : At or Over
    """

    measure = "integral"
    dimension = (1, 1, 0)
    name: str
    when: When = At()

    @property
    def defined_for_white_noise(self) -> bool:
        """It is: its variance does not depend on the mesh."""
        return True

    @property
    def functional_name(self) -> str:
        """The integral of u over the domain."""
        return "the integral"

    def functional(self, space: Space) -> FloatArray:
        """The integral of the element."""
        return space.integral_weights


@dataclass(frozen=True)
class Mean(LinearQuantity):
    """Integral of u divided by the size of the domain.

    Parameters
    ----------
    name : str
    when : At or Over
    """

    measure = "mean"
    dimension = ACTIVITY
    name: str
    when: When = At()

    @property
    def defined_for_white_noise(self) -> bool:
        """It is: its variance does not depend on the mesh."""
        return True

    @property
    def functional_name(self) -> str:
        """The integral, up to a factor."""
        return "the integral"

    def functional(self, space: Space) -> FloatArray:
        """The mean of the element."""
        return space.integral_weights / space.domain.length


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
