"""The measure "time to level": when the field at a point first reaches a level."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.field.parameter import Parameter, number
from aleafield.geometry import Domain
from aleafield.quantities.bridge import BridgedFunctional
from aleafield.quantities.cubic import Cubic
from aleafield.quantities.functional import LinearFunctional
from aleafield.quantities.noisy import NoisyPaths
from aleafield.quantities.point import off_the_nodes, point_evaluation, refuse_outside, value_at
from aleafield.quantities.quantity import Observer, Quantity
from aleafield.spaces import Space
from aleafield.stepping.view import AnyStep, StepView
from aleafield.units import ACTIVITY, TIME


@dataclass(frozen=True)
class TimeToLevel(Quantity):
    """First t with u(at, t) >= level: 0 if so at the start.

    Inside a step the value at the point is its cubic Hermite interpolant, of order 4 in the step; under noise
    it is a Brownian bridge.  A rise to the level that is over before the step ends is found too.  It occurs
    where the running maximum over the whole run, inside steps too, is not below the level; their difference is
    the margin.

    Parameters
    ----------
    name : str
    level : number
        Units of activity, may be uncertain.
    at : float
        Point of the domain, units of length.
    """

    measure = "time to level"
    dimension = TIME
    may_not_occur = True
    name: str
    level: Parameter = number(ACTIVITY)
    at: float = 0.0

    @property
    def is_passage(self) -> bool:
        """It jumps from one excursion of the path to the next."""
        return True

    @property
    def bridged(self) -> bool:
        """It looks inside steps."""
        return True

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError where the point lies outside."""
        refuse_outside(self.at, domain, self.key("at"))

    def times(self, duration: float) -> tuple[float, ...]:
        """The end of the run."""
        return (duration,)

    def observer(self, space: Space, duration: float, noise: NoisyPaths | None = None) -> Observer:
        """Follows the value at the point through all steps."""
        self.refuse_domain(space.domain)
        value = LinearFunctional(point_evaluation(space, self.at))
        name = f"maximum of {value_at(self.at)}"
        inside = SmoothFunctional(value) if noise is None else BridgedFunctional(value, noise, name)
        return PassageObserver(value, inside, self.level)  # type: ignore[arg-type]

    def off_the_nodes(self, spaces: tuple[Space, ...]) -> bool:
        """Whether the point is not a node of each piecewise-linear space."""
        return off_the_nodes(self.at, spaces)


class Course(Protocol):
    """A number of each sample inside one step."""

    def of(self, which: IntArray) -> Course:
        """Those of a choice of samples."""
        ...

    def maximum(self) -> FloatArray:
        """Largest value in the step, (S,)."""
        ...

    def first_reach(self, level: FloatArray) -> FloatArray:
        """Share of the step at which a level (S,) is first reached, for those that start below and reach it."""
        ...


class SmoothFunctional:
    """A linear functional of a smooth field inside a step: its cubic Hermite interpolant.

    Parameters
    ----------
    functional : LinearFunctional
    """

    def __init__(self, functional: LinearFunctional) -> None:
        self._functional = functional

    def __call__(self, step: AnyStep) -> Cubic:
        """The cubics of a step."""
        assert isinstance(step, StepView)
        of, length = self._functional, step.length
        return Cubic.hermite(of(step.u0), length * of(step.du0), of(step.u1), length * of(step.du1))


class PassageObserver:
    """First passage of a linear functional through a level, and its running maximum.

    Parameters
    ----------
    functional : LinearFunctional
    inside : callable
        Gives the course of the functional inside a step.
    level : float or array (S,)
    """

    def __init__(
        self,
        functional: LinearFunctional,
        inside: Callable[[AnyStep], Course],
        level: float | FloatArray,
    ) -> None:
        self._functional, self._inside, self._given_level = functional, inside, level
        self._level = self._highest = self._time = np.empty(0)

    def start(self, t: float, u: FloatArray) -> None:
        """Whether the level is reached at once."""
        with np.errstate(all="ignore"):
            self._highest = self._functional(u)
        self._level = np.broadcast_to(np.asarray(self._given_level, dtype=np.float64), self._highest.shape)
        self._time = np.where(self._highest >= self._level, t, np.nan)

    def step(self, view: AnyStep) -> None:
        """Look for the first passage inside the step, in the samples that have had none."""
        with np.errstate(all="ignore"):
            course = self._inside(view)
            highest = course.maximum()
            reached = np.flatnonzero((highest >= self._level) & ~(self._highest >= self._level))
            theta = course.of(reached).first_reach(self._level[reached])
            self._highest = np.maximum(self._highest, highest)
        self._time[reached] = view.t0 + theta * view.length

    def result(self) -> tuple[FloatArray, FloatArray | None]:
        """Times (S,), NaN where the level is not reached, and running maximum - level (S,)."""
        with np.errstate(all="ignore"):
            margin = self._highest - self._level
        return np.where(margin >= 0, self._time, np.nan), margin
