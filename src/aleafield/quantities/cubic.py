"""A quantity inside a time step: a cubic of the fraction of the step, one for each sample."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.quantities.roots import bracketed_roots

_RESOLUTION = 4 * float(np.finfo(np.float64).eps)
"""Fractions of a step that differ by less are one."""


@dataclass(frozen=True)
class Cubic:
    """p(theta) = start + a theta + b theta^2 + c theta^3 on [0, 1], with p(1) = end; all arrays (S,).

    A sample whose values are not finite has NaN for every result.
    """

    start: FloatArray
    end: FloatArray
    a: FloatArray
    b: FloatArray
    c: FloatArray

    @classmethod
    def hermite(cls, v0: FloatArray, rise0: FloatArray, v1: FloatArray, rise1: FloatArray) -> Self:
        """With values v0, v1 and derivatives rise0, rise1 by theta (not by time) at the ends: order 4."""
        change = v1 - v0
        return cls(v0, v1, rise0, 3 * change - 2 * rise0 - rise1, rise0 + rise1 - 2 * change)

    @classmethod
    def through(cls, v0: FloatArray, v1: FloatArray, v2: FloatArray, v3: FloatArray) -> Self:
        """Through the values at theta = 0, 1/3, 2/3 and 1: the cubic itself if they are those of a cubic."""
        a = (-11 * v0 + 18 * v1 - 9 * v2 + 2 * v3) / 2
        b = 9 * (2 * v0 - 5 * v1 + 4 * v2 - v3) / 2
        c = 9 * (v3 - v0 + 3 * (v1 - v2)) / 2
        return cls(v0, v3, a, b, c)

    def __call__(self, theta: FloatArray) -> FloatArray:
        """Values at theta (S,), or (K, S)."""
        return self.start + theta * (self.a + theta * (self.b + theta * self.c))

    def slope(self, theta: FloatArray) -> FloatArray:
        """Derivative by theta at theta (S,)."""
        return self.a + theta * (2 * self.b + 3 * theta * self.c)

    def of(self, which: IntArray) -> Cubic:
        """The cubics of a choice of samples."""
        return Cubic(self.start[which], self.end[which], self.a[which], self.b[which], self.c[which])

    def mean(self) -> FloatArray:
        """The exact integral over the step, divided by its length."""
        return self.start + self.a / 2 + self.b / 3 + self.c / 4

    def turning_points(self) -> FloatArray:
        """The two places between 0 and 1 where the slope vanishes, ascending, 0 for those that do not exist;
        (2, S).

        The roots of the quadratic are taken in the form that does not cancel, which is right for c = 0 too.
        """
        with np.errstate(all="ignore"):
            q = -(self.b + np.copysign(np.sqrt(self.b * self.b - 3 * self.a * self.c), self.b))
            roots = np.stack((q / (3 * self.c), self.a / q))
        return np.sort(np.where((roots > 0) & (roots < 1), roots, 0.0), axis=0)

    def maximum(self) -> FloatArray:
        """Largest value in the step, in closed form."""
        turned = self(self.turning_points()).max(axis=0)
        return np.asarray(np.maximum(np.maximum(self.start, self.end), turned))

    def first_reach(self, level: FloatArray) -> FloatArray:
        """The first theta at which p >= level, for cubics that start below it and have maximum() >= level.

        The turning points part the step into pieces on which p is monotone; the root lies in the first piece
        whose end is not below the level.  This finds a rise above the level that is over within the step.
        """
        knots = np.concatenate((np.zeros((1, len(level))), self.turning_points(), np.ones((1, len(level)))))
        values = np.concatenate((self(knots[:3]), self.end[None, :]))
        piece = (values >= level).argmax(axis=0)
        samples = np.arange(len(level))
        left, right = knots[piece - 1, samples], knots[piece, samples]

        def above_level(which: IntArray, theta: FloatArray) -> tuple[FloatArray, FloatArray]:
            chosen = self.of(which)
            return chosen(theta) - level[which], chosen.slope(theta)

        return bracketed_roots(above_level, right, left, 0.5 * (left + right), _RESOLUTION)
