"""Quantities that are a number of one state: taken at one time, or reduced over a window."""

from __future__ import annotations

from abc import abstractmethod
from collections.abc import Callable
from dataclasses import dataclass
from typing import get_args

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.quantities.in_time import Reading, observe, plain
from aleafield.quantities.quantity import At, Observer, Quantity, Reduction, When
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

    def observer(self, space: Space, duration: float) -> Observer:
        """A snapshot or a window over the reading."""
        self.refuse_domain(space.domain)
        return observe(self.when, self.reading(space), duration)


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
