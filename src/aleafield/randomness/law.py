"""What every law of an input promises: a canonical text, moments, a distribution function and its inverse."""

from __future__ import annotations

import dataclasses
import math
from abc import ABC, abstractmethod
from dataclasses import dataclass
from numbers import Real
from typing import ClassVar

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError


@dataclass(frozen=True)
class Law(ABC):
    """The probability law of one uncertain number.

    A law is a frozen record of its arguments: equal laws have equal arguments, and it may be hashed and
    pickled. To add a law, derive a frozen dataclass whose fields are its arguments in the order in which a
    study file gives them, set `name` and `arguments`, check the arguments in `_check`, fill in the members
    below, and enter the class in `aleafield.randomness.laws.LAWS`.

    Attributes
    ----------
    name : str
        The word that a study file uses.
    arguments : tuple of str
        What a study file's documentation calls the arguments; one for every field.
    continuous : bool
        Whether no single value has a positive probability.

    Raises
    ------
    InputError
        On construction, when the arguments define no law; its key is empty, the reader fills it in.
    """

    name: ClassVar[str]
    arguments: ClassVar[tuple[str, ...]]
    continuous: ClassVar[bool] = True

    def __post_init__(self) -> None:
        self._convert()
        self._check()
        with np.errstate(all="ignore"):
            mean, sd = self.mean, self.sd
        if not (math.isfinite(mean) and math.isfinite(sd)):
            raise self._fault(f"has mean {mean} and sd {sd}", "both must be finite")
        if self.continuous and not sd > 0:
            raise self._fault("has no spread that numbers can hold", "write a certain number without a law")

    @property
    def text(self) -> str:
        """The law as a study file writes it, as ``uniform(0.8, 1.2)``; reading it gives an equal law."""
        return f"{self.name}({', '.join(repr(value) for value in dataclasses.astuple(self))})"

    @classmethod
    def signature(cls) -> str:
        """How the law is written, as ``uniform(low, high)``."""
        return f"{cls.name}({', '.join(cls.arguments)})"

    @property
    @abstractmethod
    def mean(self) -> float:
        """The expectation, in the units of the input."""

    @property
    @abstractmethod
    def sd(self) -> float:
        """The standard deviation, in the units of the input."""

    @property
    @abstractmethod
    def support(self) -> tuple[float, float]:
        """The smallest and the largest possible value; infinite where there is none."""

    @abstractmethod
    def ppf(self, probability: FloatArray) -> FloatArray:
        """The smallest value whose distribution function reaches the probability, elementwise.

        Parameters
        ----------
        probability : float array
            Strictly between 0 and 1.

        Returns
        -------
        float array
            Same shape, inside the support.
        """

    @abstractmethod
    def cdf(self, x: float | FloatArray) -> FloatArray:
        """The probability of a value of at most x, elementwise."""

    def probability_below(self, x: float) -> float:
        """The probability of a value less than x; for a continuous law the same as `cdf`."""
        return float(self.cdf(x))

    def _convert(self) -> None:
        """Makes every argument a finite float."""
        for field, argument in zip(dataclasses.fields(self), self.arguments, strict=True):
            object.__setattr__(self, field.name, self._finite(argument, getattr(self, field.name)))

    @abstractmethod
    def _check(self) -> None:
        """Raises InputError when the arguments, already converted, define no law."""

    def _finite(self, argument: str, value: object) -> float:
        if isinstance(value, bool | np.bool_) or not isinstance(value, Real):
            raise self._fault(f"has {argument} = {value!r}", f"{argument} is a number")
        number = float(value)
        if not math.isfinite(number):
            raise self._fault(
                f"has {argument} = {number}", f"{argument} is finite; a far limit serves as none"
            )
        return number

    def _fault(self, found: str, needed: str) -> InputError:
        fields = dataclasses.fields(self)[: len(self.arguments)]
        given = ", ".join(repr(getattr(self, field.name)) for field in fields)
        given = given if len(given) <= 80 else given[:77] + "..."
        return InputError("", f"{self.name}({given}) {found}", f"{needed}: {self.signature()}")

    def _require_positive(self, argument: str, value: float) -> None:
        if not value > 0:
            raise self._fault(f"has {argument} = {value!r}", f"{argument} must be positive")

    def _require_increasing(self, low: float, high: float) -> None:
        if not low < high:
            hint = " (a certain number is written without a law)" if low == high else ""
            raise self._fault(f"has low = {low!r} and high = {high!r}", f"low must be below high{hint}")
