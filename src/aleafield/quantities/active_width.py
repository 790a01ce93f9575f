"""The measure "active width": length of the set where the field lies above a level."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Side
from aleafield.field.parameter import Parameter, number
from aleafield.quantities.crossings import level_crossings
from aleafield.quantities.in_time import Reading
from aleafield.quantities.margins import margin_above
from aleafield.quantities.quantity import At, Over, When
from aleafield.quantities.timed import TimedQuantity
from aleafield.spaces import Space
from aleafield.units import ACTIVITY, LENGTH


@dataclass(frozen=True)
class ActiveWidth(TimedQuantity):
    """Length of {x : u(x) > level}, all patches together.

    It occurs where the largest value of the interpolant exceeds the level, and that excess is the margin.
    For a piecewise-linear field this is the largest nodal value, not the vertex of a parabola, so that the
    width is positive exactly where it occurs.  Over a window the width counts as 0 while nothing lies above
    the level; it occurs if the level is exceeded at some time.

    Parameters
    ----------
    name : str
    level : number
        Units of activity, may be uncertain.
    when : At or Over
    """

    measure = "active width"
    dimension = LENGTH
    may_not_occur = True
    name: str
    level: Parameter = number(ACTIVITY)
    when: When = At()

    @property
    def open_occurrence(self) -> Side | None:
        """Over a window it may occur between the ends of steps too."""
        return "above" if isinstance(self.when, Over) else None

    def reading(self, space: Space) -> Reading:
        """Width and largest value less level."""
        level: float | FloatArray = self.level  # type: ignore[assignment]

        def width(u: FloatArray, t: float, inside: float | None) -> tuple[FloatArray, FloatArray]:
            found = level_crossings(space, u, level)
            return found.width(space.domain), margin_above(found.highest, level)

        return Reading(width, least=0.0)
