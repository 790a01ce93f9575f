"""The samples of a run: method, count after rounding, replicates."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.randomness.points import SCRAMBLINGS
from aleafield.sampling.request import SamplingMethod, SamplingRequest

LEAST_POINTS = 4
"""Least number of points of a scrambling, a power of two."""


@dataclass(frozen=True)
class Allocation:
    """How many samples are drawn, and how.

    Attributes
    ----------
    method : SamplingMethod
    samples : int
        Count used.
    replicates : int
        16 for quasi-Monte Carlo, else 1.
    note : str
        What was rounded or changed, and why; empty where nothing was.
    """

    method: SamplingMethod
    samples: int
    replicates: int
    note: str = ""

    @property
    def points_per_replicate(self) -> int:
        """Points of each scrambling."""
        return self.samples // self.replicates


def allocate(request: SamplingRequest, n_inputs: int) -> Allocation:
    """The samples that a request gets.

    Quasi-Monte Carlo needs 16 scramblings of 2^k points, k >= 2, and rounds up; without inputs there is one run.
    """
    if n_inputs == 0:
        note = "the study has no uncertain inputs: one run" if request.samples != 1 else ""
        return Allocation("monte carlo", 1, 1, note)
    if request.method == "monte carlo":
        return Allocation("monte carlo", request.samples, 1)
    points = LEAST_POINTS
    while points * SCRAMBLINGS < request.samples:
        points *= 2
    samples = points * SCRAMBLINGS
    note = ""
    if samples != request.samples:
        note = (
            f"{request.samples} samples asked, {samples} used: quasi-Monte Carlo takes "
            f"{SCRAMBLINGS} scramblings of {points} points, a power of two"
        )
    return Allocation("quasi-monte carlo", samples, SCRAMBLINGS, note)


def extended(current: Allocation, more: int) -> Allocation:
    """At least `more` further samples; quasi-Monte Carlo lengthens every scrambling to the next power of two."""
    wanted = current.samples + more
    if current.replicates == 1:
        return Allocation(current.method, wanted, 1)
    larger = allocate(SamplingRequest("quasi-monte carlo", wanted), n_inputs=1)
    return Allocation(larger.method, larger.samples, larger.replicates, larger.note)
