"""From a number of one state to a number of the trajectory: at one time, or reduced over a window."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.quantities.cubic import Cubic
from aleafield.quantities.quantity import At, Observer, Over
from aleafield.stepping.view import AnyStep, NoisyStep

Take = Callable[[FloatArray, float, float | None], tuple[FloatArray, FloatArray | None]]
"""(u (S, n) finite, time, middle of the step or None) -> values (S,), margins (S,) or None."""

_SAME_TIME = 1e-9
"""Times that differ by less than this share of the duration are one."""


@dataclass(frozen=True)
class Reading:
    """What a quantity is of one state, and how its values follow one another in time.

    Attributes
    ----------
    take : callable
        Values where the quantity occurs, and the margin, which is >= 0 exactly there.
    occurs : "once" or "throughout"
        Over a window: where the margin is >= 0 at some time, or at all evaluated times.
    least : float
        Values are never smaller; a cubic in time that is gets cut.
    period : float or None
        Values that differ by a multiple of it are one; they are followed by the shorter way.
    jumps : bool
        Whether the value depends on the side from which a time is approached.
    """

    take: Take
    occurs: Literal["once", "throughout"] = "once"
    least: float = -np.inf
    period: float | None = None
    jumps: bool = False

    def of_state(
        self, u: FloatArray, t: float, inside: float | None = None
    ) -> tuple[FloatArray, FloatArray | None]:
        """Values (S,) and margins (S,) of states u (S, n); NaN for those that are not finite.

        Parameters
        ----------
        t : float
            Model time.
        inside : float, optional
            The middle of the step that the state belongs to, for comparisons with t.
        """
        finite = np.asarray(np.isfinite(u).all(axis=-1))
        clean = u if finite.all() else np.where(finite[:, None], u, 0.0)
        with np.errstate(all="ignore"):
            values, margins = self.take(clean, t, inside)
        values = np.where(finite, values, np.nan)
        return values, None if margins is None else np.where(finite, margins, np.nan)


def plain(number: Callable[[FloatArray], FloatArray]) -> Reading:
    """The reading of a number (S,) of states (S, n) that always occurs and does not depend on the time."""
    return Reading(lambda u, t, inside: (number(u), None))


class Clock:
    """Tells times of one schedule apart.

    Parameters
    ----------
    duration : float
        Of the run, units of time.
    """

    def __init__(self, duration: float) -> None:
        self._tolerance = _SAME_TIME * duration

    def same(self, t: float, other: float) -> bool:
        """Whether two times are one, to rounding."""
        return abs(t - other) <= self._tolerance

    def not_before(self, t: float, other: float) -> bool:
        """Whether t is `other` or later."""
        return t >= other - self._tolerance

    def within(self, view: AnyStep, window: Over) -> bool:
        """Whether a step lies in a window."""
        return self.not_before(view.t0, window.start) and self.not_before(window.end, view.t1)


class Snapshot:
    """Observer of a reading at one time of the schedule.

    Parameters
    ----------
    time : float
    reading : Reading
    clock : Clock
    """

    def __init__(self, time: float, reading: Reading, clock: Clock) -> None:
        self._time, self._reading, self._clock = time, reading, clock
        self._taken: tuple[FloatArray, FloatArray | None] | None = None

    def start(self, t: float, u: FloatArray) -> None:
        """Take the reading of the initial state if it is its time."""
        self._look(t, u)

    def step(self, view: AnyStep) -> None:
        """Take the reading at the end of the step if it is its time."""
        self._look(view.t1, view.u1)

    def _look(self, t: float, u: FloatArray) -> None:
        if self._clock.same(t, self._time):
            self._taken = self._reading.of_state(u, self._time)

    def result(self) -> tuple[FloatArray, FloatArray | None]:
        """Values (S,), NaN where the quantity does not occur, and the margin (S,) or None."""
        if self._taken is None:
            raise RuntimeError(f"the trajectory has no state at time {self._time}: the schedule must hold it")
        values, margin = self._taken
        return values if margin is None else np.where(margin >= 0, values, np.nan), margin


class Window:
    """Observer of a reading reduced over a window, whose ends lie on the schedule.

    In each step the reading is taken at both ends and at a third and two thirds of the cubic Hermite state.
    The cubic through the four numbers stands for it: for a linear functional of the state this is exactly its
    own cubic Hermite interpolant, of order 4.  Of a noisy path the reading is taken at both ends, and the straight
    line between them stands for it.  Maximum and minimum are those of the cubic or the line in closed form, the
    mean is its exact integral.  Only running numbers are kept.

    Parameters
    ----------
    window : Over
    reading : Reading
    clock : Clock
    """

    def __init__(self, window: Over, reading: Reading, clock: Clock) -> None:
        self._window, self._reading, self._clock = window, reading, clock
        self._end: tuple[FloatArray, FloatArray | None] | None = None
        self._value: FloatArray | None = None
        self._margin: FloatArray | None = None

    def start(self, t: float, u: FloatArray) -> None:
        """Nothing: the first step shows its initial state too."""

    def step(self, view: AnyStep) -> None:
        """Reduce over the step if it lies in the window."""
        if not self._clock.within(view, self._window):
            return
        first = self._end
        middle = view.t0 + 0.5 * view.length
        if first is None or self._reading.jumps:
            first = self._reading.of_state(view.u0, view.t0, middle)
        readings = [first]
        for theta in (1.0,) if isinstance(view, NoisyStep) else (1 / 3, 2 / 3, 1.0):
            t = view.t0 + theta * view.length
            with np.errstate(all="ignore"):
                state = view.state(theta)
            values, margins = self._reading.of_state(state, t, middle)
            readings.append((self._continued(values, readings[-1][0]), margins))
        self._end = readings[-1]
        with np.errstate(all="ignore"):
            self._reduce([values for values, _ in readings], view.length)
            self._reduce_margin([margins for _, margins in readings if margins is not None])

    def _continued(self, values: FloatArray, before: FloatArray) -> FloatArray:
        period = self._reading.period
        if period is None:
            return values
        return np.asarray(values - period * np.rint((values - before) / period))

    def _reduce(self, values: list[FloatArray], length: float) -> None:
        before = self._value
        if self._window.reduce == "mean":
            part = _mean(values) * (length / (self._window.end - self._window.start))
            self._value = part if before is None else before + part
        elif self._window.reduce == "maximum":
            largest = _largest(values)
            self._value = largest if before is None else np.maximum(before, largest)
        else:
            smallest = -_largest([-value for value in values])
            self._value = smallest if before is None else np.minimum(before, smallest)

    def _reduce_margin(self, margins: list[FloatArray]) -> None:
        if not margins:
            return
        before = self._margin
        if self._reading.occurs == "once":
            largest = _largest(margins)
            self._margin = largest if before is None else np.maximum(before, largest)
        else:
            smallest = np.minimum.reduce(margins)
            self._margin = smallest if before is None else np.minimum(before, smallest)

    def result(self) -> tuple[FloatArray, FloatArray | None]:
        """Values (S,), NaN where the quantity does not occur, and the margin (S,) or None."""
        if self._value is None:
            raise RuntimeError(f"no step lies in {self._window}: the schedule must hold both ends")
        values = np.maximum(self._value, self._reading.least)
        margin = self._margin
        return values if margin is None else np.where(margin >= 0, values, np.nan), margin


def _mean(values: list[FloatArray]) -> FloatArray:
    """The integral of the cubic through four values of a step, or of the line through two, over its length."""
    return Cubic.through(*values).mean() if len(values) == 4 else 0.5 * (values[0] + values[1])


def _largest(values: list[FloatArray]) -> FloatArray:
    """Largest value of the cubic through four values of a step, or of the line through two."""
    inside = [Cubic.through(*values).maximum()] if len(values) == 4 else []
    return np.asarray(np.maximum.reduce([*inside, *values]))


def observe(when: At | Over, reading: Reading, duration: float) -> Observer:
    """The observer of a reading at one time (None: the end of the run), or over a window."""
    clock = Clock(duration)
    if isinstance(when, Over):
        return Window(when, reading, clock)
    return Snapshot(duration if when.time is None else when.time, reading, clock)
