"""What `check` says of a study, against closed forms; and that it solves nothing."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest
from scipy.stats import norm

from aleafield.errors import InputError
from aleafield.forward.field_model import FieldModel
from aleafield.randomness.design import Design
from aleafield.runs.check import CheckResult, check
from aleafield.stepping.runge_kutta import REAL_AXIS
from aleafield.study.minimal import MINIMAL_STUDY
from aleafield.study.reading import read_text

INTERVAL = 'shape = "interval"\nfrom = -10.0\nto = 10.0'
RING = 'shape = "ring"\nlength = 20.0'
WEAK = "strength = 0.25"
UNCERTAIN = 'width = "uniform(0.8, 1.2)"'
LOGISTIC = 'form = "logistic"\ngain = 10.0\nthreshold = 0.3'


def checked(*changes: tuple[str, str], extra: str = "") -> CheckResult:
    """What is said of the minimal study with some changes."""
    text = MINIMAL_STUDY
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    return check(read_text(text + extra))


def orders(result: CheckResult) -> dict[str, float | None]:
    """Expected order of each part."""
    return {part: entry["order"] for part, entry in result.scheme["orders"].items()}


def verdicts(result: CheckResult) -> dict[str, bool | None]:
    """By hypothesis: whether it holds."""
    return {hypothesis.name: hypothesis.holds for hypothesis in result.hypotheses}


def test_the_real_stability_interval_of_runge_kutta() -> None:
    """-2.785 is the real root of 1 + z + z^2/2 + z^3/6 + z^4/24 = 1 other than 0."""
    roots = np.roots([1 / 24, 1 / 6, 1 / 2, 1.0])
    real = roots[np.abs(roots.imag) < 1e-12].real
    assert pytest.approx([-REAL_AXIS], abs=5e-4) == real


def test_the_stable_step_of_a_certain_field_on_a_ring() -> None:
    """Logistic slope gain/4 = 2.5, kernel mass 1.4 (periodised): the fastest rate is (1 + 3.5) / 10."""
    result = checked((INTERVAL, RING), (UNCERTAIN, "width = 1.0"), (WEAK, "strength = 1.4"))
    assert result.time["gain"] == pytest.approx(3.5, rel=1e-9)
    assert result.time["largest_stable_step"] == pytest.approx(REAL_AXIS * 10 / 4.5, rel=1e-9)


def test_a_step_beyond_the_stable_one_is_warned_of() -> None:
    ring = ((INTERVAL, RING), (UNCERTAIN, "width = 1.0"), (WEAK, "strength = 1.4"))
    beyond = checked(*ring, extra="[scheme]\ntime_step = 6.3\n")
    assert any("beyond the stable step" in warning for warning in beyond.warnings)
    within = checked(*ring, extra="[scheme]\ntime_step = 6.1\n")
    assert within.warnings == ()


def test_the_mesh_against_the_smallest_width() -> None:
    """257 nodes on length 20: h = 20/256; the smallest width is that of the first 64 samples."""
    result = checked()
    study = read_text(MINIMAL_STUDY)
    drawn = Design(study.inputs, study.dependence, "quasi-monte carlo", 1).values(np.arange(64))[
        "kernel.width"
    ]
    assert result.resolution["node_gap"] == pytest.approx(20 / 256)
    assert result.resolution["smallest_kernel_width"] == drawn.min()
    assert result.resolution["gap_over_width"] == pytest.approx(20 / 256 / drawn.min())
    assert not any("hardly sees" in warning for warning in result.warnings)
    coarse = checked(extra="[scheme]\nnodes = 33\n")  # h = 20/32, more than half of every width
    assert any("hardly sees" in warning for warning in coarse.warnings)


def test_what_the_interval_cuts_off() -> None:
    """Tails of the normal law: 2 P(Z > 10/2) in the middle; 1e-6 beyond 4.7534 widths."""
    (note,) = checked((UNCERTAIN, "width = 2.0")).notes
    assert f"{2 * norm.sf(5.0):.2g} is lost in the middle" in note
    assert f"within {2.0 * norm.isf(1e-6):.4g} of an end" in note
    (note,) = checked((UNCERTAIN, "width = 2.0"), ('form = "gaussian"', 'form = "exponential"')).notes
    assert f"{math.exp(-5.0):.2g} is lost in the middle" in note
    assert "everywhere more than 1e-06 of it is lost" in note


def test_all_hypotheses_of_a_smooth_study_hold() -> None:
    result = checked()
    assert set(verdicts(result).values()) == {True}
    assert orders(result) == {"quadrature": 2.0, "space": 2.0, "time": 4.0}
    assert result.warnings == ()


def test_hypotheses_that_do_not_hold() -> None:
    step = verdicts(checked((LOGISTIC, 'form = "step"')))
    assert step["differentiable rate with bounded derivative"] is False
    linear = checked((LOGISTIC, 'form = "linear"'))
    assert verdicts(linear)["bounded rate"] is False
    formula = verdicts(checked((LOGISTIC, 'form = "formula"\nformula = "u**3"')))
    assert formula["bounded rate"] is None
    kinked = checked(("exp(-x**2 / 2)", "exp(-abs(x))"))
    assert verdicts(kinked)["smooth drive and initial state"] is False
    assert kinked.warnings


def test_a_trapezoid_rule_under_a_spectral_projector_is_of_order_two() -> None:
    scheme = '[scheme]\nprojector = "chebyshev"\nnodes = 129\nquadrature = "{}"\n'
    forced = checked(extra=scheme.format("trapezoid"))
    assert orders(forced)["quadrature"] == 2.0
    assert orders(forced)["space"] is None
    assert any("trapezoid" in warning and "order 2" in warning for warning in forced.warnings)
    matched = checked(extra=scheme.format("matched"))
    assert orders(matched)["quadrature"] is None
    assert matched.warnings == ()


def test_a_kink_on_the_diagonal_spoils_a_spectral_rule() -> None:
    exponential = ('form = "gaussian"', 'form = "exponential"')
    spoiled = checked(exponential, extra='[scheme]\nprojector = "chebyshev"\n')
    assert any("piecewise linear" in warning for warning in spoiled.warnings)
    assert checked(exponential).warnings == ()
    assert checked(exponential, (INTERVAL, RING)).warnings == ()


def test_a_rule_of_needless_order_is_wasteful() -> None:
    wasteful = checked(extra='[scheme]\nquadrature = "simpson"\n')
    assert any("wasted" in warning for warning in wasteful.warnings)


def test_lumping_is_named() -> None:
    lumped = checked(extra='[scheme]\nmethod = "galerkin"\nquadrature = "trapezoid"\n')
    assert any("lumps the mass matrix" in note for note in lumped.notes)


def test_uncertain_switches_are_of_order_one() -> None:
    switch = ("exp(-x**2 / 2)", "exp(-x**2 / 2) * (t < off)")
    certain = checked(switch, ("[dynamics]", "off = 20.0\n\n[dynamics]"))
    assert 20.0 in certain.time["fixed"]
    assert orders(certain)["time"] == 4.0
    uncertain = checked(switch, ("[dynamics]", 'off = "uniform(19, 21)"\n\n[dynamics]'))
    assert orders(uncertain)["time"] == 1.0
    assert verdicts(uncertain)["switches of the drive on the schedule"] is False


def test_the_count_of_samples_after_rounding_is_said() -> None:
    result = checked(extra="[sampling]\nsamples = 1000\n")
    assert result.sampling["samples"] == 1024
    assert result.sampling["replicates"] == 16
    assert "1000 samples asked, 1024 used" in result.as_text()
    assert checked((UNCERTAIN, "width = 1.0")).sampling["samples"] == 1


def test_impossible_numbers_are_found() -> None:
    parameters = '[parameters]\nh = "uniform(0.2, 0.6)"\n'
    with pytest.raises(InputError, match="sample"):
        checked((UNCERTAIN, 'width = "1 - 2*h"'), extra=parameters)


def test_text_and_json_say_the_same() -> None:
    result = checked()
    document = json.loads(json.dumps(result.as_json(), allow_nan=False))
    assert document["valid"] is True
    assert document["inputs"] == [
        {
            "path": "kernel.width",
            "law": "uniform(0.8, 1.2)",
            "units": "1",
            "mean": 1.0,
            "sd": pytest.approx(0.4 / math.sqrt(12)),
        }
    ]
    text = result.as_text()
    for words in ("kernel.width", "uniform(0.8, 1.2)", "toeplitz", "order 2", *document["time"]["words"]):
        assert words in text


def test_numbers_without_bound_leave_valid_json() -> None:
    result = checked((WEAK, "strength = 1e308"), ("gain = 10.0", "gain = 1e300"))
    assert json.loads(json.dumps(result.as_json(), allow_nan=False))["time"]["gain"] is None


def test_nothing_is_solved(monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object, **__: object) -> None:
        raise AssertionError("check must not solve")

    monkeypatch.setattr(FieldModel, "evaluate", refuse)
    assert checked().title


def test_a_start_that_is_not_finite_is_warned_of() -> None:
    """257 nodes on [-10, 10] hold x = 0."""
    found = checked(extra='[initial]\nformula = "1/x"\n').warnings
    assert "initial: not finite at t = 0 in 64 of the first 64 samples, which will fail" in found
