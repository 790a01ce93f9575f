"""A forward model in closed form: as quick as its `delay` lets it be, and picklable."""

from __future__ import annotations

import time
from collections.abc import Sequence

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.ensemble.level import Level, PathPart
from aleafield.ensemble.records import FIELD_NOT_FINITE, Records
from aleafield.randomness.design import Design
from aleafield.randomness.inputs import Dependence, Input
from aleafield.randomness.laws import Normal, Uniform
from aleafield.sampling.request import SamplingMethod

INPUTS = (Input("rate.gain", Uniform(0.8, 1.2), "mV-1"), Input("h", Normal(0.3, 0.02), "1"))
DURATION = 2.0
FAILING_ABOVE = 1.19
"""Samples whose gain lies above this fail: about one in forty."""


class AnalyticModel:
    """u = gain exp(-t) cos(pi x) on [-1, 1], with errors of order 2 in nodes and points and 4 in the step.

    Quantities: "peak" (always occurs) and "time of return", which occurs where gain >= 3.2 h.

    Parameters
    ----------
    method : method of the sampling
    nodes : nodes of the run
    delay : seconds that a sample takes
    parts : how many parts its path has, the time part last
    """

    def __init__(
        self,
        method: SamplingMethod = "quasi-monte carlo",
        nodes: int = 17,
        delay: float = 0.0,
        parts: int = 3,
    ) -> None:
        self.design = Design(INPUTS, Dependence(), method, 7)
        self.level = Level(nodes, nodes)
        self.delay = delay
        self.parts = parts

    @property
    def inputs(self) -> Sequence[Input]:
        """Two of them."""
        return INPUTS

    def points(self, level: Level) -> FloatArray:
        """Equally spaced."""
        return np.linspace(-1.0, 1.0, level.nodes)

    def operations(self, level: Level) -> float:
        """Nodes, points and steps; so many that worker processes seem worth their start."""
        return 1e8 * level.nodes * level.quadrature_points * 2.0**level.halvings

    def path(self, level: Level) -> tuple[PathPart, ...]:
        """Quadrature, space and time, all with a coarser pair."""
        n, q = level.nodes, level.quadrature_points
        a, b, c, d = level, Level(n, 2 * q - 1), Level(2 * n - 1, 2 * q - 1), Level(n, q, 1)
        a0, b0, d0 = Level((n + 1) // 2, (q + 1) // 2), Level((n + 1) // 2, q), Level(n, q, -1)
        path = (
            PathPart("quadrature", (a, b), (a0, b0), 2.0, 2.0, 2.0),
            PathPart("space", (b, c), (b0, a), 2.0, 2.0, 2.0, least_factor={"peak": 2.0}),
            PathPart("time", (a, d), (d0, a), 2.0, 2.0, 4.0, peaks=frozenset({"peak"})),
        )
        return path[-self.parts :]

    def evaluate(self, level: Level, samples: IntArray, times: Sequence[float] = ()) -> Records:
        """Closed forms, sample by sample."""
        time.sleep(self.delay * len(samples))
        inputs = self.design.values(samples)
        gain, h = inputs["rate.gain"], inputs["h"]
        bias = 0.3 / (level.nodes - 1) ** 2 + 0.1 / (level.quadrature_points - 1) ** 2
        bias += 1e-3 * 2.0 ** (-4 * level.halvings)
        peak = gain * (1.0 + gain * bias)
        margin = peak - 3.2 * h
        value = np.where(margin >= 0, peak / h, np.nan)
        failed = np.where(gain > FAILING_ABOVE, FIELD_NOT_FINITE, 0).astype(np.int64)
        for array in (peak, margin, value):
            array[failed != 0] = np.nan
        fields = None
        if len(times):
            shape = np.cos(np.pi * self.points(level))
            fields = peak[:, None, None] * np.exp(-np.asarray(times))[:, None] * shape
        return Records(
            samples=np.array(samples),
            inputs=inputs,
            values={"peak": peak, "time of return": value},
            margins={"time of return": margin},
            failed=failed,
            failed_at=np.where(failed != 0, 0.5, np.nan),
            fields=fields,
        )
