"""Functions of the unit cube whose Sobol' indices are known."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.randomness.points import PlainPoints, SobolPoints


@dataclass(frozen=True, eq=False)
class KnownFunction:
    """A function u (N, d) -> (N,), its variance and its first and total indices (d,)."""

    name: str
    evaluate: Callable[[FloatArray], FloatArray]
    variance: float
    first: FloatArray
    total: FloatArray

    @property
    def inputs(self) -> int:
        """d."""
        return len(self.first)


def product_indices(mean: FloatArray, variance: FloatArray) -> tuple[float, FloatArray, FloatArray]:
    """Variance, first and total indices of a product of independent factors, in closed form."""
    relative = variance / mean**2
    whole = np.prod(1 + relative) - 1
    return (
        float(whole * np.prod(mean**2)),
        relative / whole,
        relative * np.prod(1 + relative) / (1 + relative) / whole,
    )


def _product(
    name: str, evaluate: Callable[[FloatArray], FloatArray], mean: FloatArray, var: FloatArray
) -> KnownFunction:
    return KnownFunction(name, evaluate, *product_indices(mean, var))


def _ishigami(u: FloatArray) -> FloatArray:
    x = np.pi * (2 * u - 1)
    y: FloatArray = np.sin(x[:, 0]) + 7 * np.sin(x[:, 1]) ** 2 + 0.1 * x[:, 2] ** 4 * np.sin(x[:, 0])
    return y


def g_function(a: tuple[float, ...]) -> Callable[[FloatArray], FloatArray]:
    """prod (|4 u_i - 2| + a_i) / (1 + a_i)."""
    offset = np.array(a)
    return lambda u: np.prod((np.abs(4 * u - 2) + offset) / (1 + offset), axis=1)


def _g(name: str, a: tuple[float, ...]) -> KnownFunction:
    offset = np.array(a)
    return _product(name, g_function(a), np.ones(len(a)), 1 / (3 * (1 + offset) ** 2))


def _front(u: FloatArray) -> FloatArray:
    h, s, tau = 0.2 + 0.2 * u[:, 0], 0.8 + 0.4 * u[:, 1], 8 + 4 * u[:, 2]
    return s / tau * (1 / (2 * h) - 1)


_LOG2, _LOG15 = np.log(2.0), np.log(1.5)
_FRONT_MEAN = np.array([0.5 * _LOG2 / 0.2 - 1, 1.0, _LOG15 / 4])
_FRONT_VARIANCE = np.array([0.25 / 0.08 - (0.5 * _LOG2 / 0.2) ** 2, 0.04 / 3, 1 / 96 - (_LOG15 / 4) ** 2])

_MODE = np.array([0.25, 0.0041, 4.1e-7])
"""Variances of the factors of the nearly additive product."""


def _mode(u: FloatArray) -> FloatArray:
    y: FloatArray = np.prod(1 + np.sqrt(3 * _MODE) * (2 * u - 1), axis=1)
    return y


def _jump(u: FloatArray) -> FloatArray:
    y: FloatArray = (u[:, 0] > 0.2 + 0.6 * u[:, 1]) * (1 + 0.3 * u[:, 2])
    return y


ISHIGAMI = KnownFunction(
    "Ishigami",
    _ishigami,
    13.84458794072,
    np.array([0.3139051911478, 0.44241114479, 0.0]),
    np.array([0.55758885521, 0.44241114479, 0.2436836640621]),
)
"""Ishigami and Homma 1990, from memory; the numbers recomputed by a tensor Gauss rule to 1e-14."""
G4 = _g("g4", (0.0, 1.0, 4.5, 9.0))
"""Saltelli and Sobol' 1995, from memory."""
G8 = _g("g8", (0.0, 1.0, 4.5, 9.0, 99.0, 99.0, 99.0, 99.0))
FRONT = _product("front", _front, _FRONT_MEAN, _FRONT_VARIANCE)
"""Speed of a front, s / tau (1 / (2 h) - 1): a product of independent factors."""
MODE = _product("mode", _mode, np.ones(3), _MODE)
JUMP = KnownFunction(
    "jump",
    _jump,
    0.334375,
    np.array([0.593271028037, 0.118654205607, 0.005607476636]),
    np.array([0.875065420561, 0.397757009346, 0.011214953271]),
)
"""1{u1 > .2 + .6 u2} (1 + .3 u3); by hand: E over two of the three is piecewise linear or constant."""
FUNCTIONS = (ISHIGAMI, G4, G8, FRONT, MODE, JUMP)


def scrambled(columns: int, points: int, seed: int) -> tuple[FloatArray, IntArray]:
    """Unit points (16 points, columns) of 16 scramblings and the scrambling of each."""
    index = np.arange(16 * points)
    return SobolPoints(columns, seed).at(index), index % 16


def plain(columns: int, rows: int, seed: int) -> tuple[FloatArray, IntArray]:
    """Independent unit points (rows, columns) and the block, of 16, of each."""
    index = np.arange(rows)
    return PlainPoints(columns, seed).at(index), index % 16
