"""How many modes of the noise are kept, and on which ring they live: settled once for a study."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from aleafield.field.equation import FieldEquation
from aleafield.field.noise import Correlation, CosineCorrelation, LengthCorrelation
from aleafield.field.parameter import bound
from aleafield.geometry import Domain
from aleafield.randomness.laws import Law

QUANTILE = 1.0 - 1e-6
"""Probability below what counts as the largest value of an unbounded law."""
TOLERANCE = 1e-4
"""Share of the variance that may be dropped, in every sample looked at, where the space carries the modes."""
SAMPLES = 1024
"""Samples, from the front of the stream, that are looked at."""
MOST_MODES = 16385
"""Where the number is cut off however many the space carries: 4 MB of noise a realization and generation."""
_SAFETY = 1.25


@dataclass(frozen=True)
class NoiseModes:
    """The modes of a study's noise.

    Attributes
    ----------
    modes : int
        Number of modes kept, odd: the constant and whole pairs of cosine and sine.
    length : float
        R, of the ring whose modes they are, units of length.
    dropped, dropped_finer : float or None
        Share of the variance beyond `modes` and beyond `finer` modes, mean over the samples looked at; None for
        white noise, whose variance is not finite.
    image_error : float
        Bound of the change of C on an interval by the images on the longer ring; 0 on a ring.
    note : str
        What the user must know; empty where there is nothing.
    """

    modes: int
    length: float
    dropped: float | None
    dropped_finer: float | None
    image_error: float = 0.0
    note: str = ""

    @property
    def finer(self) -> int:
        """Modes of the finer level of the part "noise_modes": twice the pairs and one."""
        return 2 * self.modes + 1

    @property
    def white(self) -> bool:
        """Whether no share of the variance is defined."""
        return self.dropped is None

    @property
    def exact(self) -> bool:
        """Whether nothing is dropped, as of a cosine correlation with all its waves."""
        return self.dropped == 0.0

    @property
    def factor(self) -> float:
        """F of the part "noise_modes": 1.25 s(m) / (s(m) - s(2m + 1)), s the dropped share."""
        if self.dropped is None or self.dropped_finer is None or not self.dropped > self.dropped_finer:
            return _SAFETY
        return _SAFETY * self.dropped / (self.dropped - self.dropped_finer)


def choose_modes(
    equation: FieldEquation, first: FieldEquation, unknowns: int, finest_unknowns: int
) -> NoiseModes | None:
    """The modes of an equation's noise; None where there is none.

    The fewest that drop at most `TOLERANCE` of the variance in every sample looked at, but no more than the
    unknowns carry (on an interval those of the longer ring, that many times R / L).  Cosine: all that have a
    coefficient.  White: as many as the finest level of the error split has unknowns.

    Parameters
    ----------
    equation : FieldEquation
        Unbound: the laws give the longest correlation length.
    first : FieldEquation
        The same, bound to the first `SAMPLES` samples.
    unknowns, finest_unknowns : int
        Dimension of the space at the run's level and at the finest level of the error split.
    """
    if equation.noise is None or first.noise is None:
        return None
    domain, correlation = equation.domain, first.noise.correlation
    length, image_error = _ring(domain, equation.noise.correlation, correlation)
    carried = unknowns * length / domain.length
    if isinstance(correlation, LengthCorrelation):
        return _fewest(correlation, length, carried, image_error)
    if isinstance(correlation, CosineCorrelation):
        return _all(correlation, length, unknowns)
    pairs = max(1, math.ceil((finest_unknowns * length / domain.length - 1.0) / 2.0))
    return NoiseModes(2 * pairs + 1, length, None, None)


def _ring(domain: Domain, unbound: Correlation, first: Correlation) -> tuple[float, float]:
    """Length of the ring whose modes are taken, and what its images change on an interval."""
    if domain.periodic:
        return domain.length, 0.0
    if not (isinstance(unbound, LengthCorrelation) and isinstance(first, LengthCorrelation)):
        return 2.0 * domain.length, 0.0
    longest = float(np.max(bound(first.correlation_length)))
    law = unbound.correlation_length
    if isinstance(law, Law):
        end = law.support[1]
        longest = end if math.isfinite(end) else float(law.ppf(np.array([QUANTILE]))[0])
    length = first.ring_around(domain.length, longest)
    return length, first.image_error(domain.length, length, longest)


def _all(correlation: CosineCorrelation, length: float, unknowns: int) -> NoiseModes:
    """All modes that have a coefficient."""
    waves = (correlation.modes - 1) // 2
    note = ""
    if 2 * waves > unknowns:
        note = (
            f"noise: {unknowns} unknowns hold waves up to {unknowns // 2}, the covariance has {waves}; on this mesh "
            "the shorter ones look like longer ones: use more nodes"
        )
    return NoiseModes(correlation.modes, length, 0.0, 0.0, note=note)


def _fewest(correlation: LengthCorrelation, length: float, carried: float, image_error: float) -> NoiseModes:
    """The fewest modes within the tolerance, or as many as the space carries."""

    def worst(pairs: int) -> float:
        return float(np.max(correlation.dropped(2 * pairs + 1, length)))

    most = max(1, math.floor((min(carried, MOST_MODES) - 1.0) / 2.0))
    low, high = 0, most  # the share falls with the number of pairs
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if worst(middle) <= TOLERANCE else (middle, high)
    modes, share = 2 * high + 1, worst(high)
    note = ""
    if share > TOLERANCE:
        limit = "as many as are possible" if carried > MOST_MODES else "as many as the nodes carry"
        certain = np.ndim(bound(correlation.correlation_length)) == 0
        note = (
            f"noise: {modes} modes, {limit}, leave out {100 * share:.3g} % of its variance"
            + ("" if certain else " at the shortest correlation length looked at")
            + (" (rough in space: a share like 1 / modes)" if correlation.roughness == "rough" else "")
            + "; what that does is the part noise_modes of every error"
        )
        if carried > MOST_MODES and not certain:
            note += (
                f"; the ring of length {length:.4g} follows from the upper end of the law of correlation_length: a law "
                "with a bound, such as truncated_normal, makes it shorter"
            )
    kept = NoiseModes(modes, length, 0.0, 0.0, image_error, note)
    shares = [float(np.mean(correlation.dropped(count, length))) for count in (modes, kept.finer)]
    return replace(kept, dropped=shares[0], dropped_finer=shares[1])
