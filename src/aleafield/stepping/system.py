"""What a time stepper may know of a semi-discrete field, of its noise and of those who watch."""

from __future__ import annotations

from typing import Protocol, TypeVar

from aleafield.arrays import FloatArray
from aleafield.stepping.view import NoisyStep, StepView

SomeStep = TypeVar("SomeStep", StepView, NoisyStep, contravariant=True)


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


class NoisySystem(SemiDiscreteSystem, Protocol):
    """A system du = F(t, u) dt + G dW with m independent Wiener processes; G may differ from row to row."""

    def noise(self, increments: FloatArray) -> FloatArray:
        """G times increments (S, m) of the Wiener processes, as a fresh array (S, n); row by row, to the bit."""
        ...


class IncrementSource(Protocol):
    """Wiener increments over the base steps of a study, each cut into equal sub-steps."""

    def base_step(self, k: int) -> FloatArray:
        """Those over the sub-steps of base step k, in time order, as a fresh array (sub-steps, S, m)."""
        ...


class StepObserver(Protocol[SomeStep]):
    """Follows the trajectory: the initial state, then every step.  Its arrays are never written again."""

    def start(self, t: float, u: FloatArray) -> None:
        """The initial state (S, n) at time t."""
        ...

    def step(self, view: SomeStep) -> None:
        """One step, with states at both ends and what is known between them."""
        ...
