"""Noisy fields whose law is known, as study texts, and runs of them."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

from aleafield.forward.field_model import FieldModel
from aleafield.runs.model import field_model, make_choices
from aleafield.runs.run import run
from aleafield.sampling.allocation import Allocation
from aleafield.study.reading import read_text
from tests.examples.summary_shape import read_summary

LENGTH = 2 * math.pi
AIM = "[aim]\nconfidence = 0.999"
"""Intervals so wide that hardly one of the folder's forty fails to hold the truth by chance."""
# kernel sum_k g r^|k| e^(ikz) / (2 pi), noise sum_k c p^|k| e^(ikz) / (2 pi)
KERNEL_GAIN, KERNEL_RATIO, NOISE_POWER, NOISE_RATIO = 0.7, 0.5, 0.3, 0.6
WAVES = 24
"""Waves of kernel and noise that the studies hold; 0.6^25 is 3e-6."""


def mode_rate(k: int) -> float:
    """kappa_k = 1 - w_k, the rate at which mode k decays; the time constant is 1."""
    return 1.0 - KERNEL_GAIN * KERNEL_RATIO**k


def mode_noise(k: int) -> float:
    """q_k, variance that noise gives to the L2-normalised mode k per unit of time."""
    return NOISE_POWER * NOISE_RATIO**k


def covariance(k: int, early: float, late: float) -> float:
    """Cov of the L2-normalised mode k between two times: Ornstein-Uhlenbeck from rest."""
    kappa, q = mode_rate(k), mode_noise(k)
    return q * (math.exp(-kappa * (late - early)) - math.exp(-kappa * (late + early))) / (2 * kappa)


def euler_variance(k: int, steps: int, step: float) -> float:
    """Variance of mode k after so many Euler-Maruyama steps: q dt (1 - m^(2n)) / (1 - m^2), m = 1 - kappa dt."""
    m = 1.0 - mode_rate(k) * step
    return mode_noise(k) * step * (1 - m ** (2 * steps)) / (1 - m * m)


def _list(values: list[float]) -> str:
    return "[" + ", ".join(repr(value) for value in values) + "]"


def linear_ring(quantities: str, *, scheme: str, duration: float, samples: int) -> str:
    """Study text of the linear ring: every Fourier mode is an Ornstein-Uhlenbeck process."""
    total = NOISE_POWER / LENGTH * (1 + 2 * sum(NOISE_RATIO**k for k in range(1, WAVES + 1)))
    kernel = [KERNEL_GAIN * KERNEL_RATIO**k / (LENGTH if k == 0 else math.pi) for k in range(WAVES + 1)]
    noise = [NOISE_RATIO**k * (1.0 if k == 0 else 2.0) for k in range(WAVES + 1)]
    return f"""
title = "Linear ring under noise"
seed = 5
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = {_list(kernel)}
[rate]
form = "linear"
[dynamics]
time_constant = 1.0
duration = {duration}
[noise]
strength = {math.sqrt(total)!r}
correlation = "cosine"
coefficients = {_list(noise)}
{scheme}
[sampling]
method = "monte carlo"
samples = {samples}
{AIM}
{quantities}
"""


def quantity(name: str, measure: str, entries: str) -> str:
    """One [[quantity]] section."""
    return f'[[quantity]]\nname = "{name}"\nmeasure = "{measure}"\n{entries}\n'


def summary_of(text: str, folder: Path, workers: int = 1) -> dict[str, Any]:
    """Run a study text into a folder and read its summary, whose shape is checked: it has no NaN."""
    run(read_text(text), folder, workers=workers)
    return read_summary((folder / "summary.json").read_text())


def model_of(text: str, samples: int = 64) -> FieldModel:
    """The forward model of a study text, with the choices of a run."""
    study, allocation = read_text(text), Allocation("monte carlo", samples, 1)
    return field_model(study, allocation, make_choices(study, allocation))


def holds(statement: dict[str, Any], truth: float) -> bool:
    """Whether the stated interval holds the truth."""
    low, high = statement["interval"]
    return bool(low <= truth <= high)
