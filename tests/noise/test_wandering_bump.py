"""A weakly forced bump wanders: effective diffusion against the published asymptotic value.

Kilpatrick and Ermentrout 2013, "Wandering bumps in stochastic neural fields", SIAM J. Appl. Dyn. Syst. 12
(cosine kernel, step rate; from memory, the coefficient derived again): with u = A cos(x) active for |x| < d,
d/dt Var = eps (C(0) - C(2d)) / (2 tau^2 U'(d)^2), |U'(d)| = 2 a sin(d)^2, sin(2d) = h / a.  The effective
diffusion is half of it.
"""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from scipy.special import ndtri

from tests.noise.known_fields import AIM, holds, quantity, summary_of

STRENGTH = 0.1
"""sqrt(eps), small enough for the asymptotic law: eps = 0.01."""
SAMPLES = {"cosine": 10_000, "gaussian": 3_000}


def study(correlation: str, samples: int) -> str:
    return f"""
title = "Wandering bump"
seed = 3
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = [0.0, 1.0]
[rate]
form = "step"
threshold = 0.5
[initial]
formula = "a * cos(x)"
a = 1.931851652578137
[dynamics]
time_constant = 1.0
duration = 11.0
[noise]
strength = {STRENGTH}
{correlation}
[scheme]
nodes = 32
time_step = 0.1
[sampling]
samples = {samples}
{AIM}
{quantity("diffusion", "effective diffusion", "between = [3.0, 11.0]")}
{quantity("drift", "displacement", "between = [3.0, 11.0]")}
"""


def published(at_zero: float, at_2d: float) -> float:
    d = 0.5 * (math.pi - math.asin(0.5))
    return 0.5 * STRENGTH**2 * (at_zero - at_2d) / (2 * (2 * math.sin(d) ** 2) ** 2)


def wrapped_gaussian(z: float, length: float) -> float:
    images = np.arange(-20, 21)
    values = np.exp(-((z + 2 * np.pi * images) ** 2) / (2 * length**2))
    return float(values.sum() / np.exp(-((2 * np.pi * images) ** 2) / (2 * length**2)).sum())


@pytest.mark.parametrize("correlation", ["cosine", "gaussian"])
def test_effective_diffusion(tmp_path: Path, correlation: str) -> None:
    d2 = math.pi - math.asin(0.5)
    if correlation == "cosine":
        entries, truth = 'correlation = "cosine"\ncoefficients = [0.0, 1.0]', published(1.0, math.cos(d2))
        assert truth == pytest.approx(0.5 * 0.2679491924311 * STRENGTH**2, rel=1e-9)
    else:
        entries = 'correlation = "gaussian"\ncorrelation_length = 0.5'
        truth = published(1.0, wrapped_gaussian(d2, 0.5))
    summary = summary_of(study(entries, SAMPLES[correlation]), tmp_path / "out")
    statement = summary["quantities"]["diffusion"]["mean"]
    assert holds(statement, truth)
    at_95 = statement["error"]["total"] * ndtri(0.975) / ndtri(0.9995)
    assert at_95 < (0.05 if correlation == "cosine" else 0.1) * truth
    drift = summary["quantities"]["drift"]
    assert holds(drift["mean"], 0.0)
    assert drift["sd"]["value"] ** 2 == pytest.approx(2 * truth * 8.0, rel=0.12)
