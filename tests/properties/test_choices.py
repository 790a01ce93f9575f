"""What pilots settle: the step suits every study, and does not depend on how many samples are asked for."""

from __future__ import annotations

import pytest

from aleafield.runs.model import Choices, make_choices
from aleafield.sampling.allocation import allocate
from aleafield.study.reading import read_text

STUDY = """
title = "a bump on a ring"
[domain]
shape = "ring"
length = 10.0
[kernel]
form = "gaussian"
strength = 1.4
width = "uniform(0.8, 1.2)"
[rate]
form = "logistic"
gain = 10.0
threshold = 0.3
[initial]
formula = "exp(2*(cos(2*pi*x/10) - 1))"
[drive]
formula = "0.5*(t < off)"
off = 5.0
[dynamics]
time_constant = 1.0
duration = 20.0
[scheme]
nodes = 32
[[quantity]]
name = "level"
measure = "mean"
time = 6.0
[sampling]
method = "monte carlo"
samples = 64
"""
ZERO = """
[[quantity]]
name = "place"
measure = "peak position"
[[quantity]]
name = "odd"
measure = "formula"
formula = "u*sin(2*pi*x/10)"
in_space = "mean"
"""


def choices(text: str) -> Choices:
    """What is settled for a study."""
    study = read_text(text)
    return make_choices(study, allocate(study.sampling, len(study.inputs), False))


def test_a_quantity_that_is_zero_by_symmetry_asks_for_no_smaller_step() -> None:
    assert choices(STUDY + ZERO).time_step == choices(STUDY).time_step


def test_the_step_does_not_depend_on_the_number_of_samples() -> None:
    """A run of S samples extended to S' must equal a run of S'."""
    found = {n: choices(STUDY.replace("samples = 64", f"samples = {n}") + ZERO) for n in (8, 64, 640)}
    assert found[8] == found[64] == found[640]


def test_a_rare_short_time_constant_holds_the_step_below_what_is_stable() -> None:
    """One sample in 500 decays 50 times faster: -2.785 < -(1 + gain) dt / tau, gain 10/4 * 1.4 * .."""
    stiff = STUDY.replace("time_constant = 1.0", 'time_constant = "discrete([1.0, 0.02], [0.998, 0.002])"')
    assert choices(stiff).time_step < 2.785 * 0.02 / 4.5


def test_an_uncertain_switch_does_not_drive_the_step_to_nothing() -> None:
    """Order 1 across the switch: as many digits as for order 4 would take thousands of steps."""
    uncertain = choices(STUDY.replace("off = 5.0", 'off = "uniform(4, 6)"'))
    assert uncertain.time_step > 0.02


def test_a_step_that_is_given_is_kept_and_judged() -> None:
    given = choices(STUDY.replace("nodes = 32", "nodes = 32\ntime_step = 2.0"))
    assert given.time_step == 2.0
    assert len(given.notes) == 1
    assert "stability" in given.notes[0]
    assert choices(STUDY.replace("nodes = 32", "nodes = 32\ntime_step = 0.5")).notes == ()


def test_the_aim_bounds_its_own_quantity_alone() -> None:
    """A tolerance in mV says nothing of a quantity in other units: only the aim's own may shrink the step."""
    aim = '[aim]\ntolerance = 1e-9\nquantity = "{}"\n'
    assert choices(STUDY + ZERO + aim.format("odd")).time_step == choices(STUDY).time_step
    assert choices(STUDY + ZERO + aim.format("level")).time_step < choices(STUDY).time_step


@pytest.mark.parametrize("off", ["5.0", '"uniform(4, 6)"'])
def test_peaks_are_unwrapped_about_the_bump(off: str) -> None:
    assert choices(STUDY.replace("off = 5.0", f"off = {off}") + ZERO).peak_references[
        "place"
    ] == pytest.approx(0.0, abs=1e-9)
