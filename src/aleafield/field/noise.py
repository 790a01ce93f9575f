"""Noise in the tissue: a Wiener process with a covariance in space, tau du = (..) dt + sigma dW.

Cov[W(x, s), W(y, t)] = min(s, t) C(|x - y|) with C(0) = 1.  W is a sum of independent Wiener processes times
sines and cosines of a ring: of the domain itself, or of a longer one that contains an interval.  They are the
same functions on every mesh and for every correlation length; only the variances q_j of the modes change.
"""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import ClassVar, Literal

import numpy as np
from scipy.special import digamma, erfc

from aleafield.arrays import FloatArray, IntArray
from aleafield.errors import InputError
from aleafield.field.parameter import (
    IMPROBABLE,
    Bindable,
    Bound,
    ImpossibleValue,
    Parameter,
    bound,
    number,
    per_sample,
)
from aleafield.formula import Formula
from aleafield.geometry import Domain
from aleafield.randomness.laws import Law
from aleafield.units import ACTIVITY, DIMENSIONLESS, LENGTH

Roughness = Literal["smooth", "rough", "white"]
"""Paths in space: with all derivatives, continuous as those of Brownian motion are, or no functions at all."""

_TERMS = np.arange(1, 6)
"""Terms of a theta function on the better side of its self-dual point: the sixth is below 1e-49."""
_SUMMED = np.arange(1, 257)
_SLOW = 0.05
"""Decay a up to which tails of exp(-(a k)^2 / 2) are integrals; above it the 256 terms next in line are enough."""
_EXTREME = 1e150
"""Where 2 pi l / R is cut off, so that squares and reciprocals are numbers."""


def wave_numbers(modes: int) -> IntArray:
    """Wave number k of each mode, shape (modes,): 0, 1, 1, 2, 2, .."""
    return np.asarray((np.arange(modes) + 1) // 2, dtype=np.int64)


def mode_functions(x: FloatArray, modes: int, length: float) -> FloatArray:
    """The modes at points x (T,), orthonormal in L2 of the ring of that length; shape (modes, T).

    sqrt(1/R), then sqrt(2/R) cos(2 pi k x / R) and sqrt(2/R) sin(2 pi k x / R) for k = 1, 2, ..
    """
    waves = wave_numbers(modes)
    turns = waves[:, None] * (x / length)[None, :]
    angle = 2.0 * np.pi * (turns - np.rint(turns))
    values = np.sqrt(2.0 / length) * np.where(
        (np.arange(modes) % 2 == 1)[:, None], np.cos(angle), np.sin(angle)
    )
    values[0] = np.sqrt(1.0 / length)
    return np.asarray(values)


class Correlation(Bindable, ABC):
    """Covariance in space, up to the strength of the noise.

    To add one: a frozen dataclass with `number` fields, the members below, and an entry in the study reader's
    table of forms.

    Attributes
    ----------
    name : str
        Name in a study file.
    roughness : "smooth", "rough" or "white"
    """

    name: ClassVar[str]
    roughness: ClassVar[Roughness]

    @abstractmethod
    def spectrum(self, modes: int, length: float) -> FloatArray:
        """Variances q_j of the first modes on a ring of that length, (modes,) or (S, modes), of a bound object.

        Scaled to C(0) = 1: the q_j of all modes sum to the length.  White: ones, C is the delta function.
        """

    @abstractmethod
    def dropped(self, modes: int, length: float) -> Bound | None:
        """Share of the variance beyond the first modes (whole pairs), float or (S,); None: not defined."""

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError where the covariance does not exist on the domain."""
        return


@dataclass(frozen=True)
class LengthCorrelation(Correlation):
    """A covariance of a distance with a correlation length l, units of length.

    On a ring of length R it is summed over all images and divided by its value at 0.  By Poisson's summation
    the variance of the waves +-k is then proportional to the Fourier transform at 2 pi k / R, that is to
    `_power` of a k with a = 2 pi l / R.
    """

    correlation_length: Parameter = number(LENGTH, positive=True)
    reach: ClassVar[float]
    """Distance, in units of l, beyond which C is below 1e-6."""

    @staticmethod
    @abstractmethod
    def on_line(distance: FloatArray) -> FloatArray:
        """C at a distance in units of l, not summed over images."""

    @staticmethod
    @abstractmethod
    def _power(frequency: FloatArray) -> FloatArray:
        """Fourier transform of `on_line` over its value at 0."""

    @staticmethod
    @abstractmethod
    def _total(a: FloatArray) -> FloatArray:
        """Sum of `_power` (a k) over all whole numbers k."""

    @staticmethod
    @abstractmethod
    def _share_beyond(a: FloatArray, waves: int) -> FloatArray:
        """Sum of `_power` (a k) over |k| > waves, over `_total`; without cancellation."""

    def _decay(self, length: float) -> FloatArray:
        """a = 2 pi l / R, () or (S,)."""
        with np.errstate(over="ignore", under="ignore"):
            ratio = np.asarray(bound(self.correlation_length), dtype=np.float64) * (2.0 * np.pi / length)
        return np.clip(ratio, 1.0 / _EXTREME, _EXTREME)

    def spectrum(self, modes: int, length: float) -> FloatArray:
        """R times the share of each wave in the sum over all waves."""
        a = self._decay(length)
        with np.errstate(over="ignore", under="ignore"):
            power = self._power(a[..., None] * wave_numbers(modes))
            return np.asarray(length * power / self._total(a)[..., None])

    def dropped(self, modes: int, length: float) -> Bound:
        """Share of the variance in waves beyond those of the modes, with its full relative accuracy."""
        a = self._decay(length)
        with np.errstate(over="ignore", under="ignore"):
            share = self._share_beyond(a, (modes - 1) // 2)
        return share if share.ndim else float(share)

    @classmethod
    def ring_around(cls, interval: float, longest: float) -> float:
        """Length of the ring that contains an interval, for correlation lengths up to `longest`."""
        return max(2.0 * interval, interval + cls.reach * longest)

    @classmethod
    def image_error(cls, interval: float, ring: float, longest: float) -> float:
        """Largest change of C on the interval by the images on the ring, for lengths up to `longest`.

        With I the sum of the images, the change is (I(z) - C(z) I(0)) / (1 + I(0)), z the distance.  C falls
        and I grows with z (R - z is beyond the point of inflection), so it is largest at the interval's length.
        """
        images = np.asarray(ring * _TERMS, dtype=np.float64)
        far = np.asarray(np.concatenate((images - interval, images + interval)) / longest, dtype=np.float64)
        at_end = float(cls.on_line(far).sum())
        at_zero = 2.0 * float(cls.on_line(images / longest).sum())
        here = float(cls.on_line(np.array(interval / longest)))
        return max(0.0, at_end - here * at_zero) / (1.0 + at_zero)


@dataclass(frozen=True)
class GaussianCorrelation(LengthCorrelation):
    """C(r) = exp(-r^2 / (2 l^2)): paths in space are smooth."""

    name: ClassVar[str] = "gaussian"
    roughness: ClassVar[Roughness] = "smooth"
    reach: ClassVar[float] = 5.3

    @staticmethod
    def on_line(distance: FloatArray) -> FloatArray:
        """exp(-d^2 / 2), d the distance in units of l."""
        return np.asarray(np.exp(-0.5 * distance**2))

    @staticmethod
    def _power(frequency: FloatArray) -> FloatArray:
        return np.asarray(np.exp(-0.5 * frequency**2))

    @staticmethod
    def _total(a: FloatArray) -> FloatArray:
        """A theta function: its own series where it converges fast, else that of the images (Jacobi)."""
        dual = 2.0 * np.pi / a
        series = [1.0 + 2.0 * np.exp(-0.5 * (b[..., None] * _TERMS) ** 2).sum(axis=-1) for b in (a, dual)]
        root = math.sqrt(2.0 * math.pi)
        return np.asarray(np.where(a >= root, series[0], root / a * series[1]))

    @staticmethod
    def _share_beyond(a: FloatArray, waves: int) -> FloatArray:
        """Summed where few terms count, else an integral by the midpoint rule of Euler and Maclaurin.

        With f(k) = exp(-(a k)^2 / 2) and x = a (waves + 1/2) the sum over k > waves is the integral of f from
        waves + 1/2 on, + f'/24 - 7 f'''/5760 there; the next term is below 1e-8 of it for shares above 1e-6.
        """
        summed = np.exp(-0.5 * (a[..., None] * (waves + _SUMMED)) ** 2).sum(axis=-1)
        slow = np.minimum(a, _SLOW)
        x = slow * (waves + 0.5)
        edge = np.exp(-0.5 * x**2)
        integral = math.sqrt(0.5 * math.pi) / slow * erfc(x / math.sqrt(2.0))
        integral += edge * (-slow * x / 24.0 - 7.0 * slow**3 * (3.0 * x - x**3) / 5760.0)
        tail = np.where(a > _SLOW, summed, integral)
        return np.asarray(2.0 * tail / GaussianCorrelation._total(a))


@dataclass(frozen=True)
class ExponentialCorrelation(LengthCorrelation):
    """C(r) = exp(-r / l): paths in space are as rough as those of Brownian motion."""

    name: ClassVar[str] = "exponential"
    roughness: ClassVar[Roughness] = "rough"
    reach: ClassVar[float] = 14.0

    @staticmethod
    def on_line(distance: FloatArray) -> FloatArray:
        """exp(-d), d the distance in units of l."""
        return np.asarray(np.exp(-distance))

    @staticmethod
    def _power(frequency: FloatArray) -> FloatArray:
        return np.asarray(1.0 / (1.0 + frequency**2))

    @staticmethod
    def _total(a: FloatArray) -> FloatArray:
        """(pi / a) coth(pi / a)."""
        b = np.pi / a
        return np.asarray(b / np.tanh(b))

    @staticmethod
    def _share_beyond(a: FloatArray, waves: int) -> FloatArray:
        """By the digamma function psi: the sum of 1 / (1 + (a k)^2) over k > waves is Im psi(waves + 1 + i/a) / a.

        References
        ----------
        NIST Digital Library of Mathematical Functions, 5.7.6: psi as a sum over its poles (from memory).
        """
        angle = digamma(np.asarray(waves + 1 + 1j / a, dtype=np.complex128)).imag
        return np.asarray(2.0 / np.pi * angle * np.tanh(np.pi / a))


@dataclass(frozen=True)
class CosineCorrelation(Correlation):
    """C(z) = sum_k c_k cos(2 pi k z / length) over the sum of the c_k, on a ring of that length; c_k >= 0."""

    coefficients: tuple[Parameter, ...] = number(DIMENSIONLESS, not_negative=True)
    name: ClassVar[str] = "cosine"
    roughness: ClassVar[Roughness] = "smooth"

    @property
    def modes(self) -> int:
        """Number of modes that have a coefficient, 1 or more whole pairs besides the constant."""
        return 2 * max(1, len(self.coefficients) - 1) + 1

    def _shares(self) -> FloatArray:
        """c_k over their sum, (K,) or (S, K)."""
        values = [np.asarray(bound(c), dtype=np.float64) for c in self.coefficients]
        c = np.stack(np.broadcast_arrays(*values), axis=-1)
        c = c / c.max(axis=-1, keepdims=True)  # first, so that no sum overflows
        return np.asarray(c / c.sum(axis=-1, keepdims=True))

    def spectrum(self, modes: int, length: float) -> FloatArray:
        """R c_0, then R c_k / 2 for the cosine and the sine of each wave."""
        shares = self._shares()
        waves = wave_numbers(modes)
        missing = max(0, int(waves[-1]) + 1 - shares.shape[-1])
        padded = np.concatenate((shares, np.zeros((*shares.shape[:-1], missing))), axis=-1)
        return np.asarray(length * padded[..., waves] * np.where(waves == 0, 1.0, 0.5))

    def dropped(self, modes: int, length: float) -> Bound:
        """Sum of the shares beyond the waves of the modes; 0 when there are none."""
        share = self._shares()[..., (modes - 1) // 2 + 1 :].sum(axis=-1)
        return share if share.ndim else float(share)

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError on an interval: the waves are those of a ring."""
        if not domain.periodic:
            raise InputError(
                "noise.correlation",
                "'cosine' on an interval",
                "its waves close on a ring; use 'gaussian' or 'exponential' with a correlation_length",
            )

    def refuse_impossible_laws(self, prefix: str, certain: Mapping[str, float]) -> None:
        """Refuse besides coefficients of which none is positive (InputError)."""
        super().refuse_impossible_laws(prefix, certain)
        share = math.prod(_probability_of_zero(c, certain) for c in self.coefficients)
        if share > IMPROBABLE:
            how = "" if share == 1.0 else f" with probability {share:.3g}"
            raise InputError(f"{prefix}.coefficients", f"none of them is positive{how}", _ONE_POSITIVE)

    def impossible_samples(self, prefix: str) -> Iterator[ImpossibleValue]:
        """Besides: samples in which no coefficient is positive."""
        yield from super().impossible_samples(prefix)
        values = [np.atleast_1d(bound(c)) for c in self.coefficients]
        for position in np.flatnonzero(np.all([v <= 0 for v in np.broadcast_arrays(*values)], axis=0)):
            path = f"{prefix}.coefficients"
            yield ImpossibleValue(path, int(position), "no positive coefficient", _ONE_POSITIVE)


_ONE_POSITIVE = "one coefficient at least must be positive"


def _probability_of_zero(value: Parameter, certain: Mapping[str, float]) -> float:
    """Probability that a coefficient is 0; that of an expression of inputs is left to the samples."""
    if isinstance(value, Law):
        return float(value.cdf(0.0))
    if isinstance(value, Formula):
        return float(value.names <= certain.keys() and not float(value.evaluate(certain)) > 0)
    return float(not value > 0)


@dataclass(frozen=True)
class WhiteCorrelation(Correlation):
    """C = delta: the strength is in units of activity times the root of a time and a length."""

    name: ClassVar[str] = "white"
    roughness: ClassVar[Roughness] = "white"

    def spectrum(self, modes: int, length: float) -> FloatArray:
        """Ones, shape (modes,)."""
        return np.ones(modes)

    def dropped(self, modes: int, length: float) -> None:
        """None: the variance is not finite."""
        return


@dataclass(frozen=True)
class Noise(Bindable):
    """Strength sigma and covariance of the noise.

    Parameters
    ----------
    strength : Parameter
        sigma >= 0 in units of activity times the root of a time, for white noise also of a length.  Unit labels
        know whole exponents only: times (and lengths) are counted in the study's unit, and the label is that
        of activity.
    correlation : Correlation
    """

    strength: Parameter = number(ACTIVITY, not_negative=True)
    correlation: Correlation  # type: ignore[misc]  # `number` gives `strength` no default

    def amplitudes(self, modes: int, length: float) -> FloatArray:
        """sigma sqrt(q_j) of a bound object, (modes,) or (S, modes)."""
        return np.asarray(per_sample(self.strength, 1) * np.sqrt(self.correlation.spectrum(modes, length)))
