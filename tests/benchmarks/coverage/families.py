"""Random problems with known answers, as study files.

Every family draws kernel, law, projector, level and schedule from ranges that include pre-asymptotic meshes and
coarse steps, so that both discretisation and sampling dominate somewhere.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from scipy import optimize, stats

from tests.benchmarks.coverage.truth import FloatArray, Known, Law, Truth, random_law


@dataclass(frozen=True)
class Instance:
    """A study file's model part and the exact statistics of its quantities.

    `repeats` are the noise paths of a parameter sample; without `inputs` only noise is random.  `stepped` are the
    statistics of the scheme itself, where they are known.
    """

    family: str
    study: str
    truths: Mapping[str, Known]
    repeats: int = 1
    inputs: bool = True
    stepped: Mapping[str, Known] | None = None


def pick(rng: np.random.Generator, *options: object) -> object:
    """One of the options."""
    return options[int(rng.integers(len(options)))]


def ring_scheme(rng: np.random.Generator) -> str:
    """Projector, nodes, method and quadrature of a ring, as study text."""
    kind = rng.integers(3)
    if kind == 0:
        return f'projector = "piecewise linear"\nnodes = {int(rng.integers(8, 40)) * 2}\nmethod = "{_method(rng)}"'
    return fourier_scheme(rng)


def fourier_scheme(rng: np.random.Generator) -> str:
    """Fourier modes, at least 5 of them."""
    quadrature = pick(rng, "matched", "trapezoid")
    return (
        f'projector = "fourier"\nnodes = {int(rng.integers(5, 16))}\nmethod = "{_method(rng)}"\n'
        f'quadrature = "{quadrature}"'
    )


def interval_scheme(rng: np.random.Generator) -> str:
    """Projector, nodes, method and quadrature of an interval, as study text."""
    kind = rng.integers(5)
    if kind <= 1:
        method = _method(rng)
        quadrature = pick(rng, "matched", "trapezoid")
        nodes = 2 * int(rng.integers(4, 20)) + 1
        return f'projector = "piecewise linear"\nnodes = {nodes}\nmethod = "{method}"\nquadrature = "{quadrature}"'
    quadrature = pick(rng, "matched", "trapezoid")
    points = f"\nquadrature_points = {2 * int(rng.integers(6, 24)) + 1}" if quadrature == "trapezoid" else ""
    if kind <= 3:
        nodes = 2 * int(rng.integers(3, 7)) + 1
        return f'projector = "chebyshev"\nnodes = {nodes}\nquadrature = "{quadrature}"{points}'
    return f'projector = "legendre"\nnodes = {int(rng.integers(5, 12))}\nquadrature = "{quadrature}"{points}'


def _method(rng: np.random.Generator) -> str:
    return str(pick(rng, "collocation", "galerkin"))


def _cosine_mode(
    rng: np.random.Generator,
    duration: float,
    strength: str,
    start: str,
    time_constant: str = "1.0",
    most_steps: float = 12,
) -> str:
    """Study text of a linear field with the first cosine mode alone, on a random scheme."""
    return f"""[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = [0.0, "{strength}"]
[rate]
form = "linear"
[initial]
formula = "{start}"
[dynamics]
time_constant = {time_constant}
duration = {duration!r}
[scheme]
{ring_scheme(rng)}
time_step = {duration / float(rng.uniform(1.5, most_steps))!r}"""


def linear_ring(rng: np.random.Generator) -> Instance:
    """Linear field, Poisson kernel with random gain: u(0, T) is a sum of exponentials of the gain."""
    p, r = float(rng.uniform(0.2, 0.5)), float(rng.uniform(0.3, 0.6))
    duration = float(rng.uniform(1.0, 3.0))
    low = float(rng.uniform(0.1, 0.4))
    gain = random_law(rng, low, low + float(rng.uniform(0.3, 0.7)))
    k = np.arange(1, 120)

    def value(g: FloatArray) -> FloatArray:
        modes = 2 * p**k * np.exp(np.multiply.outer(g, r**k) * duration)
        return np.asarray(np.exp(-duration) * (np.exp(g * duration) + modes.sum(-1)))

    def integral(g: FloatArray) -> FloatArray:
        return np.asarray(2 * np.pi * np.exp((g - 1) * duration))

    study = f"""
[parameters]
g = "{gain.text}"
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "formula"
formula = "g/(2*pi)*(1 - q**2)/(1 - 2*q*cos(x - y) + q**2)"
q = {r!r}
[rate]
form = "linear"
[initial]
formula = "(1 - {p!r}**2)/(1 - 2*{p!r}*cos(x) + {p!r}**2)"
[dynamics]
time_constant = 1.0
duration = {duration!r}
[scheme]
{ring_scheme(rng)}
time_step = {duration / float(rng.uniform(1.5, 12))!r}
[[quantity]]
name = "value"
measure = "value"
at = 0.0
[[quantity]]
name = "integral"
measure = "integral"
"""
    return Instance(
        "linear ring",
        study,
        {"value": Truth(value, gain.ppf, True), "integral": Truth(integral, gain.ppf, True)},
    )


def growing_mode(rng: np.random.Generator) -> Instance:
    """Linear cosine mode with random strength: a width and a passage time that may not occur."""
    duration = float(rng.uniform(1.5, 3.0))
    low = float(rng.uniform(0.2, 0.8))
    strength = random_law(rng, low, low + float(rng.uniform(0.6, 1.2)))
    level = float(np.exp((float(strength.ppf(np.array(rng.uniform(0.1, 0.7)))) - 1) * duration))
    crossing = 1 + np.log(level) / duration
    share = float(_share_below(strength, crossing))

    def amplitude(g: FloatArray) -> FloatArray:
        return np.asarray(np.exp((g - 1) * duration))

    def width(g: FloatArray) -> FloatArray:
        return np.asarray(2 * np.arccos(np.clip(level / amplitude(g), -1, 1)))

    study = f"""
[parameters]
g = "{strength.text}"
{_cosine_mode(rng, duration, "g/pi", "cos(x)")}
[[quantity]]
name = "peak"
measure = "maximum"
[[quantity]]
name = "width"
measure = "active width"
level = {level!r}
"""
    truths = {
        "peak": Truth(amplitude, strength.ppf, True),
        "width": Truth(width, strength.ppf, True, first=share),
    }
    if level > 1.0:  # below, the level is passed at the start
        study += f"""
[[quantity]]
name = "passage"
measure = "time to level"
at = 0.0
level = {level!r}
"""

        def passage(g: FloatArray) -> FloatArray:
            return np.asarray(np.log(level) / (g - 1))

        truths["passage"] = Truth(passage, strength.ppf, False, first=share)
    return Instance("growing mode", study, truths)


def _share_below(law: Law, value: float) -> float:
    if value <= float(law.ppf(np.array(0.0))):
        return 0.0
    return float(optimize.brentq(lambda v: float(law.ppf(np.array(v))) - value, 0.0, 1.0, xtol=1e-15))


def lognormal_decay(rng: np.random.Generator) -> Instance:
    """Decay of a mode with a lognormal time constant."""
    mu, sigma = float(np.log(rng.uniform(5, 15))), float(rng.uniform(0.15, 0.4))
    strength, duration = float(rng.uniform(0.1, 0.6)), float(rng.uniform(4, 12))
    law = Law(f"lognormal({mu!r}, {sigma!r})", stats.lognorm(sigma, scale=np.exp(mu)).ppf)

    def value(tau: FloatArray) -> FloatArray:
        return np.asarray(np.exp(-(1 - strength) * duration / tau))

    study = f"""
{_cosine_mode(rng, duration, f"{strength!r}/pi", "cos(x)", repr(law.text), 8)}
[[quantity]]
name = "value"
measure = "value"
at = 0.0
"""
    return Instance("lognormal decay", study, {"value": Truth(value, law.ppf, True)})


def manufactured(rng: np.random.Generator) -> Instance:
    """A(t) exp(x) + B(t) with a random amplitude: value, mean, maximum and a width, all closed."""
    z = random_law(rng, float(rng.uniform(0.4, 0.7)), float(rng.uniform(1.2, 1.6)))
    gain, threshold = float(rng.uniform(1.5, 4)), float(rng.uniform(0.2, 0.8))
    at = float(rng.uniform(-0.9, 0.9))
    late, shift = np.sin(1.0) / 2, np.cos(2.0) / 5
    level = float(np.exp(rng.uniform(-0.6, 0.4)) * 1.0 + shift)

    def linear(factor: float) -> Callable[[FloatArray], FloatArray]:
        return lambda a: np.asarray((a + late) * factor + shift)

    def width(a: FloatArray) -> FloatArray:
        return np.asarray(np.clip(1 - np.log((level - shift) / (a + late)), 0.0, 2.0))

    study = f"""
[parameters]
z = "{z.text}"
[domain]
shape = "interval"
from = -1.0
to = 1.0
[kernel]
form = "formula"
formula = "cos(2*x) * exp(y)"
[rate]
form = "logistic"
gain = {gain!r}
threshold = {threshold!r}
[drive]
formula = "(dA + A)*exp(x) + dB + B - cos(2*x)*(high - low)/A"
A = "z + sin(t)/2"
dA = "cos(t)/2"
B = "cos(2*t)/5"
dB = "-2*sin(2*t)/5"
high = "log(1 + exp({gain!r}*(A*e + B - {threshold!r})))/{gain!r}"
low = "log(1 + exp({gain!r}*(A/e + B - {threshold!r})))/{gain!r}"
[initial]
formula = "z*exp(x) + 0.2"
[dynamics]
time_constant = 1.0
duration = 1.0
[scheme]
{interval_scheme(rng)}
time_step = {1 / float(rng.uniform(1.5, 10))!r}
[[quantity]]
name = "value"
measure = "value"
at = {at!r}
[[quantity]]
name = "mean"
measure = "mean"
[[quantity]]
name = "width"
measure = "active width"
level = {level!r}
"""
    return Instance(
        "manufactured",
        study,
        {
            "value": Truth(linear(np.exp(at)), z.ppf, True),
            "mean": Truth(linear(np.sinh(1.0)), z.ppf, True),
            "width": Truth(width, z.ppf, True),
        },
    )


def step_bump(rng: np.random.Generator) -> Instance:
    """Stationary bump of a step rate with random threshold: amplitude and width."""
    low = float(rng.uniform(0.15, 0.4))
    threshold = random_law(rng, low, low + float(rng.uniform(0.2, 0.4)))

    def amplitude(h: FloatArray) -> FloatArray:
        return np.asarray(np.sqrt(1 + h) + np.sqrt(1 - h))

    def width(h: FloatArray) -> FloatArray:
        return np.asarray(np.pi - np.arcsin(h))

    nodes = int(rng.integers(12, 40)) * 2
    projector = pick(rng, "piecewise linear", "fourier")
    study = f"""
[parameters]
h = "{threshold.text}"
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = [0.0, 1.0]
[rate]
form = "step"
threshold = "h"
[initial]
formula = "1.8*cos(x)"
[dynamics]
time_constant = 1.0
duration = 30.0
[scheme]
projector = "{projector}"
nodes = {nodes}
time_step = 0.5
[[quantity]]
name = "amplitude"
measure = "maximum"
[[quantity]]
name = "width"
measure = "active width"
level = "h"
"""
    return Instance(
        "step bump",
        study,
        {
            "amplitude": Truth(amplitude, threshold.ppf, False),
            "width": Truth(width, threshold.ppf, False),
        },
    )


def front(rng: np.random.Generator) -> Instance:
    """Travelling front of a step rate with random threshold: its speed."""
    low = float(rng.uniform(0.2, 0.26))
    threshold = random_law(rng, low, low + float(rng.uniform(0.05, 0.12)))

    def speed(h: FloatArray) -> FloatArray:
        return np.asarray((1 - 2 * h) / (2 * h))

    nodes = 2 * int(rng.integers(50, 110)) + 1
    study = f"""
[parameters]
h = "{threshold.text}"
[domain]
shape = "interval"
from = -14.0
to = 14.0
[kernel]
form = "exponential"
strength = 1.0
width = 1.0
[rate]
form = "step"
threshold = "h"
[initial]
formula = "where(x < 0, h*(2 - exp(minimum(x, 0))), h*exp(-maximum(x, 0)))"
[dynamics]
time_constant = 1.0
duration = 2.0
[scheme]
projector = "piecewise linear"
nodes = {nodes}
time_step = 0.1
[[quantity]]
name = "speed"
measure = "front speed"
level = "h"
between = [1.0, 2.0]
"""
    return Instance("front", study, {"speed": Truth(speed, threshold.ppf, False)})


def correlated(rng: np.random.Generator) -> Instance:
    """Linear mode with a lognormal start and a normal strength, correlated: its amplitude is lognormal."""
    mu, sigma = float(rng.uniform(-0.3, 0.3)), float(rng.uniform(0.1, 0.3))
    centre, spread = float(rng.uniform(0.2, 0.7)), float(rng.uniform(0.05, 0.2))
    duration, spearman = float(rng.uniform(0.8, 2.0)), float(rng.uniform(-0.8, 0.8))
    latent = 2 * np.sin(np.pi * spearman / 6)
    mean = mu + (centre - 1) * duration
    sd = np.sqrt(sigma**2 + (spread * duration) ** 2 + 2 * latent * sigma * spread * duration)

    def amplitude(z: FloatArray) -> FloatArray:
        return np.asarray(np.exp(mean + sd * z))

    study = f"""
[parameters]
start = "lognormal({mu!r}, {sigma!r})"
g = "normal({centre!r}, {spread!r})"
{_cosine_mode(rng, duration, "g/pi", "start*cos(x)")}
[dependence]
rank_correlation = [["start", "g", {spearman!r}]]
[[quantity]]
name = "peak"
measure = "maximum"
[[quantity]]
name = "value"
measure = "value"
at = 0.0
"""
    truth = Truth(amplitude, stats.norm.ppf, True)
    return Instance("correlated", study, {"peak": truth, "value": truth})


FAMILIES: tuple[Callable[[np.random.Generator], Instance], ...] = (
    linear_ring,
    growing_mode,
    lognormal_decay,
    manufactured,
    step_bump,
    front,
    correlated,
)
"""Drawn in turn, so that every family has the same share."""
