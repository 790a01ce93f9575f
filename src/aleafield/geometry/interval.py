"""A bounded interval of the line."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError


@dataclass(frozen=True)
class Interval:
    """The closed interval [low, high].

    Parameters
    ----------
    low, high : float
        End points in units of length, finite, low < high.

    Raises
    ------
    InputError
        Where an end point is not finite or the interval is empty.
    """

    low: float
    high: float
    periodic: ClassVar[bool] = False

    def __post_init__(self) -> None:
        for key, end in (("domain.from", self.low), ("domain.to", self.high)):
            if not math.isfinite(end):
                raise InputError(key, f"{end}", "a finite number is needed")
        if not self.low < self.high:
            raise InputError(
                "domain.to", f"{self.high} with from = {self.low}", "`to` must be greater than `from`"
            )

    @property
    def length(self) -> float:
        """high - low, in units of length."""
        return self.high - self.low

    def displacement(self, x: FloatArray, y: FloatArray) -> FloatArray:
        """Signed way x - y from y to x, broadcast shape of x and y, units of length."""
        return np.subtract(x, y)

    def distance(self, x: FloatArray, y: FloatArray) -> FloatArray:
        """|x - y|, broadcast shape of x and y, units of length."""
        return np.abs(self.displacement(x, y))

    def wrap(self, x: FloatArray) -> FloatArray:
        """The points as they are: an interval identifies no two points."""
        return np.asarray(x, dtype=np.float64)
