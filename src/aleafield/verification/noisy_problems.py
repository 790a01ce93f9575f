"""Problems with known answers under noise."""

from __future__ import annotations

import math
from functools import cache

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.verification.given_noise import CosinePaths, Impulses
from aleafield.verification.problem import KnownProblem, Series

_RING = np.linspace(0.1, 0.1 + 2 * np.pi, 401)[:-1]
"""From a point that is no node and where no wave of the noise vanishes."""

_WAVES = np.arange(5)
_DECAY = 1.0 - 0.7 * 0.5**_WAVES
"""Rate kappa_k at which wave k of the linear ring decays; the time constant is 1."""
_POWER = 0.3 * 0.6**_WAVES
"""Variance q_k that noise gives to each L2-normalised mode of wave k per unit of time."""
_DURATION, _STEPS = 2.0, 64

_LINEAR = f"""
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = {[w / (math.pi if k else 2 * math.pi) for k, w in enumerate((1.0 - _DECAY).tolist())]}
[rate]
form = "linear"
[dynamics]
time_constant = 1.0
duration = {_DURATION}
[noise]
strength = {math.sqrt((_POWER[0] + 2 * _POWER[1:].sum()) / (2 * math.pi))!r}
correlation = "cosine"
coefficients = {(_POWER * np.where(_WAVES, 2.0, 1.0)).tolist()}
"""


def _covariance(of_modes: FloatArray, x: FloatArray) -> FloatArray:
    """Covariance of the field at x with that at the first point, from the variance of each wave's modes."""
    terms = of_modes * np.where(_WAVES, 2.0, 1.0) / (2 * np.pi)
    return np.asarray(np.cos(np.outer(x - x[0], _WAVES)) @ terms)


def _exact_covariance(x: FloatArray) -> FloatArray:
    """Modes are Ornstein-Uhlenbeck processes: q (1 - e^(-2 kappa t)) / (2 kappa)."""
    return _covariance(_POWER * -np.expm1(-2 * _DECAY * _DURATION) / (2 * _DECAY), x)


def _own_covariance(x: FloatArray) -> FloatArray:
    """After n Euler-Maruyama steps: q dt (1 - m^(2n)) / (1 - m^2), m = 1 - kappa dt."""
    step = _DURATION / _STEPS
    m = 1.0 - _DECAY * step
    return _covariance(_POWER * step * (1 - m ** (2 * _STEPS)) / (1 - m**2), x)


_EXACT_LAW = KnownProblem(
    name="linear ring under noise: covariance",
    source="Da Prato and Zabczyk, Stochastic Equations in Infinite Dimensions, section 5 (from memory)",
    study=_LINEAR,
    exact=_exact_covariance,
    points=_RING,
    series=(Series("fourier", "collocation", "steps", (32, 64, 128), 1, 8e-4, nodes=16),),
    noise=Impulses(),
)

_OWN_LAW = KnownProblem(
    name=f"the same after {_STEPS} Euler-Maruyama steps",
    source="Kloeden and Platen 1992, Numerical Solution of Stochastic Differential Equations (from memory)",
    study=_LINEAR,
    exact=_own_covariance,
    points=_RING,
    series=(
        Series("fourier", "collocation", "nodes", (6, 8, 12), None, 1e-12, steps=_STEPS),
        Series("fourier", "galerkin", "nodes", (6, 8, 12), None, 1e-12, steps=_STEPS),
        Series("piecewise linear", "collocation", "nodes", (32, 64, 128), 2, 1.2e-4, steps=_STEPS),
    ),
    noise=Impulses(),
)

_PATHS = CosinePaths(realizations=256, depth=11, seed=29)


@cache
def _amplitudes() -> FloatArray:
    """dA = (-A + 0.6 int cos(y) f(A cos(y)) dy) dt + 0.3 dB from 0.8 to t = 1, (realizations,).

    By Heun's method with 2048 steps, on the paths of the noise; the integral by a sum over 64 points.
    """
    cosine = np.cos(2 * np.pi * np.arange(64) / 64)

    def drift(amplitude: FloatArray) -> FloatArray:
        rate = 1.0 / (1.0 + np.exp(-6.0 * (amplitude[:, None] * cosine - 0.4)))
        return np.asarray(-amplitude + 0.6 * (2 * np.pi / 64) * (rate * cosine).sum(axis=1))

    path = _PATHS.path(1.0)
    step = 1.0 / len(path)
    found: FloatArray = np.full(_PATHS.realizations, 0.8)
    for increment in path:
        slope, noise = drift(found), 0.3 * increment
        found = found + 0.5 * step * (slope + drift(found + step * slope + noise)) + noise
    return found


_STRONG = KnownProblem(
    name="logistic field under noise, path by path",
    source="exact reduction to one equation, solved along the same paths with 2048 steps",
    study="""
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = [0.0, 0.6]
[rate]
form = "logistic"
gain = 6.0
threshold = 0.4
[initial]
formula = "0.8*cos(x)"
[dynamics]
time_constant = 1.0
duration = 1.0
[noise]
strength = 0.3
correlation = "cosine"
coefficients = [0.0, 1.0]
""",
    exact=lambda x: np.outer(_amplitudes(), np.cos(x)),
    points=_RING,
    series=(Series("fourier", "collocation", "steps", (16, 32, 64), 1, 1e-3, nodes=48, order_tolerance=0.1),),
    noise=_PATHS,
)

NOISY_PROBLEMS = (_EXACT_LAW, _OWN_LAW, _STRONG)
"""All of them, in the order in which they are printed."""
