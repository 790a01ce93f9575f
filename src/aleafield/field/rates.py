"""Firing rates f(u)."""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import ClassVar, Literal

import numpy as np
from scipy.special import expit, ndtr

from aleafield.arrays import FloatArray
from aleafield.field.formula_term import FormulaTerm
from aleafield.field.parameter import (
    Bindable,
    Bound,
    Parameter,
    as_bound,
    bound,
    number,
    per_sample,
)
from aleafield.units import ACTIVITY, DIMENSIONLESS, PER_ACTIVITY

Smoothness = Literal["smooth", "kinked", "step"]


class Rate(Bindable, ABC):
    """A firing rate; bound numbers are floats or (S,), activities have shape (S, P)."""

    @property
    @abstractmethod
    def smoothness(self) -> Smoothness:
        """ "smooth", "kinked" (continuous, derivative jumps) or "step"."""

    @property
    def bounded(self) -> bool:
        """Whether f is bounded, as the convergence theory asks."""
        return True

    @abstractmethod
    def __call__(self, u: FloatArray) -> FloatArray:
        """f(u), shape (S, P)."""

    @abstractmethod
    def slope(self) -> Bound | None:
        """Largest |f'| of a bound rate, float or (S,); None where it is not known in closed form."""


@dataclass(frozen=True)
class GainRate(Rate):
    """maximum g(gain (u - threshold)), g rising from 0 to 1: what a subclass adds is g and its largest slope."""

    gain: Parameter = number(PER_ACTIVITY, positive=True)
    threshold: Parameter = number(ACTIVITY, default=0.0)
    maximum: Parameter = number(DIMENSIONLESS, default=1.0)

    steepest: ClassVar[float]

    @staticmethod
    @abstractmethod
    def shape(argument: FloatArray) -> FloatArray:
        """The function g, elementwise."""

    @property
    def smoothness(self) -> Smoothness:
        return "smooth"

    def __call__(self, u: FloatArray) -> FloatArray:
        argument = u - per_sample(self.threshold, 1)
        argument *= per_sample(self.gain, 1)
        return np.asarray(self.shape(argument) * per_sample(self.maximum, 1))

    def slope(self) -> Bound | None:
        return as_bound(np.abs(bound(self.maximum) * bound(self.gain)) * self.steepest)


@dataclass(frozen=True)
class LogisticRate(GainRate):
    """maximum / (1 + exp(-gain (u - threshold)))."""

    steepest: ClassVar[float] = 0.25

    @staticmethod
    def shape(argument: FloatArray) -> FloatArray:
        """The logistic function."""
        return np.asarray(expit(argument))


@dataclass(frozen=True)
class NormalOgiveRate(GainRate):
    """maximum Phi(gain (u - threshold)), Phi the standard normal distribution function."""

    steepest: ClassVar[float] = 1 / math.sqrt(2 * math.pi)

    @staticmethod
    def shape(argument: FloatArray) -> FloatArray:
        """The standard normal distribution function."""
        return np.asarray(ndtr(argument))


@dataclass(frozen=True)
class RampRate(GainRate):
    """maximum min(1, max(0, gain (u - threshold)))."""

    steepest: ClassVar[float] = 1.0

    @property
    def smoothness(self) -> Smoothness:
        return "kinked"

    @staticmethod
    def shape(argument: FloatArray) -> FloatArray:
        """The ramp from 0 to 1."""
        return np.clip(argument, 0.0, 1.0)


@dataclass(frozen=True)
class StepRate(Rate):
    """maximum where u > threshold, else 0; integrated with its threshold crossings resolved."""

    threshold: Parameter = number(ACTIVITY, default=0.0)
    maximum: Parameter = number(DIMENSIONLESS, default=1.0)

    @property
    def smoothness(self) -> Smoothness:
        return "step"

    def __call__(self, u: FloatArray) -> FloatArray:
        return np.asarray((u > per_sample(self.threshold, 1)) * per_sample(self.maximum, 1))

    def slope(self) -> Bound | None:
        return None


@dataclass(frozen=True)
class LinearRate(Rate):
    """gain (u - threshold): not bounded."""

    gain: Parameter = number(PER_ACTIVITY, default=1.0)
    threshold: Parameter = number(ACTIVITY, default=0.0)

    @property
    def smoothness(self) -> Smoothness:
        return "smooth"

    @property
    def bounded(self) -> bool:
        return False

    def __call__(self, u: FloatArray) -> FloatArray:
        return np.asarray((u - per_sample(self.threshold, 1)) * per_sample(self.gain, 1))

    def slope(self) -> Bound | None:
        return as_bound(np.abs(bound(self.gain)))


@dataclass(frozen=True)
class FormulaRate(Rate):
    """f(u) by a formula of u."""

    term: FormulaTerm

    @property
    def smoothness(self) -> Smoothness:
        return "kinked" if self.term.kinks_in("u") else "smooth"

    @property
    def bounded(self) -> bool:
        return False

    def __call__(self, u: FloatArray) -> FloatArray:
        return np.array(np.broadcast_to(self.term.evaluate({"u": u}, axes=1), u.shape))

    def slope(self) -> Bound | None:
        return None
