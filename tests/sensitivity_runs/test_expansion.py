"""Polynomial chaos as a sampling method: statements from an accepted surrogate, samples where it is refused."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests.sensitivity_runs.closed_fields import (
    ABOVE,
    LEVEL,
    PEAK,
    Spread,
    holds,
    peak,
    ring,
    summary_of,
)

ASKED = f"[report]\nquantiles = [0.05, 0.5, 0.95]\nexceed = {{ peak = [{LEVEL}] }}\n"
METHOD = "polynomial chaos"


@pytest.fixture(scope="module")
def smooth(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    return summary_of(ring(method=METHOD, more=ASKED), tmp_path_factory.mktemp("smooth") / "out")


def test_mean_and_sd_hold_the_truth_and_state_the_surrogate(smooth: dict[str, Any]) -> None:
    spread, entry = Spread.of_peak(), smooth["quantities"]["peak"]
    for statement, truth in (
        (entry["mean"], spread.mean),
        (entry["mean"]["corrected"], spread.mean),
        (entry["sd"], spread.variance**0.5),
    ):
        assert holds(statement, truth)
        assert statement["error"]["surrogate"] > 0
        assert statement["error"]["sampling"] is None
        assert statement["error"]["total"] < 1e-4, "no wonder that it holds"
    assert entry["mean"]["error"]["time"] > 0
    assert smooth["sampling"] == {
        "method": "quasi-monte carlo",
        "samples": 256,
        "replicates": 16,
        "points_per_replicate": 16,
        "noise_repeats": 1,
        "asked": METHOD,
        "further_runs": {"held out": 64},
    }
    assert entry["sensitivity"] == {}
    assert not any("chaos" in warning for warning in smooth["warnings"])


def test_quantiles_and_probabilities_are_read_off_the_surrogate(smooth: dict[str, Any]) -> None:
    """The closed form at 200^3 midpoints has quantiles to 1e-4 and probabilities to 1e-4."""
    u = (np.arange(200) + 0.5) / 200
    values = peak(*np.meshgrid(0.8 + 0.4 * u, 0.1 + 0.1 * u, 8 + 4 * u, indexing="ij")).ravel()
    entry = smooth["quantities"]["peak"]
    for p, statement in entry["quantiles"].items():
        low, high = statement["interval"]
        assert low - 1e-4 <= np.quantile(values, float(p)) <= high + 1e-4
        assert high - low < 5e-3, "256 samples alone leave 0.02"
    probability = entry["exceed"][repr(LEVEL)]
    low, high = probability["interval"]
    assert low - 1e-4 <= (values > LEVEL).mean() <= high + 1e-4
    for statement in (*entry["quantiles"].values(), probability):
        assert statement["error"]["surrogate"] is not None
        assert statement["error"]["sampling"] > 0
        assert any("surrogate" in note for note in statement["notes"])


def test_a_bistable_field_is_refused_and_the_samples_answer(tmp_path: Path) -> None:
    """u' = f(u) - u with stable states near 0 and 1: the start alone decides; it lies above 1/2 in 3/8 of the draws."""
    summary = summary_of(BISTABLE, tmp_path / "out")
    entry = summary["quantities"]["end"]
    (warning,) = (one for one in summary["warnings"] if "polynomial chaos" in one)
    assert warning.startswith("end: polynomial chaos is refused, the samples answer instead: ")
    assert "two groups" in warning
    assert summary["sampling"]["method"] == "quasi-monte carlo"
    assert summary["sampling"]["asked"] == METHOD
    assert entry["mean"]["error"]["surrogate"] is None
    assert entry["mean"]["error"]["sampling"] > 0
    assert holds(entry["exceed"]["0.5"], 3 / 8)


def test_a_refusal_of_one_quantity_leaves_the_others_alone(tmp_path: Path) -> None:
    summary = summary_of(ring(PEAK + ABOVE, method=METHOD), tmp_path / "out")
    found = summary["quantities"]
    assert found["peak"]["mean"]["error"]["surrogate"] is not None
    assert found["above"]["mean"]["error"]["surrogate"] is None
    assert sum("polynomial chaos" in one for one in summary["warnings"]) == 1


def test_runs_without_a_value_are_not_expanded_over(tmp_path: Path) -> None:
    """The level is reached in nearly all draws: where it is not there is no time, and none is made up."""
    late = '[[quantity]]\nname = "arrival"\nmeasure = "time to level"\nat = 0.0\nlevel = 0.91\n'
    summary = summary_of(ring(late, method=METHOD), tmp_path / "out")
    entry = summary["quantities"]["arrival"]
    assert 0.9 < entry["occurs"]["value"] < 1
    assert entry["mean"]["error"]["surrogate"] is None
    assert any("gave no value" in warning for warning in summary["warnings"])


def test_dependent_inputs_are_expanded_too(tmp_path: Path) -> None:
    """A stationary field exp(a + b) of correlated normals: mean exp(V / 2), and Shapley effects in closed form.

    c(a) = Var E[Y | a] is the variance of a lognormal with log-variance (s_a^2 + cov)^2 / s_a^2; the latent correlation
    of a rank correlation rho is 2 sin(pi rho / 6).
    """
    summary = summary_of(DEPENDENT, tmp_path / "out")
    entry = summary["quantities"]["level"]
    covariance = 2 * np.sin(np.pi * 0.6 / 6) * 0.3 * 0.2
    variance = 0.3**2 + 0.2**2 + 2 * covariance
    assert entry["mean"]["error"]["surrogate"] is not None
    assert holds(entry["mean"], float(np.exp(variance / 2)))
    effects = [entry["sensitivity"][path]["shapley"] for path in ("a", "b")]
    closed = {v: np.expm1((v**2 + covariance) ** 2 / v**2) / np.expm1(variance) for v in (0.3, 0.2)}
    truth = 0.5 * (closed[0.3] + 1 - closed[0.2])
    assert holds(effects[0], truth)
    assert holds(effects[1], 1 - truth)


BISTABLE = f"""
title = "Two states"
seed = 11
[domain]
shape = "ring"
length = 1.0
[kernel]
form = "cosine"
coefficients = [1.0]
[rate]
form = "logistic"
gain = 20.0
threshold = 0.5
[initial]
formula = "start"
start = "uniform(0.25, 0.65)"
[dynamics]
time_constant = 1.0
duration = 20.0
[scheme]
nodes = 8
time_step = 0.1
[[quantity]]
name = "end"
measure = "value"
at = 0.0
[sampling]
method = "{METHOD}"
samples = 128
[report]
exceed = {{ end = [0.5] }}
"""

DEPENDENT = f"""
title = "Correlated numbers"
seed = 4
[parameters]
a = "normal(0, 0.3)"
b = "normal(0, 0.2)"
[domain]
shape = "ring"
length = 1.0
[kernel]
form = "cosine"
coefficients = [0.0]
[rate]
form = "linear"
[initial]
formula = "exp(a + b)"
[drive]
formula = "exp(a + b)"
[dynamics]
time_constant = 1.0
duration = 1.0
[scheme]
nodes = 8
time_step = 0.25
[[quantity]]
name = "level"
measure = "value"
at = 0.0
[sampling]
method = "{METHOD}"
samples = 128
[dependence]
rank_correlation = [["a", "b", 0.6]]
[sensitivity]
indices = ["shapley"]
"""
