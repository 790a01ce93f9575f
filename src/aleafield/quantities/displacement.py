"""The measures "displacement" and "effective diffusion": how far a pattern of activity has wandered."""

from __future__ import annotations

from abc import abstractmethod
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.geometry import Domain
from aleafield.quantities.history import History
from aleafield.quantities.in_time import Clock, Reading, plain
from aleafield.quantities.noisy import NoisyPaths
from aleafield.quantities.peaks import peak
from aleafield.quantities.quantity import Observer, Quantity
from aleafield.spaces import Space
from aleafield.stepping.view import AnyStep
from aleafield.units import LENGTH, Dimension

_VANISHING = 1e-12
"""A mode that is a smaller share of the field than this is rounding, and has no phase."""


def place(space: Space) -> Reading:
    """Where the pattern of a state is, units of length; NaN where it is nowhere.

    On a ring: the crest of the first Fourier mode, so that cos(2 pi (x - c) / length) is at c; a field without that
    mode is nowhere.  On an interval: the peak.
    """
    if not space.domain.periodic:
        return plain(lambda u: peak(space, u).position)

    def crest(u: FloatArray) -> FloatArray:
        mode = space.fourier_coefficient(u, 1)
        there = np.abs(mode) > _VANISHING * np.abs(u).max(axis=-1)
        return np.where(there, np.angle(mode) * (-space.domain.length / (2 * np.pi)), np.nan)

    return plain(crest)


class Track:
    """The place of the pattern of each sample, followed from step to step.

    On a ring each place is continued from the one before by the shorter way round, so that turns are counted.

    Parameters
    ----------
    space : Space
    """

    def __init__(self, space: Space) -> None:
        self._place = place(space)
        self._period = space.domain.length if space.domain.periodic else None
        self._start = self._last = np.empty(0)

    def begin(self, u: FloatArray, t: float) -> None:
        """The initial state."""
        self._start = self._last = self._place.of_state(u, t)[0]

    def at(self, u: FloatArray, t: float) -> FloatArray:
        """The place (S,) in a state (S, n) after the last one shown to `advance`, and nearest to it on a ring."""
        here = self._place.of_state(u, t)[0]
        if self._period is None:
            return here
        turns = np.rint((here - self._last) / self._period)
        return np.where(np.isfinite(turns), here - self._period * turns, here)

    def advance(self, u: FloatArray, t: float) -> None:
        """The state at the end of a step."""
        here = self.at(u, t)
        self._last = np.where(np.isnan(here), self._last, here)
        self._start = np.where(np.isnan(self._start), here, self._start)

    def since_start(self, u: FloatArray, t: float) -> FloatArray:
        """Delta, how far the pattern is from where it was first, (S,), units of length.

        0 as long as there was none, NaN where there is none any more.
        """
        return np.where(np.isnan(self._start), 0.0, self.at(u, t) - self._start)


class Wandering(Quantity):
    """A quantity of Delta at two times; concrete classes add `name`, `between` and their formula.

    Delta(t) is the displacement since t = 0: on a ring that of the crest of the first Fourier mode, its turns
    counted from step to step; on an interval that of the peak.  It is positive towards larger x.  A pattern on
    a ring that does not exist at t = 0 is followed from the end of the first step at which it does; until then Delta
    is 0.

    Attributes
    ----------
    between : (t1, t2)
        Units of time, t1 < t2; both lie on the schedule.
    """

    between: tuple[float, float]

    @abstractmethod
    def of(self, first: FloatArray, last: FloatArray) -> FloatArray:
        """The quantity (S,) from Delta (S,) at the two times."""

    def takes_extremum(self, domain: Domain) -> bool:
        """On an interval; on a ring the phase of a mode needs no extremum."""
        return not domain.periodic

    def is_peak_position(self, domain: Domain) -> bool:
        """On an interval, where it is the difference of two."""
        return not domain.periodic

    @property
    def followed(self) -> str:
        """The displacement Delta(t)."""
        return "displacement since t = 0"

    @property
    def history_dimension(self) -> Dimension:
        """That of Delta, a length."""
        return LENGTH

    def times(self, duration: float) -> tuple[float, ...]:
        """Both times; InputError where they do not ascend or lie outside the run."""
        return self.ascending("between", self.between, duration)

    def observer(self, space: Space, duration: float, noise: NoisyPaths | None = None) -> Observer:
        """Follows the pattern from step to step."""
        return WanderingObserver(self, Track(space), Clock(duration))

    def history(self, space: Space, times: Sequence[float]) -> History:
        """Delta at several times."""
        return TrackHistory(Track(space), times)


@dataclass(frozen=True)
class Displacement(Wandering):
    """Delta(t2) - Delta(t1).

    Parameters
    ----------
    name : str
    between : (t1, t2)
    """

    measure = "displacement"
    dimension = LENGTH
    name: str
    between: tuple[float, float]

    def of(self, first: FloatArray, last: FloatArray) -> FloatArray:
        """The difference of both."""
        return last - first


@dataclass(frozen=True)
class EffectiveDiffusion(Wandering):
    """(Delta(t2)^2 - Delta(t1)^2) / (2 (t2 - t1)).

    Its mean is half the rate at which the mean square of Delta grows between the two times, and so the coefficient of
    diffusion of a pattern that wanders without a drift.

    Parameters
    ----------
    name : str
    between : (t1, t2)
    """

    measure = "effective diffusion"
    dimension = (0, 2, -1)
    name: str
    between: tuple[float, float]

    def of(self, first: FloatArray, last: FloatArray) -> FloatArray:
        """Half the difference of the squares over that of the times."""
        start, end = self.between
        return (last - first) * (last + first) / (2.0 * (end - start))


class WanderingObserver:
    """Delta at two times, and what a quantity makes of them.

    Parameters
    ----------
    quantity : Wandering
    track : Track
    clock : Clock
    """

    def __init__(self, quantity: Wandering, track: Track, clock: Clock) -> None:
        self._quantity, self._track, self._clock = quantity, track, clock
        self._found: list[FloatArray] = []

    def start(self, t: float, u: FloatArray) -> None:
        """Delta is zero, where the pattern is somewhere."""
        self._track.begin(u, t)
        self._look(t, u)

    def step(self, view: AnyStep) -> None:
        """Follow the pattern; Delta if the end of the step is one of the times."""
        self._look(view.t1, view.u1)
        self._track.advance(view.u1, view.t1)

    def _look(self, t: float, u: FloatArray) -> None:
        found = len(self._found)
        if found < 2 and self._clock.same(t, self._quantity.between[found]):
            self._found.append(self._track.since_start(u, t))

    def result(self) -> tuple[FloatArray, None]:
        """Values (S,); it always occurs."""
        if len(self._found) < 2:
            missing = self._quantity.between[len(self._found)]
            raise RuntimeError(f"the trajectory has no state at time {missing}: the schedule must hold it")
        return self._quantity.of(*self._found), None


class TrackHistory(History):
    """Delta at several times.

    Parameters
    ----------
    track : Track
    times : model times within the run, increasing
    """

    def __init__(self, track: Track, times: Sequence[float]) -> None:
        super().__init__(track.since_start, times)
        self._track = track

    def start(self, t: float, u: FloatArray) -> None:
        """Where the pattern starts."""
        self._track.begin(u, t)
        super().start(t, u)

    def step(self, view: AnyStep) -> None:
        """Delta at the times inside the step, then on to its end."""
        super().step(view)
        self._track.advance(view.u1, view.t1)
