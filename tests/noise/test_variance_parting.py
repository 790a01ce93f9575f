"""Noise and ignorance parted: linear fields whose two parts of the variance are known.

The field has no kernel: tau du = (-u + I) dt + sigma dW with one cosine wave of noise in space.  From rest,
u(0, T) given the parameters is normal with mean I (1 - e^(-T)) and variance sigma^2 (1 - e^(-2T)) / 2.
"""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from tests.noise.known_fields import AIM, holds, quantity, summary_of

DURATION, LOW, HIGH = 4.0, 0.2, 1.0


def study(method: str, samples: int, repeats: int) -> str:
    return f"""
title = "Two parts"
seed = 17
[domain]
shape = "ring"
length = 1.0
[kernel]
form = "cosine"
coefficients = [0.0]
[rate]
form = "linear"
[drive]
formula = "i"
i = "uniform(0.5, 1.5)"
[dynamics]
time_constant = 1.0
duration = {DURATION}
[noise]
strength = "uniform({LOW}, {HIGH})"
correlation = "cosine"
coefficients = [1.0]
[scheme]
nodes = 8
time_step = 0.05
[sampling]
method = "{method}"
samples = {samples}
noise_repeats = {repeats}
{AIM}
{quantity("activity", "value", "at = 0.0")}
"""


@pytest.mark.parametrize("method", ["monte carlo", "quasi-monte carlo"])
def test_both_parts_share_and_total(tmp_path: Path, method: str) -> None:
    summary = summary_of(study(method, 1024, 4), tmp_path / "out")
    gain = 1 - math.exp(-DURATION)
    parameters = gain**2 / 12
    noise = (LOW**2 + LOW * HIGH + HIGH**2) / 3 * (1 - math.exp(-2 * DURATION)) / 2
    variance = summary["quantities"]["activity"]["variance"]
    assert holds(variance["parameters"], parameters)
    assert holds(variance["noise"], noise)
    assert holds(variance["total"], parameters + noise)
    assert holds(variance["share"], parameters / (parameters + noise))
    total = variance["parameters"]["value"] + variance["noise"]["value"]
    assert variance["total"]["value"] == pytest.approx(total, rel=1e-12)
    assert variance["noise"]["error"]["total"] < 0.25 * noise
    assert variance["parameters"]["error"]["total"] < 0.5 * parameters
    assert variance["noise"]["error"]["time"] is not None
    assert summary["sampling"]["noise_repeats"] == 4


def test_one_path_a_sample_cannot_part_them(tmp_path: Path) -> None:
    variance = summary_of(study("monte carlo", 128, 1), tmp_path / "out")["quantities"]["activity"][
        "variance"
    ]
    for name in ("parameters", "noise", "share", "total"):
        assert variance[name]["value"] is None
        assert "noise_repeats" in variance[name]["reason"]
