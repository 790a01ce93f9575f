"""The measures "maximum", "minimum" and "peak position"."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.quantities.in_time import Reading
from aleafield.quantities.peaks import peak
from aleafield.quantities.quantity import At, When
from aleafield.quantities.timed import TimedQuantity
from aleafield.spaces import Space
from aleafield.units import ACTIVITY, LENGTH, Dimension


@dataclass(frozen=True)
class Maximum(TimedQuantity):
    """Largest value in space: by a parabola through three nodes if piecewise linear, else of the element."""

    measure = "maximum"
    name: str
    when: When = At()

    @property
    def dimension(self) -> Dimension:
        """The unit of activity."""
        return ACTIVITY

    def reading(self, space: Space) -> Reading:
        """The height of the peak."""
        return Reading(lambda u, t, inside: (peak(space, u).height, None))


@dataclass(frozen=True)
class Minimum(TimedQuantity):
    """Smallest value in space, located as the maximum of -u is."""

    measure = "minimum"
    name: str
    when: When = At()

    @property
    def dimension(self) -> Dimension:
        """The unit of activity."""
        return ACTIVITY

    def reading(self, space: Space) -> Reading:
        """Minus the height of the peak of -u."""
        return Reading(lambda u, t, inside: (-peak(space, -u).height, None))


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
    name: str
    reference: float | None = None
    when: When = At()

    @property
    def dimension(self) -> Dimension:
        """The unit of length."""
        return LENGTH

    @property
    def is_peak_position(self) -> bool:
        """True: its error is judged by the rule for positions of a peak."""
        return True

    def reading(self, space: Space) -> Reading:
        """The position of the peak."""
        domain, reference = space.domain, self.reference
        if not domain.periodic:
            return Reading(lambda u, t, inside: (peak(space, u).position, None))
        about = 0.0 if reference is None else reference

        def unwrapped(u: FloatArray, t: float, inside: float | None) -> tuple[FloatArray, None]:
            return about + domain.displacement(peak(space, u).position, np.array(about)), None

        return Reading(unwrapped, period=domain.length)
