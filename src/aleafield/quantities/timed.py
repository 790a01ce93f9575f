"""Quantities that are a number of one state: taken at one time, or reduced over a window."""

from __future__ import annotations

from abc import abstractmethod
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import get_args

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Side
from aleafield.errors import InputError
from aleafield.quantities.bridge import BridgedFunctional
from aleafield.quantities.bridged_window import BridgedWindow
from aleafield.quantities.functional import LinearFunctional
from aleafield.quantities.history import History
from aleafield.quantities.in_time import Clock, Reading, observe, plain
from aleafield.quantities.noisy import NoisyPaths
from aleafield.quantities.quantity import At, Observer, Over, Quantity, Reduction, When
from aleafield.spaces import Space


class TimedQuantity(Quantity):
    """A quantity with `when`; a concrete class adds `reading`, its number of one state.

    Attributes
    ----------
    when : At or Over
        The last field of each concrete class.
    """

    when: When

    @abstractmethod
    def reading(self, space: Space) -> Reading:
        """What a bound quantity is of one state of `space`."""

    def times(self, duration: float) -> tuple[float, ...]:
        """The time, or both ends of the window.

        Raises
        ------
        InputError
            Where a time lies outside [0, duration], or a window ends before it starts.
        """
        if isinstance(self.when, At):
            time = duration if self.when.time is None else self.when.time
            return (self.within_run("time", time, duration),)
        reductions = get_args(Reduction)
        if self.when.reduce not in reductions:
            needed = "one of " + ", ".join(reductions) + " is needed"
            raise InputError(self.key("reduce"), f"{self.when.reduce!r}", needed)
        ends = (self.when.start, self.when.end)
        return self.ascending("over", ends, duration)

    @property
    def _extremum(self) -> Side | None:
        """The side on which an extreme over the window lies; None for a mean, and at one time."""
        if not isinstance(self.when, Over):
            return None
        sides: dict[str, Side | None] = {"maximum": "above", "minimum": "below", "mean": None}
        return sides[self.when.reduce]

    @property
    def open_side(self) -> Side | None:
        """Over a window the side of the extreme."""
        return self._extremum

    def observer(self, space: Space, duration: float, noise: NoisyPaths | None = None) -> Observer:
        """A snapshot or a window over the reading."""
        self.refuse_domain(space.domain)
        return observe(self.when, self.reading(space), duration)

    def history(self, space: Space, times: Sequence[float]) -> History | None:
        """The reading at several times, for a quantity at one time."""
        if isinstance(self.when, Over):
            return None
        reading = self.reading(space)

        def number(u: FloatArray, t: float) -> FloatArray:
            values, margin = reading.of_state(u, t)
            return values if margin is None else np.where(margin >= 0, values, np.nan)

        return History(number, times)


class LinearQuantity(TimedQuantity):
    """A linear functional of the state; a concrete class adds `functional`.

    Under noise its largest and smallest values over a window are those of Brownian bridges inside the steps.
    """

    @abstractmethod
    def functional(self, space: Space) -> FloatArray:
        """Weights (n,) of the unknowns of `space`."""

    @property
    @abstractmethod
    def functional_name(self) -> str:
        """What the functional is up to a factor, the same for all quantities that read it."""

    def reading(self, space: Space) -> Reading:
        """The functional as it stands."""
        return plain(LinearFunctional(self.functional(space)))

    @property
    def bridged(self) -> bool:
        """For an extreme over a window."""
        return self._extremum is not None

    @property
    def open_side(self) -> Side | None:
        """None: extremes are exact in law."""
        return None

    def observer(self, space: Space, duration: float, noise: NoisyPaths | None = None) -> Observer:
        """As for any other reading; bridged for an extreme over a window under noise."""
        if noise is None or not self.bridged:
            return super().observer(space, duration)
        assert isinstance(self.when, Over)
        self.refuse_domain(space.domain)
        name = f"{self.when.reduce} of {self.functional_name}"
        inside = BridgedFunctional(LinearFunctional(self.functional(space)), noise, name)
        return BridgedWindow(self.when, inside, Clock(duration))


@dataclass(frozen=True)
class WholeFieldQuantity(TimedQuantity):
    """A quantity of the whole field that needs nothing but a name and a time, and always occurs.

    Parameters
    ----------
    name : str
    when : At or Over
    """

    name: str
    when: When = At()

    @abstractmethod
    def number(self, space: Space) -> Callable[[FloatArray], FloatArray]:
        """What the quantity is of states (S, n) of `space`; shape (S,)."""

    def reading(self, space: Space) -> Reading:
        """The number as it stands."""
        return plain(self.number(space))
