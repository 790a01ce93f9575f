"""Small studies with known answers, for runs through the front door."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from aleafield.study.reading import read_text
from aleafield.study.study import Study

LINEAR_RING = """
title = "{title}"
seed = 5
units = {{ length = "mm", time = "ms", activity = "mV" }}

[domain]
shape = "ring"
length = "2*pi"

[kernel]
form = "cosine"
coefficients = [0.0, "uniform(0.1, 0.2)"]

[rate]
form = "linear"

[drive]
formula = "{amplitude} * cos(x)"

[dynamics]
time_constant = "uniform(8, 12)"
duration = 20.0

[scheme]
nodes = 16
time_step = 1.0

[[quantity]]
name = "peak"
measure = "maximum"

[[quantity]]
name = "arrival"
measure = "time to level"
level = 0.8
at = 0.0

[sampling]
method = "{method}"
samples = {samples}

[report]
exceed = {{ peak = {exceed} }}
{more}
"""
"""tau du/dt = -u + a pi u_1 cos x + amplitude cos x from u = 0, so that u = cos(x) A(t) with
A(t) = amplitude (1 - exp(-(1 - a pi) t / tau)) / (1 - a pi): the peak is A(20)."""


def linear_ring(
    samples: int = 64,
    method: str = "quasi-monte carlo",
    amplitude: str = "1.0",
    title: str = "A linear ring",
    exceed: str = "[1.0]",
    more: str = "",
    path: Path | None = None,
) -> Study:
    """The study above."""
    text = LINEAR_RING.format(
        samples=samples, method=method, amplitude=amplitude, title=title, exceed=exceed, more=more
    )
    return read_text(text, path)


def noisy_ring(
    samples: int = 64,
    method: str = "quasi-monte carlo",
    repeats: int = 2,
    amplitude: str = "1.0",
    seed: int = 5,
    more: str = "",
    *,
    inputs: bool = True,
) -> Study:
    """The study above under noise, with the value at 0 besides; without inputs if asked."""
    noise = (
        '[[quantity]]\nname = "centre"\nmeasure = "value"\nat = 0.0\n\n'
        '[noise]\nstrength = 0.1\ncorrelation = "gaussian"\ncorrelation_length = 1.0\n'
    )
    text = linear_ring(samples, method, amplitude, more=noise + more).source.text
    text = text.replace(f"samples = {samples}", f"samples = {samples}\nnoise_repeats = {repeats}")
    text = text.replace("seed = 5", f"seed = {seed}")
    if not inputs:
        text = text.replace('"uniform(0.1, 0.2)"', "0.15").replace('"uniform(8, 12)"', "10.0")
    return read_text(text)


def peak_of_linear_ring(
    strength: np.ndarray, time_constant: np.ndarray, amplitude: float = 1.0
) -> np.ndarray:
    """A(20) in closed form for coefficients a = strength."""
    decay = 1.0 - np.pi * strength
    return np.asarray(amplitude * -np.expm1(-decay * 20.0 / time_constant) / decay)
