"""Mean first passage of a linear field: at a point of a single wave it is an Ornstein-Uhlenbeck process.

Siegert 1951, "On the first passage time probability problem", Physical Review 81; in the form of Ricciardi 1977,
"Diffusion Processes and Related Topics in Biology" (both from memory): for dX = kappa (mu - X) dt + s dB with
sigma = s / sqrt(kappa), the mean time from x to a level above it is sqrt(pi) / kappa times the integral of
exp(z^2) (1 + erf(z)) over z from (x - mu) / sigma to (level - mu) / sigma.
"""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path

import numpy as np
from scipy.integrate import quad
from scipy.special import erf

from aleafield.arrays import FloatArray
from tests.noise.known_fields import AIM, holds, model_of, quantity, summary_of

KAPPA, TARGET, STRENGTH, LEVEL = 0.5, 2.0, 0.3, 1.0
DURATION = 20.0
"""The slowest mode of survival below a level that is below mu decays faster than exp(-kappa t): 5e-5 are left."""


def study(samples: int, step: float, duration: float) -> str:
    """Kernel 0.5 on the wave, so that kappa = 1 - 0.5; drive kappa mu; from rest."""
    return f"""
title = "First passage"
seed = 8
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = [0.0, {(1 - KAPPA) / math.pi}]
[rate]
form = "linear"
[drive]
formula = "{KAPPA * TARGET} * cos(x)"
[dynamics]
time_constant = 1.0
duration = {duration}
[noise]
strength = {STRENGTH}
correlation = "cosine"
coefficients = [0.0, 1.0]
[scheme]
nodes = 8
time_step = {step}
[sampling]
method = "monte carlo"
samples = {samples}
{AIM}
{quantity("passage", "time to level", f"level = {LEVEL}" + chr(10) + "at = 0.0")}
"""


def siegert() -> float:
    """The mean time from 0 to the level."""
    sigma = STRENGTH / math.sqrt(KAPPA)
    ends = (-TARGET / sigma, (LEVEL - TARGET) / sigma)
    return math.sqrt(math.pi) / KAPPA * quad(lambda z: math.exp(z * z) * (1 + erf(z)), *ends)[0]


def test_the_mean_is_in_the_stated_interval(tmp_path: Path) -> None:
    passage = summary_of(study(1024, 0.05, DURATION), tmp_path / "out")["quantities"]["passage"]
    assert passage["occurs"]["value"] == 1.0
    assert holds(passage["mean"], siegert())
    assert passage["mean"]["error"]["total"] < 0.1 * siegert()


def test_the_time_part_is_of_order_one() -> None:
    """Bridges leave the frozen drift, of order 1; looking at the ends of steps only would be of order 1/2.

    Of the mean of the passage or 4, whichever is earlier: differences between steps of 0.2, 0.1 and 0.05 along the
    same paths fall by 2 and not by sqrt(2), to within 4 standard errors.
    """
    end = 4.0
    model = model_of(study(64, 0.1, end))
    batches = np.split(np.arange(16384), 16)
    found = []
    for halvings in (-1, 0, 1):
        level = replace(model.level, halvings=halvings)
        passages = np.concatenate([model.evaluate(level, batch).values["passage"] for batch in batches])
        found.append(np.where(np.isnan(passages), end, passages))
    first, second = found[0] - found[1], found[1] - found[2]
    assert abs(standardised(first - 2.0 * second)) < 4.0
    assert abs(standardised(first - math.sqrt(2.0) * second)) > 4.0


def standardised(values: FloatArray) -> float:
    """Mean over its standard error."""
    return float(values.mean() / (values.std() / math.sqrt(len(values))))


def test_a_level_is_not_reached_without_the_lower_one() -> None:
    """Two levels at one point are read off the same bridges: occurrence is monotone to the bit, times to a sub-step."""
    higher = quantity("later", "time to level", f"level = {LEVEL + 0.02}" + chr(10) + "at = 0.0")
    model = model_of(study(64, 0.5, 1.0) + higher)
    found = model.evaluate(model.level, np.arange(512))
    first, later = found.values["passage"], found.values["later"]
    assert 50 < np.isfinite(later).sum() < np.isfinite(first).sum() < 512
    assert not (np.isfinite(later) & np.isnan(first)).any()
    both = np.isfinite(later)
    assert (later[both] >= first[both] - 0.25).all()
