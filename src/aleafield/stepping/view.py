"""One time step as observers see it."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.arrays import FloatArray


@dataclass(frozen=True)
class StepView:
    """States u0, u1 (S, n) at times t0 < t1, and their derivatives du0, du1 taken from inside the step."""

    t0: float
    u0: FloatArray
    du0: FloatArray
    t1: float
    u1: FloatArray
    du1: FloatArray

    @property
    def length(self) -> float:
        """Length t1 - t0 of the step, units of time."""
        return self.t1 - self.t0

    def state(self, theta: float) -> FloatArray:
        """Cubic Hermite interpolant at t0 + theta (t1 - t0), 0 <= theta <= 1, shape (S, n)."""
        if theta == 0.0:
            return self.u0
        if theta == 1.0:
            return self.u1
        h = self.length
        a = (1 + 2 * theta) * (1 - theta) ** 2
        b = theta * (1 - theta) ** 2 * h
        c = theta**2 * (3 - 2 * theta)
        d = theta**2 * (theta - 1) * h
        return a * self.u0 + b * self.du0 + c * self.u1 + d * self.du1


@dataclass(frozen=True)
class NoisyStep:
    """States u0, u1 (S, n) of a noisy path at times t0 < t1, and the noise between them.

    Attributes
    ----------
    index : int
        Number of the step in its schedule, from 0.
    increments : float array (P, S, m)
        Of the modes' Wiener processes over P equal sub-steps, in time order; P = 1 unless something looks inside.
    """

    t0: float
    u0: FloatArray
    t1: float
    u1: FloatArray
    index: int
    increments: FloatArray

    @property
    def length(self) -> float:
        """Length t1 - t0 of the step, units of time."""
        return self.t1 - self.t0

    def state(self, theta: float) -> FloatArray:
        """Linear interpolant at t0 + theta (t1 - t0), 0 <= theta <= 1, shape (S, n)."""
        if theta == 0.0:
            return self.u0
        if theta == 1.0:
            return self.u1
        return (1.0 - theta) * self.u0 + theta * self.u1


AnyStep = StepView | NoisyStep
"""A step of a smooth or of a noisy trajectory."""
