"""What a time stepper may know of a semi-discrete field."""

from __future__ import annotations

from typing import Protocol

from aleafield.arrays import FloatArray
from aleafield.stepping.view import StepView


class SemiDiscreteSystem(Protocol):
    """A system u' = F(t, u) for a batch of S samples with n unknowns each; it knows nothing of steps.

    Rows are independent: a row of F depends on the same row of u alone, to the bit, and a row that is not
    finite disturbs no other.
    """

    @property
    def restarts(self) -> bool:
        """Whether F may depend on `inside` at other times than the fixed ones of the schedule."""
        ...

    def initial(self) -> FloatArray:
        """State (S, n) at time 0."""
        ...

    def rate_of_change(self, t: float, u: FloatArray, inside: float | None = None) -> FloatArray:
        """F(t, u) as a fresh array (S, n); switches in time are decided at `inside`, within the step."""
        ...


class StepObserver(Protocol):
    """Follows the trajectory: the initial state, then every step.  Its arrays are never written again."""

    def start(self, t: float, u: FloatArray) -> None:
        """The initial state (S, n) at time t."""
        ...

    def step(self, view: StepView) -> None:
        """One step, with states and derivatives at both ends."""
        ...
