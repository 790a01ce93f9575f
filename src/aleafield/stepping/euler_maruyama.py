"""The Euler-Maruyama method for additive noise on a fixed schedule."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.stepping.failure import freeze
from aleafield.stepping.schedule import Schedule
from aleafield.stepping.system import IncrementSource, NoisySystem, StepObserver
from aleafield.stepping.view import NoisyStep


def stability_bound(time_constant: float | FloatArray, gain: float | FloatArray) -> FloatArray:
    """Largest step at which no decaying mode of tau u' = -u + A u grows, for |A| <= gain; broadcast shape.

    Its eigenvalues lie within (1 + gain) / tau of 0, and 1 + z is at most 1 in size for real z from -2 to 0.
    With additive noise the variance of such a mode stays bounded on the same condition.
    """
    return np.asarray(2.0 * np.asarray(time_constant) / (1.0 + np.asarray(gain)), dtype=np.float64)


def integrate(
    system: NoisySystem,
    schedule: Schedule,
    paths: IncrementSource,
    observers: Sequence[StepObserver[NoisyStep]],
    steps_per_base: int,
) -> FloatArray:
    """Follow a batch through the schedule along its noise paths.

    A step is u + (t1 - t0) F(t0, u) + G dW.  Switches in time are decided inside the step, at its middle.  A
    sample that becomes infinite or not a number is NaN from then on; the others go on.

    Parameters
    ----------
    system : NoisySystem
    schedule : Schedule
    paths : IncrementSource
        Its base steps are joined steps of the schedule.
    observers : sequence of StepObserver
        They see the increments over all sub-steps of a step.
    steps_per_base : int
        Steps of the schedule in a base step of the paths; it divides the number of sub-steps.

    Returns
    -------
    float array (S,)
        The end of the first step after which a sample's state is not finite; NaN where all are.

    Notes
    -----
    For additive noise the strong order is 1, as for the Milstein method, which is the same there.

    References
    ----------
    Maruyama 1955; Kloeden and Platen 1992, "Numerical Solution of Stochastic Differential Equations", sections
    10.2 and 10.3 (from memory).
    """
    times = schedule.times.tolist()
    with np.errstate(all="ignore"):
        u = system.initial()
        failed_at = np.full(len(u), np.nan)
        freeze(failed_at, times[0], u)
        for observer in observers:
            observer.start(times[0], u)
        of_base = np.empty((0, 0, 0))
        for index, (start, end) in enumerate(pairwise(times)):
            base, place = divmod(index, steps_per_base)
            if place == 0:
                of_base = paths.base_step(base)
            parts = len(of_base) // steps_per_base
            increments = of_base[place * parts : (place + 1) * parts]
            u_next = system.rate_of_change(start, u, 0.5 * (start + end))
            u_next *= end - start
            u_next += u
            u_next += system.noise(_sum(increments))
            freeze(failed_at, end, u_next)
            view = NoisyStep(start, u, end, u_next, index, increments)
            for observer in observers:
                observer.step(view)
            u = u_next
    return failed_at


def _sum(increments: FloatArray) -> FloatArray:
    """Sum (S, m) over P sub-steps, P a power of two, by pairs: the order does not depend on S and m."""
    while len(increments) > 1:
        increments = increments[0::2] + increments[1::2]
    total: FloatArray = increments[0]
    return total
