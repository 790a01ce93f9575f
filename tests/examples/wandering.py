"""The study of a wandering memory solved a second time: its Fourier modes, along the noise paths of the run.

The increments of the Wiener processes are taken as given (they have tests of their own); everything else is done
anew.  With u the real part of the sum of c_k e^(ikx) the equation is one for each c_k, and only c_1 meets the
others, through the crossings y of the threshold, where it changes by a_1 times the integral of e^(-iy) over the
active set.  The crossings are roots of the trigonometric polynomial itself, by Newton's method.  Time is left
to Heun's method, which for additive noise is of weak order 2 (Kloeden and Platen 1992, section 15.1, from
memory), with a quarter of the study's step.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from aleafield.randomness.wiener import WienerPaths

Array = NDArray[np.float64]
Amplitudes = NDArray[np.complex128]

SEED, BASE_STEP, BASE_STEPS = 23, 4.0, 250
"""The study's seed, its doubled step and how many of them there are."""
DEPTH = 3
"""Halvings of the doubled step: 0.5 ms."""
WAVES = 14
"""Waves of noise; those beyond are below 1e-6 of the variance at the shortest correlation length, 0.4."""
GRID = 2 * np.pi * np.arange(96) / 96
TAU = 10.0


def shares(correlation_length: Array) -> Array:
    """Shares p_k of the waves in C(z) = sum of p_k cos(kz), (S, WAVES + 1), by the sum over images."""
    z = 2 * np.pi * np.arange(256) / 256
    images = z[:, None] + 2 * np.pi * np.arange(-4, 5)
    values = np.exp(-(images**2) / (2 * correlation_length[:, None, None] ** 2)).sum(axis=-1)
    values /= values[:, :1]
    found = np.fft.rfft(values, axis=1).real[:, : WAVES + 1] / len(z)
    found[:, 1:] *= 2
    return np.asarray(np.maximum(found, 0.0))


def active(c: Amplitudes, threshold: Array) -> Amplitudes:
    """Integral of e^(-iy) over the set where the field exceeds its threshold, (S,)."""
    excess = on_circle(c, len(GRID)) - threshold[:, None]
    above = excess > 0
    sample, left = np.nonzero(above != np.roll(above, -1, axis=1))
    here, there = excess[sample, left], np.roll(excess, -1, axis=1)[sample, left]
    width = GRID[1]
    start = GRID[left]
    y = start + width * here / (here - there)
    order, of = np.arange(WAVES + 1), c[sample]
    for _ in range(2):
        terms = of * np.exp(1j * order * y[:, None])
        slope = -(order * terms.imag).sum(axis=1)
        y = np.clip(y - (terms.real.sum(axis=1) - threshold[sample]) / slope, start, start + width)
    ends = np.where(above[sample, left], 1j, -1j) * np.exp(-1j * y)
    real, imaginary = (np.bincount(sample, part, len(c)) for part in (ends.real, ends.imag))
    return np.asarray(real + 1j * imaginary)


def on_circle(c: Amplitudes, points: int) -> Array:
    """The field at equally spaced points, (S, points)."""
    weights = np.where(np.arange(WAVES + 1) == 0, 1.0, 0.5) * points
    return np.asarray(np.fft.irfft(c * weights, points, axis=1))


def wandering_memory(inputs: Mapping[str, Array]) -> dict[str, Array]:
    """Drift and diffusion between 200 and 1000 ms, and the height at the end."""
    threshold, coupling = inputs["rate.threshold"], inputs["kernel.coefficients.1"]
    size = len(threshold)
    sample, repeat = (inputs[key].astype(np.int64) for key in ("sample", "repeat"))
    paths = WienerPaths(SEED, sample, repeat, 2 * WAVES + 1, np.full(BASE_STEPS, BASE_STEP), DEPTH)
    amplitude = inputs["noise.strength"][:, None] * np.sqrt(shares(inputs["noise.correlation_length"])) / TAU
    drive = inputs["drive.pull"] * np.exp(-1.5j)
    step = BASE_STEP / 2**DEPTH

    def slope(c: Amplitudes) -> Amplitudes:
        change = -c
        change[:, 1] += drive + coupling * active(c, threshold)
        return change / TAU

    c = np.zeros((size, WAVES + 1), dtype=np.complex128)
    c[:, 1] = 1.9
    places = [np.zeros(size)]
    for k in range(BASE_STEPS):
        for dw in paths.base_step(k):
            waves = np.zeros_like(c)
            waves.real = dw[:, [0, *range(1, 2 * WAVES + 1, 2)]]
            waves[:, 1:] -= 1j * dw[:, 2::2]
            noise = amplitude * waves
            first = slope(c)
            c = c + 0.5 * step * (first + slope(c + step * first + noise)) + noise
        places.append(-np.angle(c[:, 1]))
    moved = np.unwrap(np.array(places), axis=0)
    early, late = moved[round(200 / BASE_STEP)], moved[-1]
    return {
        "drift": late - early,
        "diffusion": (late**2 - early**2) / (2 * 800.0),
        "height": on_circle(c, 8192).max(axis=1),
    }
