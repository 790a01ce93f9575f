"""The measures "front position" and "front speed": the outermost level crossing on an interval."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, get_args

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Side
from aleafield.errors import InputError
from aleafield.field.parameter import Parameter, number
from aleafield.geometry import Domain
from aleafield.quantities.crossings import level_crossings
from aleafield.quantities.in_time import Clock, Reading, Snapshot
from aleafield.quantities.margins import margin_above
from aleafield.quantities.noisy import NoisyPaths
from aleafield.quantities.quantity import At, Observer, Over, Quantity, When
from aleafield.quantities.timed import TimedQuantity
from aleafield.spaces import Space
from aleafield.stepping.view import AnyStep
from aleafield.units import ACTIVITY, LENGTH, SPEED

FrontSide = Literal["right", "left"]


def refuse_no_front(quantity: Quantity, side: FrontSide, domain: Domain) -> None:
    """Raise InputError on a ring, where no crossing is the outermost, and for a side that is none."""
    if side not in get_args(FrontSide):
        raise InputError(quantity.key("side"), f"{side!r}", "'right' or 'left' is needed")
    if domain.periodic:
        raise InputError(
            quantity.key("measure"),
            f"{quantity.measure!r} on a ring",
            "a front needs an interval; on a ring use 'peak position' or 'active width'",
        )


def front_reading(space: Space, level: float | FloatArray, side: FrontSide) -> Reading:
    """Position of the front and its margin, min(largest value - level, level - value at the side's end)."""

    def front(u: FloatArray, t: float, inside: float | None) -> tuple[FloatArray, FloatArray]:
        found = level_crossings(space, u, level)
        position, end = (
            (found.last_fall(), found.right_end) if side == "right" else (found.first_rise(), found.left_end)
        )
        margin = np.minimum(margin_above(found.highest, level), level - end)
        return np.where(margin >= 0, position, np.nan), margin

    return Reading(front, occurs="throughout")


@dataclass(frozen=True)
class FrontPosition(TimedQuantity):
    """Largest x with u > level to its left (side "right"), or smallest with u > level to its right (side
    "left").

    It occurs where the field exceeds the level somewhere and does not at that side's end of the interval.
    Over a window it occurs if it does at all evaluated times: both ends of every step, and without noise a third
    and two thirds of it.

    Parameters
    ----------
    name : str
    level : number
        Units of activity, may be uncertain.
    side : "right" or "left"
    when : At or Over
    """

    measure = "front position"
    dimension = LENGTH
    may_not_occur = True
    name: str
    level: Parameter = number(ACTIVITY)
    side: FrontSide = "right"
    when: When = At()

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError on a ring."""
        refuse_no_front(self, self.side, domain)

    @property
    def open_occurrence(self) -> Side | None:
        """Over a window it may be gone between the ends of steps."""
        return "below" if isinstance(self.when, Over) else None

    def reading(self, space: Space) -> Reading:
        """Position and margin of the front."""
        return front_reading(space, self.level, self.side)  # type: ignore[arg-type]


@dataclass(frozen=True)
class FrontSpeed(Quantity):
    """(X(t2) - X(t1)) / (t2 - t1), X the front position; it occurs where both positions do.

    Parameters
    ----------
    name : str
    level : number
        Units of activity, may be uncertain.
    between : (t1, t2)
        Units of time, t1 < t2.
    side : "right" or "left"
    """

    measure = "front speed"
    dimension = SPEED
    may_not_occur = True
    name: str
    level: Parameter = number(ACTIVITY)
    between: tuple[float, float] = (0.0, 1.0)
    side: FrontSide = "right"

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError on a ring."""
        refuse_no_front(self, self.side, domain)

    def times(self, duration: float) -> tuple[float, ...]:
        """Both times; InputError where they do not ascend or lie outside the run."""
        return self.ascending("between", self.between, duration)

    def observer(self, space: Space, duration: float, noise: NoisyPaths | None = None) -> Observer:
        """Two snapshots of the position."""
        self.refuse_domain(space.domain)
        reading = front_reading(space, self.level, self.side)  # type: ignore[arg-type]
        clock = Clock(duration)
        first, last = self.between
        return SpeedObserver(Snapshot(first, reading, clock), Snapshot(last, reading, clock), last - first)


class SpeedObserver:
    """The difference of two snapshots divided by the time between them.

    Parameters
    ----------
    first, last : Snapshot
        Both with margins.
    elapsed : float
        Units of time.
    """

    def __init__(self, first: Snapshot, last: Snapshot, elapsed: float) -> None:
        self._first, self._last, self._elapsed = first, last, elapsed

    def start(self, t: float, u: FloatArray) -> None:
        """Show both the initial state."""
        self._first.start(t, u)
        self._last.start(t, u)

    def step(self, view: AnyStep) -> None:
        """Show both the step."""
        self._first.step(view)
        self._last.step(view)

    def result(self) -> tuple[FloatArray, FloatArray | None]:
        """Speeds (S,), NaN where a position does not occur, and the smaller margin (S,)."""
        (start, margin), (end, other) = self._first.result(), self._last.result()
        assert margin is not None
        assert other is not None
        return (end - start) / self._elapsed, np.minimum(margin, other)
