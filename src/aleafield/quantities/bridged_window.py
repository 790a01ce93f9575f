"""The largest or smallest value of a linear functional of a noisy field over a window."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.quantities.bridge import BridgedFunctional
from aleafield.quantities.in_time import Clock
from aleafield.quantities.quantity import Over
from aleafield.stepping.view import AnyStep


class BridgedWindow:
    """Observer of the extreme of a linear functional over a window, by bridges inside the steps.

    Parameters
    ----------
    window : Over
        Reduced by its maximum or minimum; its ends lie on the schedule.
    inside : BridgedFunctional
    clock : Clock
    """

    def __init__(self, window: Over, inside: BridgedFunctional, clock: Clock) -> None:
        self._window, self._inside, self._clock = window, inside, clock
        self._value: FloatArray | None = None

    def start(self, t: float, u: FloatArray) -> None:
        """Nothing: the first step shows its initial state too."""

    def step(self, view: AnyStep) -> None:
        """The extreme so far, if the step lies in the window."""
        if not self._clock.within(view, self._window):
            return
        before = self._value
        with np.errstate(all="ignore"):
            bridges = self._inside(view)
            if self._window.reduce == "maximum":
                here = bridges.maximum()
                self._value = here if before is None else np.maximum(before, here)
            else:
                here = bridges.minimum()
                self._value = here if before is None else np.minimum(before, here)

    def result(self) -> tuple[FloatArray, None]:
        """Values (S,), NaN for samples that failed."""
        if self._value is None:
            raise RuntimeError(f"no step lies in {self._window}: the schedule must hold both ends")
        return self._value, None
