"""Laws with a density, each by the inverse of its distribution function.

Moments and inverses are those of any handbook of distributions (Johnson, Kotz and Balakrishnan, "Continuous
univariate distributions", from memory). scipy is imported when a law first needs it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.randomness.law import Law


@dataclass(frozen=True)
class Uniform(Law):
    """Every value between low and high alike."""

    name = "uniform"
    arguments = ("low", "high")
    low: float
    high: float

    def _check(self) -> None:
        self._require_increasing(self.low, self.high)

    @property
    def mean(self) -> float:
        return self.low / 2 + self.high / 2

    @property
    def sd(self) -> float:
        return (self.high - self.low) / math.sqrt(12.0)

    @property
    def support(self) -> tuple[float, float]:
        return self.low, self.high

    def ppf(self, probability: FloatArray) -> FloatArray:
        return self.low + (self.high - self.low) * np.asarray(probability)

    def cdf(self, x: float | FloatArray) -> FloatArray:
        return np.clip((np.asarray(x) - self.low) / (self.high - self.low), 0.0, 1.0)


@dataclass(frozen=True)
class Normal(Law):
    """The Gaussian law with mean `mu` and standard deviation `sigma`."""

    name = "normal"
    arguments = ("mean", "sd")
    mu: float
    sigma: float

    def _check(self) -> None:
        self._require_positive("sd", self.sigma)

    @property
    def mean(self) -> float:
        return self.mu

    @property
    def sd(self) -> float:
        return self.sigma

    @property
    def support(self) -> tuple[float, float]:
        return -math.inf, math.inf

    def ppf(self, probability: FloatArray) -> FloatArray:
        from scipy.special import ndtri

        return self.mu + self.sigma * np.asarray(ndtri(probability))

    def cdf(self, x: float | FloatArray) -> FloatArray:
        from scipy.special import ndtr

        return np.asarray(ndtr((np.asarray(x) - self.mu) / self.sigma))


@dataclass(frozen=True)
class LogNormal(Law):
    """The exponential of a Gaussian number with mean `mu` and standard deviation `sigma`."""

    name = "lognormal"
    arguments = ("mu", "sigma")
    mu: float
    sigma: float

    def _check(self) -> None:
        self._require_positive("sigma", self.sigma)

    @property
    def mean(self) -> float:
        return float(np.exp(self.mu + self.sigma**2 / 2))

    @property
    def sd(self) -> float:
        return self.mean * float(np.sqrt(np.expm1(self.sigma**2)))

    @property
    def support(self) -> tuple[float, float]:
        return 0.0, math.inf

    def ppf(self, probability: FloatArray) -> FloatArray:
        from scipy.special import ndtri

        return np.exp(self.mu + self.sigma * np.asarray(ndtri(probability)))

    def cdf(self, x: float | FloatArray) -> FloatArray:
        from scipy.special import ndtr

        with np.errstate(divide="ignore"):
            logarithm = np.log(np.maximum(x, 0.0))
        return np.asarray(ndtr((logarithm - self.mu) / self.sigma))


@dataclass(frozen=True)
class LogUniform(Law):
    """A positive number whose logarithm is uniform."""

    name = "loguniform"
    arguments = ("low", "high")
    low: float
    high: float

    def _check(self) -> None:
        self._require_positive("low", self.low)
        self._require_increasing(self.low, self.high)

    @property
    def _span(self) -> float:
        """The length of the logarithm's interval."""
        return (
            math.log1p((self.high - self.low) / self.low)
            if self.high < 2 * self.low
            else (math.log(self.high) - math.log(self.low))
        )

    @property
    def mean(self) -> float:
        return (self.high - self.low) / self._span

    @property
    def sd(self) -> float:
        # With g = sqrt(low high) and s the span, variance / g^2 = sinh(s)/s - (2 sinh(s/2)/s)^2; this cancels
        # for small s, where its series is used, and overflows for large s, where high is factored out.
        s = self._span
        if s < 0.05:
            relative_variance = s**2 / 12 + s**4 / 180 + s**6 / 6720
            return math.sqrt(self.low) * math.sqrt(self.high) * math.sqrt(relative_variance)
        first = -math.expm1(-s) / s
        second = -math.expm1(-2 * s) / (2 * s)
        return self.high * math.sqrt(second - first**2)

    @property
    def support(self) -> tuple[float, float]:
        return self.low, self.high

    def ppf(self, probability: FloatArray) -> FloatArray:
        value = self.low * np.exp(self._span * np.asarray(probability))
        return np.clip(value, self.low, self.high)

    def cdf(self, x: float | FloatArray) -> FloatArray:
        return np.log(np.clip(x, self.low, self.high) / self.low) / self._span


@dataclass(frozen=True)
class Triangular(Law):
    """A density that rises linearly from low to its mode and falls linearly to high."""

    name = "triangular"
    arguments = ("low", "mode", "high")
    low: float
    mode: float
    high: float

    def _check(self) -> None:
        self._require_increasing(self.low, self.high)
        if not self.low <= self.mode <= self.high:
            raise self._fault(f"has mode = {self.mode!r}", "the mode must lie between low and high")

    @property
    def mean(self) -> float:
        return self.low / 3 + self.mode / 3 + self.high / 3

    @property
    def sd(self) -> float:
        a, b, width = self.mode - self.low, self.high - self.mode, self.high - self.low
        return width * math.sqrt(((a / width) ** 2 + (a / width) * (b / width) + (b / width) ** 2) / 18)

    @property
    def support(self) -> tuple[float, float]:
        return self.low, self.high

    def ppf(self, probability: FloatArray) -> FloatArray:
        p = np.asarray(probability)
        width = self.high - self.low
        rising = self.low + width * np.sqrt(p * ((self.mode - self.low) / width))
        falling = self.high - width * np.sqrt((1 - p) * ((self.high - self.mode) / width))
        return np.where(p * width < self.mode - self.low, rising, falling)

    def cdf(self, x: float | FloatArray) -> FloatArray:
        width = self.high - self.low
        x = np.clip(x, self.low, self.high)
        below, above = (x - self.low) / width, (self.high - x) / width
        with np.errstate(divide="ignore", invalid="ignore"):
            rising = below**2 / ((self.mode - self.low) / width)
            falling = 1 - above**2 / ((self.high - self.mode) / width)
        return np.where(x < self.mode, rising, np.where(above > 0, falling, 1.0))


@dataclass(frozen=True)
class Beta(Law):
    """The beta law with shapes a and b, stretched from (0, 1) to (low, high)."""

    name = "beta"
    arguments = ("a", "b", "low", "high")
    a: float
    b: float
    low: float
    high: float

    def _check(self) -> None:
        self._require_positive("a", self.a)
        self._require_positive("b", self.b)
        self._require_increasing(self.low, self.high)

    @property
    def mean(self) -> float:
        share = self.a / (self.a + self.b)
        return self.low * (1 - share) + self.high * share

    @property
    def sd(self) -> float:
        total = self.a + self.b
        return (self.high - self.low) * math.sqrt((self.a / total) * (self.b / total) / (total + 1))

    @property
    def support(self) -> tuple[float, float]:
        return self.low, self.high

    def ppf(self, probability: FloatArray) -> FloatArray:
        from scipy.special import betaincinv

        value = self.low + (self.high - self.low) * betaincinv(self.a, self.b, probability)
        return np.clip(value, self.low, self.high)

    def cdf(self, x: float | FloatArray) -> FloatArray:
        from scipy.special import betainc

        share = np.clip((np.asarray(x) - self.low) / (self.high - self.low), 0.0, 1.0)
        return np.asarray(betainc(self.a, self.b, share))


@dataclass(frozen=True)
class Gamma(Law):
    """The gamma law; its mean is shape times scale."""

    name = "gamma"
    arguments = ("shape", "scale")
    shape: float
    scale: float

    def _check(self) -> None:
        self._require_positive("shape", self.shape)
        self._require_positive("scale", self.scale)

    @property
    def mean(self) -> float:
        return self.shape * self.scale

    @property
    def sd(self) -> float:
        return math.sqrt(self.shape) * self.scale

    @property
    def support(self) -> tuple[float, float]:
        return 0.0, math.inf

    def ppf(self, probability: FloatArray) -> FloatArray:
        from scipy.special import gammaincinv

        return np.asarray(self.scale * gammaincinv(self.shape, probability), dtype=np.float64)

    def cdf(self, x: float | FloatArray) -> FloatArray:
        from scipy.special import gammainc

        return np.asarray(gammainc(self.shape, np.maximum(x, 0.0) / self.scale), dtype=np.float64)


@dataclass(frozen=True)
class Exponential(Law):
    """The exponential law; `scale` is its mean."""

    name = "exponential"
    arguments = ("mean",)
    scale: float

    def _check(self) -> None:
        self._require_positive("mean", self.scale)

    @property
    def mean(self) -> float:
        return self.scale

    @property
    def sd(self) -> float:
        return self.scale

    @property
    def support(self) -> tuple[float, float]:
        return 0.0, math.inf

    def ppf(self, probability: FloatArray) -> FloatArray:
        return -self.scale * np.log1p(-np.asarray(probability))

    def cdf(self, x: float | FloatArray) -> FloatArray:
        return np.asarray(-np.expm1(-np.maximum(x, 0.0) / self.scale))
