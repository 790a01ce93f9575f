"""The samples of a run: method, count after rounding, replicates, noise paths of each."""

from __future__ import annotations

from dataclasses import dataclass, replace

from aleafield.errors import InputError
from aleafield.randomness.points import SCRAMBLINGS
from aleafield.sampling.request import AskedMethod, SamplingMethod, SamplingRequest

LEAST_POINTS = 4
"""Least number of points of a scrambling, a power of two."""
MOST_REALIZATIONS = 2_000_000_000
"""Realizations are numbered by 32-bit integers."""


@dataclass(frozen=True)
class Allocation:
    """How many samples are drawn, and how.

    Attributes
    ----------
    method : SamplingMethod
    samples : int
        Count of parameter samples used; of noise paths where nothing but the noise is uncertain.
    replicates : int
        16 for quasi-Monte Carlo, else 1.
    note : str
        What was rounded or changed, and why; empty where nothing was.
    repeats : int
        Noise paths of each parameter sample.
    surrogate : bool
        Whether statistics are wanted from a polynomial chaos expansion fitted to these samples; the samples are
        the same without.
    """

    method: SamplingMethod
    samples: int
    replicates: int
    note: str = ""
    repeats: int = 1
    surrogate: bool = False

    @property
    def points_per_replicate(self) -> int:
        """Points of each scrambling."""
        return self.samples // self.replicates

    @property
    def realizations(self) -> int:
        """Solver runs at the level of the run: every noise path of every parameter sample."""
        return self.samples * self.repeats


def allocate(request: SamplingRequest, n_inputs: int, noisy: bool) -> Allocation:
    """The samples that a request gets.

    Quasi-Monte Carlo needs 16 scramblings of 2^k points, k >= 2, and rounds up; polynomial chaos is fitted to
    these very points.  Without inputs there is one run, and with noise as many independent noise paths as
    samples were asked for.

    Parameters
    ----------
    request : SamplingRequest
    n_inputs : int
        Number of uncertain inputs.
    noisy : bool
        Whether there is noise in the tissue.

    Raises
    ------
    InputError
        For more realizations than can be numbered.
    """
    if n_inputs == 0 and not noisy:
        note = "the study has no uncertain inputs: one run" if request.samples != 1 else ""
        return Allocation("monte carlo", 1, 1, note)
    repeats = request.noise_repeats if noisy else 1
    if n_inputs == 0:
        found = _numbered(Allocation("monte carlo", request.samples, 1, repeats=repeats))
        note = "nothing but the noise is uncertain: its paths are drawn independently (Monte Carlo)"
        return replace(found, note=note) if request.method == "quasi-monte carlo" else found
    if request.method == "monte carlo":
        return _numbered(Allocation("monte carlo", request.samples, 1, repeats=repeats))
    points = LEAST_POINTS
    while points * SCRAMBLINGS < request.samples:
        points *= 2
    samples = points * SCRAMBLINGS
    surrogate = request.method == "polynomial chaos"
    note = ""
    if samples != request.samples:
        taker = "polynomial chaos" if surrogate else "quasi-Monte Carlo"
        note = (
            f"{request.samples} samples asked, {samples} used: {taker} takes "
            f"{SCRAMBLINGS} scramblings of {points} points, a power of two"
        )
    return _numbered(Allocation("quasi-monte carlo", samples, SCRAMBLINGS, note, repeats, surrogate))


def extended(current: Allocation, more: int) -> Allocation:
    """At least `more` further parameter samples, with as many noise paths each.

    Quasi-Monte Carlo lengthens every scrambling to the next power of two.

    Raises
    ------
    InputError
        For more realizations than can be numbered.
    """
    wanted = current.samples + more
    if current.replicates == 1:
        return _numbered(Allocation(current.method, wanted, 1, repeats=current.repeats))
    method: AskedMethod = "polynomial chaos" if current.surrogate else "quasi-monte carlo"
    return allocate(SamplingRequest(method, wanted, current.repeats), n_inputs=1, noisy=True)


def _numbered(allocation: Allocation) -> Allocation:
    if allocation.realizations > MOST_REALIZATIONS:
        raise InputError(
            "sampling.samples",
            f"{allocation.samples:,} samples with {allocation.repeats:,} noise paths each",
            f"at most {MOST_REALIZATIONS:,} realizations are possible",
        )
    return allocation
