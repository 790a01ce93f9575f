"""The same indices by SALib, on complete designs only."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray


def salib_indices(values: FloatArray) -> tuple[FloatArray, FloatArray]:
    """First-order and total indices by SALib's Sobol' analysis: Saltelli 2010 and Jansen 1999 (from memory).

    It has one output at a time, assumes independent rows in its intervals (which are therefore not used), and turns all
    indices to 0 without a warning if a single number is missing: only whole rows are handed over.

    Parameters
    ----------
    values : float array (N, 2 d + 2, o)
        Runs A, B, AB_1 .. AB_d, BA_1 .. BA_d of every row.

    Returns
    -------
    first, total : float arrays (d, o)
        NaN for an output with fewer than two whole rows or without spread.
    """
    from SALib.analyze import sobol

    n_runs, n_outputs = values.shape[1:]
    d = (n_runs - 2) // 2
    first, total = np.full((d, n_outputs), np.nan), np.full((d, n_outputs), np.nan)
    problem = {"num_vars": d, "names": [str(i) for i in range(d)], "bounds": [[0.0, 1.0]] * d}
    order = [0, *range(2, n_runs), 1]
    for output in range(n_outputs):
        rows = values[np.isfinite(values[:, :, output]).all(axis=1), :, output]
        if len(rows) < 2 or np.ptp(rows) == 0.0:
            continue
        found = sobol.analyze(
            problem, rows[:, order].reshape(-1), calc_second_order=True, num_resamples=2, seed=1
        )
        first[:, output], total[:, output] = found["S1"], found["ST"]
    return first, total
