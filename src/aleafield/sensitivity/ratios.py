"""Shares of a variance with the jackknife over independent blocks, for all outputs at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import stdtr

from aleafield.arrays import BoolArray, FloatArray
from aleafield.estimates.blocks import student

MOST_MISSING = 0.05
"""Above this share of runs without a value no index is stated: those that are left are no longer independent."""


def missing_reason(share: float) -> str:
    """Why nothing is stated of an output that so large a share of the runs leaves without a value."""
    return (
        f"not determined: {100 * share:.3g} % of the runs give no value; above {100 * MOST_MISSING:g} % the inputs "
        "of those that are left are no longer independent"
    )


def jackknife_error(without: FloatArray) -> FloatArray:
    """Standard error from replicates (G, ...) that leave out one of G blocks each; shape (...)."""
    blocks = len(without)
    error: FloatArray = np.sqrt((blocks - 1) / blocks * np.square(without - without.mean(axis=0)).sum(axis=0))
    return error


@dataclass(frozen=True, eq=False)
class Indices:
    """Numbers with intervals, one for every input and output.

    Attributes
    ----------
    value : float array (k, o)
        Index of input (or group, or pair) k for output o; NaN where none is stated.  Nothing is clipped: an
        estimate may lie a little outside [0, 1].
    low, high : float arrays (k, o)
        value -+ t standard errors of the jackknife, G - 1 degrees of freedom.
    without : float array (G, k, o)
        The same numbers without one block at a time.
    confidence : float
    reason : tuple of (str or None), one for every output
        Why none is stated.
    """

    value: FloatArray
    low: FloatArray
    high: FloatArray
    without: FloatArray
    confidence: float
    reason: tuple[str | None, ...]

    @staticmethod
    def of(
        value: FloatArray, without: FloatArray, confidence: float, reason: tuple[str | None, ...]
    ) -> Indices:
        """Indices from their values (k, o) and jackknife replicates (G, k, o)."""
        half = student(confidence, len(without) - 1) * jackknife_error(without)
        return Indices(value, value - half, value + half, without, confidence, reason)

    @property
    def degrees(self) -> int:
        """Degrees of freedom, the number of blocks less one."""
        return len(self.without) - 1

    @property
    def standard_error(self) -> FloatArray:
        """Standard errors, (k, o)."""
        return jackknife_error(self.without)

    def at_most(self, confidence: float) -> FloatArray:
        """Upper ends of one-sided intervals, (k, o)."""
        # the two-sided quantile of 2 c - 1 is the one-sided one of c
        upper: FloatArray = self.value + student(2 * confidence - 1, self.degrees) * self.standard_error
        return upper

    def minus(self, other: Indices) -> Indices:
        """The differences from indices of the same rows, as of the same study on another mesh.

        What both have in common falls out of the difference, replicate by replicate: 32 rows resolve a bias of
        discretisation that lies far below the sampling error of either.
        """
        reason = tuple(a or b for a, b in zip(self.reason, other.reason, strict=True))
        return Indices.of(self.value - other.value, self.without - other.without, self.confidence, reason)

    def exceeds(self) -> FloatArray:
        """Certainty that one index is larger than another, (k, k, o): entry (i, j) that i exceeds j.

        Student's distribution function of the difference over its standard error; 0.5 on the diagonal, and
        where neither difference nor error is left.
        """
        difference = self.value[:, None] - self.value[None, :]
        error = jackknife_error(self.without[:, :, None] - self.without[:, None, :])
        with np.errstate(invalid="ignore", divide="ignore"):
            standardised = difference / error
        level = (difference == 0.0) & (error == 0.0)
        certainty: FloatArray = stdtr(self.degrees, np.where(level, 0.0, standardised))
        return certainty


@dataclass(frozen=True, eq=False)
class Ratios:
    """Parts of a variance and the variance itself, estimated from the same rows.

    Attributes
    ----------
    part, whole : float arrays (k, o)
        In the square of the units of the output.
    part_without, whole_without : float arrays (G, k, o)
        The same without one block at a time.
    reason : tuple of (str or None), one for every output
        Why nothing is stated of it.
    """

    part: FloatArray
    whole: FloatArray
    part_without: FloatArray
    whole_without: FloatArray
    reason: tuple[str | None, ...]

    def indices(self, confidence: float) -> Indices:
        """part / whole with its jackknife interval; NaN for outputs with a reason."""
        with np.errstate(invalid="ignore", divide="ignore"):
            value = self.part / self.whole
            without = self.part_without / self.whole_without
        silent = self._silent()
        return Indices.of(
            np.where(silent, np.nan, value), np.where(silent, np.nan, without), confidence, self.reason
        )

    def _silent(self) -> BoolArray:
        return np.array([reason is not None for reason in self.reason], dtype=np.bool_)

    def aggregated(self, weights: FloatArray) -> Ratios:
        """One output from all: parts and wholes summed over outputs with weights (o,), as of a quadrature rule.

        The index of a field as a whole (Gamboa, Janon, Klein and Lagnoux 2014, Lamboni, Monod and Makowski
        2011; from memory): each node counts by its variance.  Outputs without spread add nothing; where too many
        runs are missing at a node with a weight, nothing is stated of the whole.
        """
        reason: str | None = None
        spread = np.nan_to_num(self.whole).max(axis=0) > 0.0
        for position in np.flatnonzero(self._silent() & (weights != 0.0)):
            if self.reason[position] != NO_SPREAD:
                reason = self.reason[position]
        if reason is None and not (spread & (weights != 0.0)).any():
            reason = NO_SPREAD
        kept = np.where(spread, weights, 0.0)

        def total(values: FloatArray) -> FloatArray:
            summed: FloatArray = (np.nan_to_num(values) @ kept)[..., None]
            return summed

        return Ratios(
            total(self.part),
            total(self.whole),
            total(self.part_without),
            total(self.whole_without),
            (reason,),
        )


NO_SPREAD = "not determined: all values are equal, there is no variance to part"


def plain_reasons(
    missing: FloatArray, whole: FloatArray, fewest: int, least: int, of: str
) -> tuple[str | None, ...]:
    """Why nothing is stated, for every output; None where nothing stands in the way.

    Parameters
    ----------
    missing : float array (o,)
        Share of the runs without a value.
    whole : float array (o,)
        The variance.
    fewest : int
        Rows in the smallest block.
    least : int
        Rows that a block needs.
    of : str
        What the rows are for, as in "a first-order index".
    """
    if fewest < least:
        needed = f"not determined: {of} needs {least} points in every scrambling, there are {fewest}"
        return (needed,) * len(missing)
    reasons: list[str | None] = []
    for share, variance in zip(missing, whole, strict=True):
        if share > MOST_MISSING:
            reasons.append(missing_reason(float(share)))
        elif not variance > 0.0:
            reasons.append(NO_SPREAD)
        else:
            reasons.append(None)
    return tuple(reasons)
