"""Linear field on a ring: covariance per Fourier mode, Euler-Maruyama's own variance, the part of the time step.

Closed forms: Da Prato and Zabczyk, "Stochastic Equations in Infinite Dimensions", section 5; the recursion of
Euler-Maruyama's variance after Kloeden and Platen 1992 (both from memory).
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.stats import chi2

from aleafield.archive.ensemble_reader import reading
from tests.noise.known_fields import (
    LENGTH,
    covariance,
    euler_variance,
    holds,
    linear_ring,
    mode_rate,
    quantity,
    summary_of,
)

MODES = (0, 1, 4)
SAMPLES = 2048
STEP = 0.05


def scheme(step: float, projector: str = "fourier", method: str = "collocation", nodes: int = 64) -> str:
    return (
        f'[scheme]\nprojector = "{projector}"\nmethod = "{method}"\nnodes = {nodes}\ntime_step = {step}\n'
        'quadrature = "matched"\n'
    )


def name(k: int, time: float) -> str:
    return f"power of {k} after {1000 * time:.0f}"


def power(k: int, time: float) -> str:
    return quantity(name(k, time), "spectral power", f"wavenumber = {k}\ntime = {time}")


@pytest.fixture(scope="module")
def moments(tmp_path_factory: pytest.TempPathFactory) -> tuple[dict[str, Any], Path]:
    quantities = "".join(power(k, t) for k in MODES for t in (0.8, 6.0))
    quantities += quantity("early", "value", "at = 0.0\ntime = 0.8") + quantity(
        "late", "value", "at = 0.0\ntime = 1.5"
    )
    text = linear_ring(quantities, scheme=scheme(STEP), duration=6.0, samples=SAMPLES)
    folder = tmp_path_factory.mktemp("ring") / "out"
    return summary_of(text, folder), folder


@pytest.mark.parametrize("k", MODES)
@pytest.mark.parametrize("time", [0.8, 6.0])
def test_the_variance_of_a_mode_is_in_the_stated_interval(
    moments: tuple[dict[str, Any], Path], k: int, time: float
) -> None:
    """E |c_k|^2 is the variance of the normalised mode over the length of the ring."""
    statement = moments[0]["quantities"][name(k, time)]["mean"]
    assert holds(statement, covariance(k, time, time) / LENGTH)


@pytest.mark.parametrize("k", MODES)
@pytest.mark.parametrize("time", [0.8, 6.0])
def test_the_plain_value_is_euler_maruyamas_own_variance(
    moments: tuple[dict[str, Any], Path], k: int, time: float
) -> None:
    """S (or 2 S) independent squares of normal numbers: chi-square bounds, 1e-4 in each tail."""
    value = moments[0]["quantities"][name(k, time)]["mean"]["value"]
    expected = euler_variance(k, round(time / STEP), STEP) / LENGTH
    degrees = SAMPLES * (1 if k == 0 else 2)
    assert chi2.ppf(1e-4, degrees) <= degrees * value / expected <= chi2.isf(1e-4, degrees)


def test_the_pointwise_covariance_between_two_times(moments: tuple[dict[str, Any], Path]) -> None:
    """Sum over modes; the correlation of S pairs of normal numbers has the error sqrt((1 + r^2) / S) at most."""
    with reading(moments[1] / "ensemble.nc") as reader:
        early, late = reader.values("early"), reader.values("late")
    terms = [(1 if k == 0 else 2) * covariance(k, 0.8, 1.5) / LENGTH for k in range(25)]
    spread = [sum((1 if k == 0 else 2) * covariance(k, t, t) / LENGTH for k in range(25)) for t in (0.8, 1.5)]
    error = 4.0 * np.sqrt(2.0 * spread[0] * spread[1] / SAMPLES)
    bias = 0.05 * sum(terms)  # Euler-Maruyama: at most kappa dt / 2 = 0.025 of each variance, twice
    assert abs(np.mean(early * late) - sum(terms)) < error + bias


def test_the_time_part_finds_the_bias_of_euler_maruyama(tmp_path: Path) -> None:
    """At a step of 1/4 the stationary variance is too large by kappa dt / 2 of itself: seen, and bounded."""
    text = linear_ring(power(1, 12.0), scheme=scheme(0.25), duration=12.0, samples=2048)
    statement = summary_of(text, tmp_path / "out")["quantities"][name(1, 12.0)]["mean"]
    truth = covariance(1, 12.0, 12.0) / LENGTH
    bias = euler_variance(1, 48, 0.25) / LENGTH - truth
    assert bias == pytest.approx(truth * mode_rate(1) * 0.25 / (2 - mode_rate(1) * 0.25), rel=1e-3)
    error = statement["error"]
    assert holds(statement, truth)
    assert bias <= error["time"] + error["bias_noise"] <= 10 * bias
    assert error["time"] > 0.3 * bias
    corrected = statement["corrected"]
    assert holds(corrected, truth)


@pytest.mark.parametrize(
    ("projector", "method", "nodes"),
    [
        ("fourier", "galerkin", 64),
        ("piecewise linear", "collocation", 64),
        ("piecewise linear", "galerkin", 64),
    ],
)
def test_every_projector_of_the_ring_has_the_same_law(
    tmp_path: Path, projector: str, method: str, nodes: int
) -> None:
    quantities = "".join(power(k, 2.0) for k in MODES)
    text = linear_ring(quantities, scheme=scheme(0.1, projector, method, nodes), duration=2.0, samples=1024)
    summary = summary_of(text, tmp_path / "out")
    for k in MODES:
        assert holds(summary["quantities"][name(k, 2.0)]["mean"], covariance(k, 2.0, 2.0) / LENGTH)


def test_white_noise_gives_every_mode_the_same_power(tmp_path: Path) -> None:
    """C = delta: q_k = 1 for every mode; kernel 0, so that each is the same Ornstein-Uhlenbeck process."""
    text = """
title = "White noise"
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = [0.0]
[rate]
form = "linear"
[dynamics]
time_constant = 1.0
duration = 2.0
[noise]
strength = 0.5
correlation = "white"
[sampling]
method = "monte carlo"
samples = 1024
[aim]
confidence = 0.999
[scheme]
nodes = 32
time_step = 0.05
""" + "".join(power(k, 2.0) for k in (0, 3))
    summary = summary_of(text, tmp_path / "out")
    truth = 0.25 * (1 - np.exp(-4.0)) / 2 / LENGTH
    for k in (0, 3):
        assert holds(summary["quantities"][name(k, 2.0)]["mean"], truth)
    assert json.dumps(summary)
