"""Bracketed roots of many scalar functions at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from aleafield.arrays import FloatArray, IntArray

WithSlope = Callable[[IntArray, FloatArray], tuple[FloatArray, FloatArray]]
"""(numbers of the functions (M,), places (M,)) -> values and slopes there, each (M,)."""

_LAST_NEWTON = 1e5
"""A Newton step of so many resolutions is the last one."""
_OVERSHOOT = 0.1
"""A Newton step that leaves the bracket by no more than this share of itself goes to the end of the bracket."""
_MOST_ITERATIONS = 200
"""Every second iteration halves the bracket or the step, so that about 110 always suffice."""


def bracketed_roots(
    function: WithSlope, above: FloatArray, below: FloatArray, start: FloatArray, resolution: float
) -> FloatArray:
    """A root of each function between a place where it is positive and one where it is not.

    Newton's method, kept inside the bracket; a step that leaves it by much, or that is more than half of the
    step before, is replaced by bisection.  Each root is frozen as soon as it is found, so that it has the same
    bits whatever else is searched beside it.

    Parameters
    ----------
    function : callable
        Evaluates a choice of the functions; the order of the choice ascends.
    above, below : float array (M,)
        Places where the function is positive and where it is zero or negative, in either order.
    start : float array (M,)
        First guess, inside the bracket.
    resolution : float
        A root is found where a bisection is not longer, or a Newton step not longer than 1e5 times that.

    Returns
    -------
    float array (M,); always inside the bracket, also where the function jumps or is not a number.

    References
    ----------
    Dekker 1969, "Finding a zero by means of successive linear interpolation": Newton or secant steps
    safeguarded by bisection (from memory).
    """
    above, below, place = above.copy(), below.copy(), start.copy()
    step = np.abs(above - below)
    searching = np.arange(len(place))
    for _ in range(_MOST_ITERATIONS):
        if searching.size == 0:
            break
        x = place[searching]
        value, slope = function(searching, x)
        positive = value > 0
        top = np.where(positive, x, above[searching])
        bottom = np.where(positive, below[searching], x)
        above[searching], below[searching] = top, bottom
        with np.errstate(all="ignore"):
            newton = x - value / slope
            # where the root is an end of the bracket, a step may leave it by rounding or by its own error
            nearest = np.clip(newton, np.minimum(top, bottom), np.maximum(top, bottom))
            inside = (np.abs(newton - nearest) <= _OVERSHOOT * np.abs(newton - x)) & (nearest != x)
            quick = np.abs(nearest - x) <= 0.5 * step[searching]
            # so short a Newton step squares the error to below rounding
            last = np.abs(newton - x) <= _LAST_NEWTON * resolution
        following = np.where(last | (inside & quick), nearest, 0.5 * (top + bottom))
        following = np.where(value == 0, x, following)
        length = np.abs(following - x)
        place[searching], step[searching] = following, length
        searching = searching[(length > resolution) & ~last]
    return place
