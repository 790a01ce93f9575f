"""Histories: a number of one state, followed at chosen times."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.stepping.view import AnyStep

_SAME_TIME = 1e-9
"""Share of a step within which a time is the end of the step."""


class History:
    """Observer of a number of one state at several times.

    Inside a step the state is interpolated as the step says: linearly under noise, else by its cubic.

    Parameters
    ----------
    number : callable
        (u (S, n), time) -> values (S,), NaN where there is none.
    times : model times within the run, increasing
    """

    def __init__(self, number: Callable[[FloatArray, float], FloatArray], times: Sequence[float]) -> None:
        self._number, self._times = number, [float(time) for time in times]
        self._taken: list[FloatArray] = []

    def start(self, t: float, u: FloatArray) -> None:
        """The number of the initial state, if its time is asked for."""
        if self._times and self._times[0] <= t:
            self._take(u)

    def step(self, view: AnyStep) -> None:
        """The number at all times inside the step and at its end."""
        slack = _SAME_TIME * view.length
        while len(self._taken) < len(self._times):
            time = self._times[len(self._taken)]
            if time > view.t1 + slack:
                break
            at_end = time >= view.t1 - slack
            with np.errstate(all="ignore"):
                self._take(view.u1 if at_end else view.state((time - view.t0) / view.length))

    def _take(self, u: FloatArray) -> None:
        self._taken.append(self._number(u, self._times[len(self._taken)]))

    @property
    def values(self) -> FloatArray:
        """The numbers (S, K) at the K times; RuntimeError before the last of them has been shown."""
        if len(self._taken) < len(self._times):
            raise RuntimeError(f"the trajectory ended before time {self._times[len(self._taken)]}")
        return np.stack(self._taken, axis=1)
