"""Random problems with noise whose laws are known: every mode of the field is an Ornstein-Uhlenbeck process.

The amplitude of mode k, normalised in L2, relaxes at the rate (1 - w_k) / tau under noise of variance
(sigma / tau)^2 q_k per unit of time, q_k the variance of that mode in the noise (Da Prato and Zabczyk, "Stochastic
Equations in Infinite Dimensions", section 5; from memory).  The truths are those of the continuous equation: what
Euler-Maruyama, the mesh and the dropped modes do to them is for the stated error to find.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np
from scipy.special import erf

from tests.benchmarks.coverage.families import (
    Instance,
    fourier_scheme,
    interval_scheme,
    pick,
    ring_scheme,
)
from tests.benchmarks.coverage.mixture import Certain, Entry, Mixture, chi_square, grid, normal
from tests.benchmarks.coverage.relaxation import Continuous, Relaxation, Stepped
from tests.benchmarks.coverage.truth import FloatArray, random_law

WAVES = np.arange(4001)
"""Waves that are summed; beyond, the kernel is 0 and what is left of the noise is added in closed form."""
FINEST, COARSEST = 0.03, 0.6
"""Time step over the shortest time constant of the field: from fine to pre-asymptotic."""

NO_KERNEL = (
    'form = "cosine"\ncoefficients = [0.0]',
    'form = "gaussian"\nstrength = 0.0\nwidth = 1.0',
)


def _step(rng: np.random.Generator, fastest: float) -> float:
    """A time step by the fastest rate of decay."""
    return float(np.exp(rng.uniform(np.log(FINEST), np.log(COARSEST)))) / fastest


def _kernel(rng: np.random.Generator, length: float) -> tuple[str, FloatArray]:
    """Study text and symbol w_k of a kernel on the ring, by wave."""
    gain = float(rng.uniform(-1.0, 0.7))
    kind = rng.integers(4)
    if kind == 0:
        shares = [gain, *(float(g) for g in rng.uniform(-0.5, 0.7, 2))]
        coefficients = [shares[0] / length, *(2 * g / length for g in shares[1:])]
        return f'form = "cosine"\ncoefficients = {coefficients!r}', _padded(shares)
    if kind == 1:
        ratio = float(rng.uniform(0.3, 0.6))
        return (
            'form = "formula"\nformula = "g/m*(1 - q**2)/(1 - 2*q*cos(2*pi*(x - y)/m) + q**2)"\n'
            f"g = {gain!r}\nq = {ratio!r}\nm = {length!r}",
            np.asarray(gain * ratio**WAVES),
        )
    width = length * float(rng.uniform(0.05, 0.2))
    frequency = 2 * np.pi * width / length * WAVES
    form = "gaussian" if kind == 2 else "exponential"
    symbol = np.exp(-0.5 * frequency**2) if kind == 2 else 1 / (1 + frequency**2)
    return f'form = "{form}"\nstrength = {gain!r}\nwidth = {width!r}', np.asarray(gain * symbol)


def _padded(values: list[float]) -> FloatArray:
    return np.concatenate([values, np.zeros(len(WAVES) - len(values))])


def _correlation(rng: np.random.Generator, length: float) -> tuple[str, FloatArray, float]:
    """Study text of a correlation on the ring, share of each wave +-k in the variance, and what is beyond WAVES."""
    kind = rng.integers(3)
    if kind == 0:
        coefficients = [float(c) for c in rng.uniform(0.2, 1.0, 4)]
        twice = np.where(WAVES > 0, 2, 1)
        share = _padded(coefficients) / sum(coefficients) / twice
        return f'correlation = "cosine"\ncoefficients = {coefficients!r}', share, 0.0
    reach = length * float(rng.uniform(0.05, 0.3))
    a = 2 * np.pi * reach / length
    if kind == 1:
        power = np.exp(-0.5 * (a * WAVES) ** 2)
        total = power[0] + 2 * power[1:].sum()
    else:
        power = 1 / (1 + (a * WAVES) ** 2)
        total = np.pi / a / np.tanh(np.pi / a)
    share = power / total
    name = "gaussian" if kind == 1 else "exponential"
    beyond = float(max(0.0, 1 - share[0] - 2 * share[1:].sum()))
    return f'correlation = "{name}"\ncorrelation_length = {reach!r}', share, beyond


def ring_modes(rng: np.random.Generator) -> Instance:
    """Linear ring, nothing uncertain but the noise: a value (normal) and a spectral power (scaled chi-square)."""
    length, tau = float(rng.uniform(1.0, 10.0)), float(rng.uniform(0.5, 2.0))
    duration, strength = tau * float(rng.uniform(0.8, 4.0)), float(rng.uniform(0.1, 1.0))
    kernel, symbol = _kernel(rng, length)
    correlation, share, beyond = _correlation(rng, length)
    at = length * float(rng.uniform(-0.5, 0.5))
    start = strength * float(rng.uniform(0.0, 2.0))
    wave = int(pick(rng, 0, 2))  # type: ignore[call-overload]
    kappa = (1 - symbol) / tau
    truth = Continuous(duration)
    variance = (strength / tau) ** 2 * share * truth.variance(kappa)
    pointwise = variance[0] + 2 * variance[1:].sum()
    pointwise += (strength / tau) ** 2 * beyond * float(truth.variance(np.array(1 / tau)))
    mean = start * np.cos(2 * np.pi * at / length) * truth.decay(kappa)[1]
    study = f"""
[domain]
shape = "ring"
length = {length!r}
[kernel]
{kernel}
[rate]
form = "linear"
[initial]
formula = "{start!r}*cos(2*pi*x/{length!r})"
[dynamics]
time_constant = {tau!r}
duration = {duration!r}
[noise]
strength = {strength!r}
{correlation}
[scheme]
{ring_scheme(rng)}
time_step = {_step(rng, float(kappa.max()))!r}
[[quantity]]
name = "value"
measure = "value"
at = {at!r}
[[quantity]]
name = "power"
measure = "spectral power"
wavenumber = {wave}
"""
    one = np.ones(1)
    value = Mixture(normal(mean * one, pointwise * one), one, False)
    power = Mixture(chi_square(1 if wave == 0 else 2)(variance[wave] * one), one, False)
    return Instance("noisy ring", study, {"value": value, "power": power}, inputs=False)


def uncertain_mode(rng: np.random.Generator) -> Instance:
    """Two waves of random rate, drive and noise from rest: a value (normal) and a power, given the inputs.

    Wave 1 is driven, both waves decay at the same rate, and both carry noise.  Fourier modes hold them exactly, so
    that the law of Euler-Maruyama itself is known.
    """
    duration = float(rng.uniform(1.0, 4.0))
    which = str(pick(rng, "rate", "drive", "noise", "rate and noise", "drive and noise", "drive"))

    def entry(name: str, low: float, high: float) -> Entry:
        if name in which:
            return random_law(rng, low, high)
        return Certain(0.5 * (low + high))

    low = float(rng.uniform(-0.5, 0.3))
    rate = entry("rate", low, low + float(rng.uniform(0.2, 0.4)))
    low = float(rng.uniform(-1.0, 0.5))
    drive = entry("drive", low, low + float(rng.uniform(1.0, 3.0)))
    low = float(rng.uniform(0.1, 0.5))
    noise = entry("noise", low, low + float(rng.uniform(0.1, 0.4)))
    second = float(rng.uniform(0.2, 1.0))
    (gain, level, strength), weights = grid([rate, drive, noise])
    kappa = 1 - gain
    step = _step(rng, float(kappa.max()))
    share = 0.5 * second / (1 + second)

    def laws(relaxation: Relaxation) -> Mapping[str, Mixture]:
        mean, variance = level * relaxation.driven(kappa), strength**2 * relaxation.variance(kappa)
        return {
            "value": Mixture(normal(mean, variance), weights, True),
            "power": Mixture(chi_square(2)(share * variance), weights, True),
        }

    study = f"""
[parameters]
g = "{rate.text}"
level = "{drive.text}"
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = [0.0, "g/pi", "g/pi"]
[rate]
form = "linear"
[drive]
formula = "level*cos(x)"
[dynamics]
time_constant = 1.0
duration = {duration!r}
[noise]
strength = "{noise.text}"
correlation = "cosine"
coefficients = [0.0, 1.0, {second!r}]
[scheme]
{fourier_scheme(rng)}
time_step = {step!r}
[[quantity]]
name = "value"
measure = "value"
at = 0.0
[[quantity]]
name = "power"
measure = "spectral power"
wavenumber = 2
"""
    repeats = int(pick(rng, 1, 2, 4, 4))  # type: ignore[call-overload]
    exact, stepped = laws(Continuous(duration)), laws(Stepped(duration, step))
    return Instance("noisy mode", study, exact, repeats, stepped=stepped)


def still_interval(rng: np.random.Generator) -> Instance:
    """No kernel: value and mean of a field that only decays, is driven and shaken; drive and length may be random."""
    length, tau = float(rng.uniform(1.0, 10.0)), float(rng.uniform(0.5, 2.0))
    duration, strength = tau * float(rng.uniform(0.8, 4.0)), float(rng.uniform(0.1, 1.0))
    low = float(rng.uniform(-1.0, 1.0))
    drive: Entry = Certain(low)
    if rng.integers(2):
        drive = random_law(rng, low, low + float(rng.uniform(0.2, 2.0)))
    reach: Entry = Certain(length * float(rng.uniform(0.2, 0.7)))
    if rng.integers(2):
        reach = random_law(rng, 0.2 * length, length * float(rng.uniform(0.4, 0.7)))
    inputs = not (isinstance(drive, Certain) and isinstance(reach, Certain))
    (level, ell), weights = grid([drive, reach])
    truth, rate = Continuous(duration), np.full_like(level, 1 / tau)
    mean = level / tau * truth.driven(rate)
    variance = (strength / tau) ** 2 * truth.variance(rate)
    start = -0.5 * length
    at = start + length * float(rng.uniform(0.02, 0.98))
    study = f"""
[domain]
shape = "interval"
from = {start!r}
to = {-start!r}
[kernel]
{pick(rng, *NO_KERNEL)}
[rate]
form = "linear"
[drive]
formula = "level"
level = "{drive.text}"
[dynamics]
time_constant = {tau!r}
duration = {duration!r}
[noise]
strength = {strength!r}
correlation = "gaussian"
correlation_length = "{reach.text}"
[scheme]
{interval_scheme(rng)}
time_step = {_step(rng, 1 / tau)!r}
[[quantity]]
name = "value"
measure = "value"
at = {at!r}
[[quantity]]
name = "mean"
measure = "mean"
"""
    truths = {
        "value": Mixture(normal(mean, variance), weights, inputs),
        "mean": Mixture(normal(mean, variance * averaged(length, ell)), weights, inputs),
    }
    repeats = int(pick(rng, 1, 2, 4)) if inputs else 1  # type: ignore[call-overload]
    return Instance("noisy interval", study, truths, repeats, inputs)


def averaged(length: float, reach: FloatArray) -> FloatArray:
    """Mean over two places x, y of an interval of exp(-(x - y)^2 / (2 l^2)); l = `reach`."""
    ratio = reach / length
    exact = np.sqrt(0.5 * np.pi) * erf(1 / (ratio * np.sqrt(2))) + ratio * np.expm1(-0.5 / ratio**2)
    return np.asarray(2 * ratio * exact)


NOISY_FAMILIES: tuple[Callable[[np.random.Generator], Instance], ...] = (
    ring_modes,
    uncertain_mode,
    still_interval,
    uncertain_mode,
)
"""Drawn in turn; twice the one that has most to part."""
