"""The largest value over a window of a noisy field: what is seen at the ends of steps lies below the truth.

A kernel that cancels the decay and noise that is constant in space make the field s times a Wiener process B.
E max B over [0, T] = sqrt(2 T / pi) by the principle of reflection; seen at steps h it is lower by
-zeta(1/2) / sqrt(2 pi) = 0.5826 times sqrt(h), to the leading order (Asmussen, Glynn and Pitman 1995,
"Discretization error in simulation of one-dimensional reflecting Brownian motion", Annals of Applied Probability 5;
from memory).
"""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import pytest

from tests.noise.known_fields import AIM, holds, quantity, summary_of

STRENGTH, DURATION, STEP = 0.4, 1.0, 0.05
SAMPLES = 2048
TRUTH = STRENGTH * math.sqrt(2 * DURATION / math.pi)
MISSED = 0.5826 * STRENGTH * math.sqrt(STEP)
OVER = f"over = [0.0, {DURATION}]"


def wiener_process(folder: Path) -> dict[str, Any]:
    """What a run says of its extremes over the window."""
    text = f"""
title = "A Wiener process"
seed = 13
[domain]
shape = "ring"
length = 1.0
[kernel]
form = "cosine"
coefficients = [1.0]
[rate]
form = "linear"
[dynamics]
time_constant = 1.0
duration = {DURATION}
[noise]
strength = {STRENGTH}
correlation = "cosine"
coefficients = [1.0]
[scheme]
nodes = 8
time_step = {STEP}
[sampling]
method = "monte carlo"
samples = {SAMPLES}
{AIM}
{quantity("highest", "maximum", OVER + chr(10) + 'reduce = "maximum"')}
{quantity("lowest", "minimum", OVER + chr(10) + 'reduce = "minimum"')}
{quantity("bridged", "value", "at = 0.0" + chr(10) + OVER + chr(10) + 'reduce = "maximum"')}
"""
    found: dict[str, Any] = summary_of(text, folder / "out")["quantities"]
    return found


@pytest.fixture(scope="module")
def quantities(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    return wiener_process(tmp_path_factory.mktemp("wiener"))


@pytest.mark.parametrize(("name", "sign"), [("highest", 1.0), ("lowest", -1.0)])
def test_a_maximum_of_a_field_is_open_above_and_a_minimum_below(
    quantities: dict[str, Any], name: str, sign: float
) -> None:
    statement = quantities[name]["mean"]
    ends = statement["interval"][:: int(sign)]
    assert ends[1] is None
    assert sign * ends[0] < TRUTH
    spread = STRENGTH * math.sqrt(DURATION * (1 - 2 / math.pi) / SAMPLES)
    assert sign * statement["value"] == pytest.approx(TRUTH - MISSED, abs=4 * spread + 0.1 * MISSED)


def test_the_median_of_it_is_open_too(quantities: dict[str, Any]) -> None:
    """|B| has the median 0.6745."""
    low, high = quantities["highest"]["quantiles"]["0.5"]["interval"]
    assert high is None
    assert low < 0.6745 * STRENGTH * math.sqrt(DURATION)


def test_of_a_linear_quantity_it_is_closed(quantities: dict[str, Any]) -> None:
    """Bridges are exact in law where the drift is none; both ends are there and hold the truth."""
    statement = quantities["bridged"]["mean"]
    assert holds(statement, TRUTH)
    assert statement["error"]["total"] < MISSED
