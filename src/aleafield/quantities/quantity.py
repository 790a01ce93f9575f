"""The base of all quantities: a number (or none) per sample, read off the trajectory of a field."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Sequence
from dataclasses import dataclass
from typing import ClassVar, Literal, Protocol

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Side
from aleafield.errors import InputError
from aleafield.field.parameter import Bindable
from aleafield.geometry import Domain
from aleafield.quantities.history import History
from aleafield.quantities.noisy import NoisyPaths
from aleafield.spaces import Space
from aleafield.stepping.view import AnyStep
from aleafield.units import Dimension

Reduction = Literal["maximum", "minimum", "mean"]


@dataclass(frozen=True)
class At:
    """At one model time; None stands for the end of the run."""

    time: float | None = None


@dataclass(frozen=True)
class Over:
    """Reduced over the window [start, end] of model time."""

    start: float
    end: float
    reduce: Reduction


When = At | Over


class Observer(Protocol):
    """Follows one trajectory of a batch of S samples through the time loop."""

    def start(self, t: float, u: FloatArray) -> None:
        """The initial state, shape (S, n)."""
        ...

    def step(self, view: AnyStep) -> None:
        """One step: with derivatives at both ends, or with the increments of its noise."""
        ...

    def result(self) -> tuple[FloatArray, FloatArray | None]:
        """Values (S,), NaN where the quantity does not occur, and the margin (S,) or None.

        The margin is a continuous quantity of the trajectory that is >= 0 exactly where the quantity occurs.
        """
        ...


class Quantity(Bindable, ABC):
    """A number of a field's trajectory.

    Concrete classes are frozen dataclasses with `name` first; uncertain levels are `number` fields.

    Attributes
    ----------
    name : str
        Unique in a study.
    measure : str
        Name of the measure in the study file.
    dimension : exponents of (activity, length, time)
    may_not_occur : bool
        Whether there may be samples for which the quantity has no value (a level never reached).
    """

    name: str
    measure: ClassVar[str]
    dimension: Dimension
    may_not_occur: ClassVar[bool] = False

    def within_run(self, entry: str, time: float, duration: float) -> float:
        """The time, if it lies in [0, duration]; InputError otherwise."""
        if not 0.0 <= time <= duration:
            needed = f"a time from 0 to the duration {duration:g} is needed"
            raise InputError(self.key(entry), f"time {time:g}", needed)
        return time

    def ascending(self, entry: str, ends: tuple[float, float], duration: float) -> tuple[float, float]:
        """Both ends of a span of time, if they ascend and lie in [0, duration]; InputError otherwise."""
        for end in ends:
            self.within_run(entry, end, duration)
        if not ends[0] < ends[1]:
            found = f"[{ends[0]:g}, {ends[1]:g}]"
            raise InputError(self.key(entry), found, "the second time must be the later one")
        return ends

    @abstractmethod
    def times(self, duration: float) -> tuple[float, ...]:
        """Model times that must lie on the schedule."""

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError where the measure does not exist on the domain, or a point lies outside it."""
        return

    def takes_extremum(self, domain: Domain) -> bool:
        """Whether it looks for the largest or smallest value of the interpolant."""
        return False

    def is_peak_position(self, domain: Domain) -> bool:
        """Whether its error follows the rule for positions of a peak."""
        return False

    @property
    def bridged(self) -> bool:
        """Whether, under noise, it looks inside steps: it then needs the increments of the finest sub-steps."""
        return False

    @property
    def open_side(self) -> Side | None:
        """Under noise: the side on which the truth may lie at a distance that no order in the step bounds.

        Extremes over a window that are seen at the ends of steps only miss what the path does between them.
        """
        return None

    @property
    def open_occurrence(self) -> Side | None:
        """The same of its margin over a window: "above" where once is enough, "below" where it must be throughout."""
        return None

    @property
    def is_passage(self) -> bool:
        """Whether, under noise, it jumps as the path moves: a path that just misses reaches much later."""
        return False

    @property
    def defined_for_white_noise(self) -> bool:
        """Whether it has a limit as the mesh is refined under noise that is white in space."""
        return False

    @property
    def followed(self) -> str:
        """What its history shows, in words; empty where it is the quantity itself."""
        return ""

    @property
    def history_dimension(self) -> Dimension:
        """Exponents of (activity, length, time) of its history."""
        return self.dimension

    def key(self, entry: str) -> str:
        """Dotted path of an entry of this quantity, for errors."""
        return f"quantity.{self.name}.{entry}"

    @abstractmethod
    def observer(self, space: Space, duration: float, noise: NoisyPaths | None = None) -> Observer:
        """An observer of a *bound* quantity (levels are floats or (S,)) for states of `space`.

        Parameters
        ----------
        space : Space
        duration : float
            Of the run, units of time.
        noise : NoisyPaths, optional
            Of the batch; without it the steps are smooth, with it they are those of noisy paths.

        Raises
        ------
        InputError
            As `refuse_domain` does.
        """

    def history(self, space: Space, times: Sequence[float]) -> History | None:
        """An observer of a *bound* quantity at several times; None where it is not a number of one state."""
        return None

    def off_the_nodes(self, spaces: tuple[Space, ...]) -> bool:
        """Whether a point at which the field is evaluated is not a node of all the spaces."""
        return False
