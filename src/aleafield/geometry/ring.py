"""A circle, cut open at the point opposite the origin."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError


@dataclass(frozen=True)
class Ring:
    """The line with points that differ by a multiple of `length` made one; coordinates run over [low, high).

    Parameters
    ----------
    length : float
        Circumference in units of length, positive and finite.

    Raises
    ------
    InputError
        Where the length is not positive or not finite.
    """

    length: float
    periodic: ClassVar[bool] = True

    def __post_init__(self) -> None:
        if not (math.isfinite(self.length) and self.length > 0.0):
            raise InputError("domain.length", f"{self.length}", "a positive finite number is needed")

    @property
    def low(self) -> float:
        """-length / 2, a point of the ring."""
        return -0.5 * self.length

    @property
    def high(self) -> float:
        """length / 2, the same point as `low` and therefore no coordinate of its own."""
        return 0.5 * self.length

    def wrap(self, x: FloatArray) -> FloatArray:
        """Coordinates in [low, high) of the points x, same shape.

        A coordinate that lies there already is returned to the bit.
        """
        x = np.asarray(x, dtype=np.float64)
        with np.errstate(invalid="ignore"):
            turned = x - self.length * np.floor(x / self.length + 0.5)
            turned = np.where(turned >= self.high, self.low, np.maximum(turned, self.low))
        inside = (x >= self.low) & (x < self.high)
        return np.where(inside, x, turned)

    def displacement(self, x: FloatArray, y: FloatArray) -> FloatArray:
        """Signed shortest way from y to x in [low, high), broadcast shape of x and y, units of length."""
        return self.wrap(np.subtract(x, y))

    def distance(self, x: FloatArray, y: FloatArray) -> FloatArray:
        """Length of the shorter arc between x and y, broadcast shape of x and y, units of length."""
        return np.abs(self.displacement(x, y))
