"""A number with the interval of its sampling error."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Estimate:
    """A statistic and its sampling interval.

    Attributes
    ----------
    value : float or None
        The statistic, in the units of the quantity (a probability has none); None where it is not determined.
    low, high : float or None
        Ends of the interval, low <= value <= high; None where the end is open or nothing is determined.
    reason : str or None
        Why something is None.
    """

    value: float | None
    low: float | None
    high: float | None
    reason: str | None = None


def exact(value: float) -> Estimate:
    """A number without sampling error: the interval has width zero."""
    return Estimate(value, value, value)


def nothing_given(valid: int) -> Estimate:
    """The estimate of what occurs in none of so many samples that did not fail."""
    if valid == 0:
        return Estimate(None, None, None, "not determined: all samples failed")
    return undetermined(valid, "it does not occur in any of them")


def undetermined(samples: int, needed: str = "") -> Estimate:
    """The estimate that so many samples cannot give; never a clipped guess.

    Parameters
    ----------
    samples : samples at hand
    needed : what would be enough, in words; may be empty
    """
    reason = f"not determined by {samples} samples"
    return Estimate(None, None, None, f"{reason}: {needed}" if needed else reason)
