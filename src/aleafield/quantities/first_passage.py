"""The measure "time to level": when the field at a point first reaches a level."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.field.parameter import Parameter, number
from aleafield.geometry import Domain
from aleafield.quantities.cubic import Cubic
from aleafield.quantities.point import PointEvaluation, off_the_nodes, refuse_outside
from aleafield.quantities.quantity import Observer, Quantity
from aleafield.spaces import Space
from aleafield.stepping.view import StepView
from aleafield.units import ACTIVITY, TIME


@dataclass(frozen=True)
class TimeToLevel(Quantity):
    """First t with u(at, t) >= level: 0 if so at the start.

    Inside a step the value at the point is its cubic Hermite interpolant, of order 4 in the step; a rise to
    the level that is over before the step ends is found too.  It occurs where the running maximum over the
    whole run, that of the cubics, is not below the level; their difference is the margin.

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

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError where the point lies outside."""
        refuse_outside(self.at, domain, self.key("at"))

    def times(self, duration: float) -> tuple[float, ...]:
        """The end of the run."""
        return (duration,)

    def observer(self, space: Space, duration: float) -> Observer:
        """Follows the value at the point through all steps."""
        self.refuse_domain(space.domain)
        return PassageObserver(PointEvaluation(space, self.at), self.level)  # type: ignore[arg-type]

    def off_the_nodes(self, spaces: tuple[Space, ...]) -> bool:
        """Whether the point is not a node of each piecewise-linear space."""
        return off_the_nodes(self.at, spaces)


class PassageObserver:
    """First passage of the value at a point through a level, and its running maximum.

    Parameters
    ----------
    evaluate : PointEvaluation
    level : float or array (S,)
    """

    def __init__(self, evaluate: PointEvaluation, level: float | FloatArray) -> None:
        self._evaluate, self._given_level = evaluate, level
        self._level = self._highest = self._time = np.empty(0)

    def start(self, t: float, u: FloatArray) -> None:
        """Whether the level is reached at once."""
        with np.errstate(all="ignore"):
            self._highest = self._evaluate(u)
        self._level = np.broadcast_to(np.asarray(self._given_level, dtype=np.float64), self._highest.shape)
        self._time = np.where(self._highest >= self._level, t, np.nan)

    def step(self, view: StepView) -> None:
        """Look for the first passage inside the step, in the samples that have had none."""
        length = view.length
        with np.errstate(all="ignore"):
            value = Cubic.hermite(
                self._evaluate(view.u0),
                length * self._evaluate(view.du0),
                self._evaluate(view.u1),
                length * self._evaluate(view.du1),
            )
            highest = value.maximum()
            reached = np.flatnonzero((highest >= self._level) & ~(self._highest >= self._level))
            theta = value.of(reached).first_reach(self._level[reached])
        self._time[reached] = view.t0 + theta * length
        self._highest = np.maximum(self._highest, highest)

    def result(self) -> tuple[FloatArray, FloatArray | None]:
        """Times (S,), NaN where the level is not reached, and running maximum - level (S,)."""
        with np.errstate(all="ignore"):
            margin = self._highest - self._level
        return np.where(margin >= 0, self._time, np.nan), margin
