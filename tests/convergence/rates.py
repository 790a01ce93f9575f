"""Observed orders of convergence."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np


def observed_orders(errors: Sequence[float], sizes: Sequence[float]) -> list[float]:
    """Order between each level and the next: log(e_i / e_(i+1)) / log(h_i / h_(i+1)).

    Parameters
    ----------
    errors : positive numbers, one for each level
    sizes : positive numbers h
        Mesh width, step, or 1 / count of each level.  The true ratio of two levels is used, so that
        33 -> 65 points count as they are.

    Examples
    --------
    >>> [round(p, 12) for p in observed_orders([0.09, 0.01, 0.0025], [0.3, 0.1, 0.05])]
    [2.0, 2.0]
    """
    if len(errors) != len(sizes):
        raise ValueError(f"{len(errors)} errors for {len(sizes)} sizes")
    e, h = np.asarray(errors, dtype=np.float64), np.asarray(sizes, dtype=np.float64)
    if not (np.all(e > 0.0) and np.all(h > 0.0)):
        raise ValueError(f"orders need positive errors and sizes, not {errors} and {sizes}")
    return [float(p) for p in np.log(e[:-1] / e[1:]) / np.log(h[:-1] / h[1:])]
