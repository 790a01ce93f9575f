"""A linear mode that relaxes at a rate, from rest: in continuous time, and by Euler-Maruyama steps."""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
from dataclasses import dataclass

import numpy as np

from tests.benchmarks.coverage.truth import FloatArray


@dataclass(frozen=True)
class Relaxation(ABC):
    """du = -rate u dt + I dt + dW, W of variance 1 per unit of time, up to a time `duration`."""

    duration: float

    @abstractmethod
    def decay(self, rate: FloatArray) -> FloatArray:
        """What is left of 1 at the start."""

    @abstractmethod
    def variance(self, rate: FloatArray) -> FloatArray:
        """Variance that the noise has built up."""

    def driven(self, rate: FloatArray) -> FloatArray:
        """What a constant input of 1 has built up."""
        return np.asarray((1 - self.decay(rate)) / rate)


@dataclass(frozen=True)
class Continuous(Relaxation):
    """The Ornstein-Uhlenbeck process (Uhlenbeck and Ornstein 1930, from memory)."""

    def decay(self, rate: FloatArray) -> FloatArray:
        """exp(-rate T)."""
        return np.asarray(np.exp(-rate * self.duration))

    def variance(self, rate: FloatArray) -> FloatArray:
        """(1 - exp(-2 rate T)) / (2 rate)."""
        return np.asarray(-np.expm1(-2 * rate * self.duration) / (2 * rate))


@dataclass(frozen=True)
class Stepped(Relaxation):
    """Euler-Maruyama in an even number of equal steps of at most `time_step` (Kloeden and Platen 1992, from memory)."""

    time_step: float

    @property
    def steps(self) -> int:
        """Number of steps."""
        return 2 * math.ceil(self.duration / (2 * self.time_step))

    def _kept(self, rate: FloatArray) -> FloatArray:
        return np.asarray(1 - rate * self.duration / self.steps)

    def decay(self, rate: FloatArray) -> FloatArray:
        """m^n, m = 1 - rate dt."""
        return np.asarray(self._kept(rate) ** self.steps)

    def variance(self, rate: FloatArray) -> FloatArray:
        """dt (1 - m^(2n)) / (1 - m^2)."""
        m = self._kept(rate)
        return np.asarray(self.duration / self.steps * (1 - m ** (2 * self.steps)) / (1 - m * m))
