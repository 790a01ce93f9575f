"""Whether runs without a value come from particular inputs."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import BoolArray, FloatArray, IntArray

FALSE_ALARM = 0.01
"""Chance to suspect any input where failures strike at random."""
LEAST_FAILURES = 3
"""Fewer say nothing of where they come from."""


def failures_by_input(u: FloatArray, failed: BoolArray) -> FloatArray:
    """Probability, under failures that strike at random, of a tie to each input as strong as the one seen.

    The exact two-sided test of Kolmogorov that the coordinates of the failed runs are uniform.  Failures that are tied
    to an input bias every index of it; those that remain hold "given that the run succeeds".

    Parameters
    ----------
    u : float array (N, d)
        Points of the unit cube.
    failed : bool array (N,)

    Returns
    -------
    float array (d,)
        All 1 with fewer than LEAST_FAILURES failures.
    """
    if failed.sum() < LEAST_FAILURES:
        return np.ones(u.shape[1])
    from scipy.stats import kstest

    return np.array([float(kstest(column[failed], "uniform").pvalue) for column in u.T])


def tied_inputs(u: FloatArray, failed: BoolArray) -> IntArray:
    """Positions of the inputs to which failures are tied: FALSE_ALARM shared among all inputs.

    Parameters
    ----------
    u : float array (N, d)
    failed : bool array (N,)
    """
    return np.flatnonzero(failures_by_input(u, failed) < FALSE_ALARM / max(u.shape[1], 1))
