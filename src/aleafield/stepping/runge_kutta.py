"""The classical Runge-Kutta method of order 4 on a fixed schedule."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.stepping.failure import freeze
from aleafield.stepping.schedule import Schedule
from aleafield.stepping.system import SemiDiscreteSystem, StepObserver
from aleafield.stepping.view import StepView

REAL_AXIS = 2.785293563405282
"""1 + z + z^2/2 + z^3/6 + z^4/24 is at most 1 in size for real z from minus this to 0."""


def stability_bound(time_constant: float | FloatArray, gain: float | FloatArray) -> FloatArray:
    """Largest step at which no decaying mode of tau u' = -u + A u grows, for |A| <= gain; broadcast shape.

    Its eigenvalues lie within (1 + gain) / tau of 0 (`Discretisation.gain` estimates |A|).  Exact for real
    eigenvalues, which symmetric kernels have.

    References
    ----------
    Hairer and Wanner 1996, "Solving Ordinary Differential Equations II", section IV.2 (from memory).
    """
    return np.asarray(REAL_AXIS * np.asarray(time_constant) / (1.0 + np.asarray(gain)), dtype=np.float64)


def integrate(
    system: SemiDiscreteSystem, schedule: Schedule, observers: Sequence[StepObserver[StepView]]
) -> FloatArray:
    """Follow a batch through the schedule.

    The derivative at the end of a step serves the observers and is the first stage of the next step, except
    where the limits from the two sides may differ: at fixed times (a drive may switch there), or everywhere
    if the system says so.  A sample that becomes infinite or not a number is NaN from then on; the others
    go on.

    Parameters
    ----------
    system : SemiDiscreteSystem
    schedule : Schedule
    observers : sequence of StepObserver

    Returns
    -------
    float array (S,)
        The end of the first step after which a sample's state or derivative is not finite; NaN where all are.

    References
    ----------
    Kutta 1901; Hairer, Norsett and Wanner 1993, "Solving Ordinary Differential Equations I", section II.1
    (from memory).
    """
    times = schedule.times.tolist()
    ends_of_spans = set(np.cumsum(schedule.counts).tolist())
    with np.errstate(all="ignore"):
        u = system.initial()
        failed_at = np.full(len(u), np.nan)
        freeze(failed_at, times[0], u)
        for observer in observers:
            observer.start(times[0], u)
        stage = np.empty_like(u)
        slope: FloatArray | None = None
        for index, (start, end) in enumerate(pairwise(times)):
            inside = 0.5 * (start + end)
            if slope is None:
                slope = system.rate_of_change(start, u, inside)
            u_next = _step(system, (start, inside, end), u, slope, stage)
            slope_next = system.rate_of_change(end, u_next, inside)
            freeze(failed_at, end, u_next, slope_next)
            view = StepView(start, u, slope, end, u_next, slope_next)
            for observer in observers:
                observer.step(view)
            u = u_next
            slope = None if system.restarts or index + 1 in ends_of_spans else slope_next
    return failed_at


def _step(
    system: SemiDiscreteSystem,
    times: tuple[float, float, float],
    u: FloatArray,
    slope: FloatArray,
    stage: FloatArray,
) -> FloatArray:
    """State after one step with that start, middle and end; `stage` is working space of the shape of u."""
    start, middle, end = times
    length = end - start
    np.multiply(slope, 0.5 * length, out=stage)
    stage += u
    second = system.rate_of_change(middle, stage, middle)
    np.multiply(second, 0.5 * length, out=stage)
    stage += u
    third = system.rate_of_change(middle, stage, middle)
    np.multiply(third, length, out=stage)
    stage += u
    fourth = system.rate_of_change(end, stage, middle)

    third += second
    third *= 2.0
    third += slope
    third += fourth
    third *= length / 6.0
    third += u
    return third
