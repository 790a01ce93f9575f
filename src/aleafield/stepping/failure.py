"""Samples whose state is no longer finite."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray


def freeze(failed_at: FloatArray, time: float, *arrays: FloatArray) -> None:
    """Make rows in which any array is not finite NaN in all, and note the time where it is the first such event.

    Parameters
    ----------
    failed_at : float array (S,)
        NaN where nothing has happened so far; written.
    time : float
        Of the arrays.
    arrays : float arrays (S, n)
        Written where a row fails.
    """
    finite = np.logical_and.reduce([np.isfinite(array).all(axis=-1) for array in arrays])
    if finite.all():
        return
    failed_at[~finite & np.isnan(failed_at)] = time
    for array in arrays:
        array[~finite] = np.nan
