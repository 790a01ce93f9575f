"""Counting how often intervals hold the truth, with bounds derived from the binomial law."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.stats import binom, norm, qmc

from aleafield.estimates import Estimate, Sample

FALSE_ALARM = 1e-3
"""Chance that a test of coverage fails although the true coverage is as stated."""


def least_hits(trials: int, coverage: float = 0.95) -> int:
    """Fewest hits that do not refute a coverage, at the false alarm of this module (one-sided, exact).

    P(K < least) <= FALSE_ALARM for K binomial(trials, coverage).
    """
    return int(binom.ppf(FALSE_ALARM, trials, coverage))


def hits(samples: list[Sample], estimate: Callable[[Sample], Estimate], truth: float) -> int:
    """How many intervals hold the truth."""
    found = [estimate(sample) for sample in samples]
    return sum(e.low is not None and e.high is not None and e.low <= truth <= e.high for e in found)


def normal_scramblings(trials: int, points: int, columns: int, seed: int) -> NDArray[np.float64]:
    """Standard normals from 16 independently scrambled Sobol' sequences: (trials, 16 points, columns).

    Realization i is point i // 16 of scrambling i % 16.
    """
    generator = np.random.default_rng(seed)
    shape = (trials, points, 16, columns)
    unit = np.empty(shape)
    for trial in range(trials):
        for scrambling in range(16):
            unit[trial, :, scrambling] = qmc.Sobol(columns, rng=generator).random(points)
    middle = np.clip(unit, 1e-9, 1.0 - 1e-9)
    return np.asarray(norm.ppf(middle)).reshape(trials, points * 16, columns)
