"""Fields at requested times, read off the time loop."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.spaces import Space
from aleafield.stepping.view import AnyStep


class FieldRecorder:
    """Keeps nodal values at requested times; inside a step as the step interpolates its states.

    Parameters
    ----------
    space : Space
    times : increasing model times within [0, duration]
    n_samples : batch size S
    """

    def __init__(self, space: Space, times: Sequence[float], n_samples: int) -> None:
        self._space = space
        self._times = np.asarray(times, dtype=np.float64)
        self._fields = np.full((n_samples, len(self._times), space.n), np.nan)
        self._next = 0

    def start(self, t: float, u: FloatArray) -> None:
        """The initial state."""
        while self._next < len(self._times) and self._times[self._next] <= t:
            self._store(u)

    def step(self, view: AnyStep) -> None:
        """All requested times inside the step."""
        slack = 1e-9 * view.length
        while self._next < len(self._times) and self._times[self._next] <= view.t1 + slack:
            theta = (self._times[self._next] - view.t0) / view.length
            at_end = abs(self._times[self._next] - view.t1) <= slack
            self._store(view.u1 if at_end else view.state(float(theta)))

    def _store(self, u: FloatArray) -> None:
        self._fields[:, self._next, :] = self._space.nodal(u)[:, self._space.display_order]
        self._next += 1

    @property
    def fields(self) -> FloatArray:
        """Array (S, K, n), nodes in increasing x."""
        return self._fields

    def result(self) -> tuple[FloatArray, FloatArray | None]:
        """The recorder has no scalar value; this closes the observer protocol with nothing to report."""
        return np.zeros(0), None
