"""The measures "maximum", "minimum" and "peak position"."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.geometry import Domain
from aleafield.quantities.in_time import Reading, plain
from aleafield.quantities.peaks import peak
from aleafield.quantities.quantity import At, When
from aleafield.quantities.timed import TimedQuantity, WholeFieldQuantity
from aleafield.spaces import Space
from aleafield.units import ACTIVITY, LENGTH


class Maximum(WholeFieldQuantity):
    """Largest value in space: by a parabola through three nodes if piecewise linear, else of the element."""

    measure = "maximum"
    dimension = ACTIVITY

    def takes_extremum(self, domain: Domain) -> bool:
        """It looks for the largest value."""
        return True

    def number(self, space: Space) -> Callable[[FloatArray], FloatArray]:
        """The height of the peak."""
        return lambda u: peak(space, u).height


class Minimum(WholeFieldQuantity):
    """Smallest value in space, located as the maximum of -u is."""

    measure = "minimum"
    dimension = ACTIVITY

    def takes_extremum(self, domain: Domain) -> bool:
        """It looks for the smallest value."""
        return True

    def number(self, space: Space) -> Callable[[FloatArray], FloatArray]:
        """Minus the height of the peak of -u."""
        return lambda u: -peak(space, -u).height


@dataclass(frozen=True)
class PeakPosition(TimedQuantity):
    """Where the maximum lies.

    Parameters
    ----------
    name : str
    reference : float, optional
        On a ring: positions are unwrapped about it, into [reference - length / 2, reference + length / 2).
        None leaves them in [low, high).  Over a window the peak is followed continuously from there by the
        shorter way round.  On an interval it has no effect.
    when : At or Over
    """

    measure = "peak position"
    dimension = LENGTH
    name: str
    reference: float | None = None
    when: When = At()

    def takes_extremum(self, domain: Domain) -> bool:
        """It looks for the largest value."""
        return True

    def is_peak_position(self, domain: Domain) -> bool:
        """It is one on every domain."""
        return True

    def reading(self, space: Space) -> Reading:
        """The position of the peak."""
        domain, reference = space.domain, self.reference
        if not domain.periodic:
            return plain(lambda u: peak(space, u).position)
        about = 0.0 if reference is None else reference

        def unwrapped(u: FloatArray, t: float, inside: float | None) -> tuple[FloatArray, None]:
            return about + domain.displacement(peak(space, u).position, np.array(about)), None

        return Reading(unwrapped, period=domain.length)
