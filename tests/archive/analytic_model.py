"""A forward model in closed form, with noise if asked: as quick as its `delay` lets it be, and picklable."""

from __future__ import annotations

import time
from collections.abc import Sequence

import numpy as np
from scipy.special import ndtri

from aleafield.arrays import FloatArray, IntArray
from aleafield.ensemble.level import Level, PathPart
from aleafield.ensemble.records import FIELD_NOT_FINITE, Records
from aleafield.randomness.design import Design
from aleafield.randomness.families import Family
from aleafield.randomness.inputs import Dependence, Input
from aleafield.randomness.laws import Normal, Uniform
from aleafield.randomness.points import PlainPoints
from aleafield.sampling.request import SamplingMethod

INPUTS = (Input("rate.gain", Uniform(0.8, 1.2), "mV-1"), Input("h", Normal(0.3, 0.02), "1"))
DURATION = 2.0
FAILING_ABOVE = 1.19
"""Samples whose gain lies above this fail: about one in forty."""
NOISE = 0.1
"""Standard deviation of the noise at t = 1."""
MODES = 5
"""Noise modes of the run."""
MOST_REPEATS = 64
"""Noise paths that a sample may have."""


def noise_of(realizations: IntArray, repeats: int) -> FloatArray:
    """Two independent standard normal numbers of each realization, (S, 2): of its sample and repeat alone."""
    sample, repeat = np.divmod(realizations, repeats)
    return np.asarray(ndtri(PlainPoints(2, 11).at(sample * MOST_REPEATS + repeat)))


class AnalyticModel:
    """u = gain exp(-t) cos(pi x) on [-1, 1], with errors of order 2 in nodes and points and 4 in the step.

    Quantities: "peak" (always occurs) and "time of return", which occurs where gain >= 3.2 h.

    With noise the field has NOISE t (z_1 cos(pi x) + z_2 sin(pi x)) besides, of variance (NOISE t)^2 and spatial
    correlation cos(pi r) everywhere, and the peak NOISE z_1; the history of the peak is
    (gain exp(-t) + NOISE t z_1), and modes beyond those that are kept add 1e-3 / modes to the peak.

    Parameters
    ----------
    method : method of the sampling
    nodes : nodes of the run
    delay : seconds that a sample takes
    parts : how many parts its path has, the time part last, or the noise part
    repeats : noise paths of each sample; 0 without noise
    inputs : the uncertain inputs, two or none; without them gain is 1 and h is 0.3
    """

    def __init__(
        self,
        method: SamplingMethod = "quasi-monte carlo",
        nodes: int = 17,
        delay: float = 0.0,
        parts: int = 4,
        repeats: int = 0,
        inputs: Sequence[Input] = INPUTS,
    ) -> None:
        self.design = Design(inputs, Dependence(), method, 7)
        self.noisy = repeats > 0
        self.level = Level(nodes, nodes, modes=MODES if self.noisy else 0)
        self._repeats = max(repeats, 1)
        self.delay = delay
        self.parts = parts

    @property
    def inputs(self) -> Sequence[Input]:
        """Two of them, or none."""
        return self.design.inputs

    @property
    def repeats(self) -> int:
        """Noise paths of each sample."""
        return self._repeats

    def points(self, level: Level) -> FloatArray:
        """Equally spaced."""
        return np.linspace(-1.0, 1.0, level.nodes)

    def operations(self, level: Level) -> float:
        """Nodes, points and steps; so many that worker processes seem worth their start."""
        return 1e8 * level.nodes * level.quadrature_points * 2.0**level.halvings

    def path(self, level: Level) -> tuple[PathPart, ...]:
        """Quadrature, space and time, all with a coarser pair, and with noise its modes, without one."""
        n, q, m = level.nodes, level.quadrature_points, level.modes
        a, b, c, d = level, Level(n, 2 * q - 1, 0, m), Level(2 * n - 1, 2 * q - 1, 0, m), Level(n, q, 1, m)
        a0, b0 = Level((n + 1) // 2, (q + 1) // 2, 0, m), Level((n + 1) // 2, q, 0, m)
        d0 = Level(n, q, -1, m)
        path: tuple[PathPart, ...] = (
            PathPart("quadrature", (a, b), (a0, b0), 2.0, 2.0, 2.0),
            PathPart("space", (b, c), (b0, a), 2.0, 2.0, 2.0, least_factor={"peak": 2.0}),
            PathPart("time", (a, d), (d0, a), 2.0, 2.0, 4.0, peaks=frozenset({"peak"})),
        )
        if m:
            finer = Level(n, q, 0, 2 * m + 1)
            path += (PathPart("noise_modes", (a, finer), None, 2.0, 2.0, None, known_factor=1.5),)
        return path[-self.parts :]

    def evaluate(
        self, level: Level, realizations: IntArray, times: Sequence[float] = (), family: Family = "main"
    ) -> Records:
        """Closed forms, realization by realization."""
        time.sleep(self.delay * len(realizations))
        inputs = self.design.values_at(self.design.points(family, realizations // self._repeats))
        gain = inputs.get("rate.gain", np.ones(len(realizations)))
        h = inputs.get("h", np.full(len(realizations), 0.3))
        bias = 0.3 / (level.nodes - 1) ** 2 + 0.1 / (level.quadrature_points - 1) ** 2
        bias += 1e-3 * 2.0 ** (-4 * level.halvings)
        amplitude = gain * (1.0 + gain * bias)
        noise = np.zeros((len(realizations), 2))
        if self.noisy:
            noise = NOISE * noise_of(realizations, self._repeats)
            amplitude += 1e-3 / level.modes
        peak = amplitude + noise[:, 0]
        margin = peak - 3.2 * h
        value = np.where(margin >= 0, peak / h, np.nan)
        failed = np.where(gain > FAILING_ABOVE, FIELD_NOT_FINITE, 0).astype(np.int64)
        for array in (peak, margin, value):
            array[failed != 0] = np.nan
        fields, histories = None, {}
        if len(times):
            t, angle = np.asarray(times), np.pi * self.points(level)
            along = amplitude[:, None] * np.exp(-t) + noise[:, :1] * t
            across = noise[:, 1:] * t
            fields = along[:, :, None] * np.cos(angle) + across[:, :, None] * np.sin(angle)
            if self.noisy:
                histories = {"peak": np.where(failed[:, None] != 0, np.nan, along)}
        return Records(
            realizations=np.array(realizations),
            inputs=inputs,
            values={"peak": peak, "time of return": value},
            margins={"time of return": margin},
            failed=failed,
            failed_at=np.where(failed != 0, 0.5, np.nan),
            fields=fields,
            histories=histories,
        )
