"""A drive that jumps in x: the error depends on where the jump lies in its element, and nothing is extrapolated.

With no kernel the field is (1 - exp(-t / tau)) times the drive: every truth is closed.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from aleafield.runs.run import run
from aleafield.study.reading import read_text

HALF = 1.37
STUDY = """
title = "a box"
[domain]
{domain}
[kernel]
form = "formula"
formula = "0"
[rate]
form = "linear"
[drive]
formula = "where(abs(x) < {half}, 1, 0)"
[dynamics]
time_constant = 10.0
duration = 20.0
[scheme]
projector = "{projector}"
nodes = {nodes}
time_step = 1.0
[[quantity]]
name = "integral"
measure = "integral"
[[quantity]]
name = "norm"
measure = "norm"
[[quantity]]
name = "width"
measure = "active width"
level = 0.3
[[quantity]]
name = "inside"
measure = "value"
at = 0.7
[keep]
fields = "none"
"""
HEIGHT = 1 - np.exp(-2.0)
TRUTHS = {
    "integral": 2 * HALF * HEIGHT,
    "norm": np.sqrt(2 * HALF) * HEIGHT,
    "width": 2 * HALF,
    "inside": HEIGHT,
}
DOMAINS = {
    "piecewise linear": 'shape = "ring"\nlength = 10.0',
    "fourier": 'shape = "ring"\nlength = 10.0',
    "chebyshev": 'shape = "interval"\nfrom = -5.0\nto = 5.0',
}


@pytest.mark.parametrize("nodes", [64, 81, 100, 127])
@pytest.mark.parametrize("projector", DOMAINS)
def test_intervals_hold_the_truth_and_nothing_is_extrapolated(
    projector: str, nodes: int, tmp_path: Path
) -> None:
    text = STUDY.format(domain=DOMAINS[projector], half=HALF, projector=projector, nodes=nodes)
    summary = run(read_text(text), tmp_path / "run", workers=1).summary
    for name, truth in TRUTHS.items():
        mean = summary["quantities"][name]["mean"]
        assert mean["interval"][0] <= truth <= mean["interval"][1], name
        assert "corrected" not in mean
