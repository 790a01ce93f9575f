"""The shipped studies solved a second time, by other means: oracles that owe nothing to the package.

Each takes the inputs of S samples (path -> array (S,)) and gives the quantities (name -> array (S,), NaN
where they do not occur).  The numbers that the studies hold as certain are written here again.  Integrals are
Gauss-Legendre or periodic trapezoid sums of smooth functions at more points than the studies have, time is
left to scipy's adaptive method of order 8, positions are found by bisection in the interpolant; the front is
followed by its interface equation.  The study with noise has a module of its own; its inputs hold the numbers
"sample" and "repeat" of each realization besides.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

import numpy as np
from numpy.polynomial.legendre import leggauss, legval, legvander
from numpy.typing import NDArray
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from tests.examples.wandering import wandering_memory

Array = NDArray[np.float64]
Oracle = Callable[[Mapping[str, Array]], dict[str, Array]]


def course(rate: Callable[[float, Array], Any], span: tuple[float, float], start: Array) -> Any:
    """Solution of a system by scipy's method of order 8, with its interpolant in `sol`."""
    return solve_ivp(rate, span, start, "DOP853", dense_output=True, rtol=1e-9, atol=1e-11)


def gaussian(z: Array, strength: Array | float, width: Array | float) -> Array:
    """Kernel values (S, ..) for distances z; strength and width (S,) or numbers."""
    width = np.reshape(width, (-1, 1, 1))
    scale = np.reshape(strength, (-1, 1, 1)) / (np.sqrt(2 * np.pi) * width)
    return np.asarray(scale * np.exp(-(z**2) / (2 * width**2)))


def logistic(u: Array, gain: Array, threshold: Array) -> Array:
    """Rates (S, n)."""
    return np.asarray(1.0 / (1.0 + np.exp(-gain[:, None] * (u - threshold[:, None]))))


def half_width(value: Callable[[Array], Array], right: float, level: Array) -> Array:
    """Where a decreasing function crosses its level (S,) between 0 and `right`, by bisection, (S,)."""
    low, high = np.zeros(len(level)), np.full(len(level), right)
    for _ in range(60):
        middle = 0.5 * (low + high)
        above = value(middle) > level
        low, high = np.where(above, middle, low), np.where(above, high, middle)
    return np.asarray(0.5 * (low + high))


def evoked_response(inputs: Mapping[str, Array]) -> dict[str, Array]:
    """Stimulus of 20 ms on [-10, 10]; the field is even, so that its maximum is at 0, a Gauss point."""
    n_samples, n = len(inputs["h"]), 161
    reference, weights = leggauss(n)
    x, middle = 10.0 * reference, n // 2
    distance = x[:, None] - x[None, :]
    kernel = gaussian(distance, 1.4, inputs["kernel.excitation.width"])
    kernel += gaussian(distance, inputs["kernel.inhibition.strength"], 2.0)
    kernel *= 10.0 * weights
    stimulus = inputs["drive.a"][:, None] * np.exp(-(x**2) / (2 * 1.5**2))
    tau = inputs["dynamics.time_constant"][:, None]

    def change(on: float) -> Callable[[float, Array], Array]:
        def rate(_: float, flat: Array) -> Array:
            u = flat.reshape(n_samples, n)
            source = logistic(u, inputs["rate.gain"], inputs["h"])
            return np.asarray((-u + (kernel @ source[:, :, None])[:, :, 0] + on * stimulus) / tau).ravel()

        return rate

    during = course(change(1.0), (0, 20), np.zeros(n_samples * n))
    end = during.y[:, -1]
    after = course(change(0.0), (20, 40), end)

    def centre(t: float) -> Array:
        u = (during if t <= 20 else after).sol(t).reshape(n_samples, n)
        assert np.array_equal(u.argmax(axis=1), np.full(n_samples, middle)), "the maximum is not at 0"
        return np.asarray(u[:, middle])

    times = np.linspace(1.0, 40.0, 3901)
    heights = np.array([centre(t) for t in times])

    def passage(i: int) -> float:
        return brentq(lambda t: float(centre(t)[i]) - 0.3, 0.01, 20.0, xtol=1e-10)

    coefficients = np.linalg.solve(legvander(reference, n - 1), end.reshape(n_samples, n).T)
    side = half_width(
        lambda a: np.asarray(legval(a / 10.0, coefficients, tensor=False), dtype=np.float64),
        10.0,
        np.full(n_samples, 0.3),
    )
    latency = np.array([passage(i) for i in range(n_samples)])
    return {"width": 2 * side, "peak": heights.max(axis=0), "latency": latency}


def bump_on_a_ring(inputs: Mapping[str, Array]) -> dict[str, Array]:
    """A bump after 300 ms on the ring of length 2 pi, even about 0; kernels summed over 19 images."""
    n_samples, n = len(inputs["rate.gain"]), 192
    x = 2 * np.pi * np.arange(n) / n
    images = 2 * np.pi * np.arange(-9, 10)
    distance = x[None, :] + images[:, None]
    row = gaussian(distance, inputs["kernel.excitation.strength"], 0.5).sum(axis=1)
    row += gaussian(distance, inputs["kernel.inhibition.strength"], 2.0).sum(axis=1)
    symbol = np.fft.rfft(row * (2 * np.pi / n), axis=1)

    def rate(_: float, flat: Array) -> Array:
        u = flat.reshape(n_samples, n)
        source = logistic(u, inputs["rate.gain"], inputs["h"])
        return np.asarray((-u + np.fft.irfft(symbol * np.fft.rfft(source, axis=1), n, axis=1)) / 15.0).ravel()

    start = np.tile(1.4 * np.exp(2.0 * (np.cos(x) - 1)), n_samples)
    end = course(rate, (0, 300), start).y[:, -1].reshape(n_samples, n)
    waves = np.fft.rfft(end, axis=1).real * np.where(np.arange(n // 2 + 1) % (n // 2), 2.0, 1.0) / n
    order = np.arange(n // 2 + 1)
    finely = 64 * np.fft.irfft(np.fft.rfft(end, axis=1), 64 * n, axis=1)  # a wide bump has its peaks beside 0
    amplitude = finely.max(axis=1)
    side = half_width(lambda a: (waves * np.cos(order * a[:, None])).sum(axis=1), float(np.pi), inputs["h"])
    return {"amplitude": amplitude, "width": np.where(amplitude > inputs["h"], 2 * side, np.nan)}


def travelling_front(inputs: Mapping[str, Array]) -> dict[str, Array]:
    """Ahead of the interface X(t) the field is known: u = h exp(-x - t/tau) + Y(t) exp(-x/width)/2.

    With tau Y' = exp(X/width) - Y, and X where u is the threshold h; active tissue reaches far to the left.
    """
    columns = (inputs[path] for path in ("h", "kernel.width", "dynamics.time_constant"))
    found = np.array([_interface(*map(float, row)) for row in zip(*columns, strict=True)])
    return {"speed": found[:, 0], "passage": found[:, 1]}


def _interface(h: float, width: float, tau: float) -> tuple[float, float]:
    """Speed between t = 30 and 60, and the time at which X = 6."""

    def position(t: float, amplitude: float) -> float:
        def excess(x: float) -> float:
            return float(h * np.exp(-x - t / tau) + 0.5 * amplitude * np.exp(-x / width) - h)

        return brentq(excess, -1.0, 40.0, xtol=1e-13)

    def rate(t: float, y: Array) -> list[float]:
        return [(np.exp(position(t, float(y[0])) / width) - float(y[0])) / tau]

    amplitude = course(rate, (0, 80), np.zeros(1))
    at = {t: position(t, float(amplitude.sol(t)[0])) for t in (30.0, 60.0)}

    def beyond(t: float) -> float:
        return position(t, float(amplitude.sol(t)[0])) - 6.0

    passage = brentq(beyond, 1.0, 80.0, xtol=1e-10) if beyond(80.0) >= 0 else float("nan")
    return (at[60.0] - at[30.0]) / 30.0, passage


def which_input_matters(inputs: Mapping[str, Array]) -> dict[str, Array]:
    """Flanked stimulus on a ring of 24 mm: periodised Gaussians and patches, 60 ms from rest."""
    excitation, inhibition = inputs["excitation"], inputs["inhibition"]
    coupling, contrast = inputs["coupling"][:, None], inputs["contrast"][:, None]
    n_samples, n, length = len(excitation), 120, 24.0
    x = (np.arange(n) - n // 2) * (length / n)
    distance = x[:, None] - x[None, :]
    kernel = np.zeros((n_samples, n, n))
    for image in range(-3, 4):
        kernel += gaussian(distance + image * length, excitation, 1.0)
        kernel -= gaussian(distance + image * length, inhibition, inputs["kernel.inhibition.width"])
    shortest = np.abs((distance + length / 2) % length - length / 2)
    patches = np.exp(-((shortest - 4) ** 2) / 2) + np.exp(-((shortest + 4) ** 2) / 2)
    kernel += coupling[:, :, None] * patches / (2 * np.sqrt(2 * np.pi))
    kernel *= length / n
    stimulus = inputs["drive.centre"][:, None] * np.exp(-(x**2) / 2)
    stimulus += contrast * (np.exp(-((x - 4) ** 2) / 2) + np.exp(-((x + 4) ** 2) / 2))
    stimulus += (inhibition - excitation)[:, None] - coupling
    tau, threshold = inputs["dynamics.time_constant"][:, None], np.zeros(n_samples)

    def change(_: float, flat: Array) -> Array:
        u = flat.reshape(n_samples, n)
        source = 2.0 * logistic(u, inputs["rate.gain"], threshold)
        return np.asarray((-u + (kernel @ source[:, :, None])[:, :, 0] + stimulus) / tau).ravel()

    solution = course(change, (0, 60), np.zeros(n_samples * n))
    end = solution.y[:, -1].reshape(n_samples, n)

    def passage(i: int) -> float:
        return brentq(lambda t: float(solution.sol(t)[i * n + n // 2]) - 0.5, 0.01, 60.0, xtol=1e-10)

    latency = np.array([passage(i) for i in range(n_samples)])
    return {"response": end[:, n // 2], "latency": latency, "mean": end.mean(axis=1)}


ORACLES: dict[str, Oracle] = {
    "evoked_response": evoked_response,
    "bump_on_a_ring": bump_on_a_ring,
    "travelling_front": travelling_front,
    "wandering_memory": wandering_memory,
    "which_input_matters": which_input_matters,
}
