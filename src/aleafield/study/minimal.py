"""The smallest study that can be run: where a beginner starts."""

from __future__ import annotations

MINIMAL_STUDY = """\
title = "How wide does an evoked bump grow?"

[domain]
shape = "interval"
from = -10.0
to = 10.0

[kernel]
form = "gaussian"
strength = 0.25
width = "uniform(0.8, 1.2)"

[rate]
form = "logistic"
gain = 10.0
threshold = 0.3

[drive]
formula = "0.8 * exp(-x**2 / 2)"

[dynamics]
time_constant = 10.0
duration = 60.0

[[quantity]]
name = "width"
measure = "active width"
level = 0.3
"""
"""Text of a study file with every required entry, one uncertain number and one quantity."""
