"""Numbers about causes (indices, what remains of a spread) put together into statements."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np

from aleafield.accounting.statement import ERROR_KEYS, Statement, no_statement, representable
from aleafield.arrays import FloatArray
from aleafield.sensitivity.ratios import NO_SPREAD, Indices

SHARE = (0.0, 1.0)
"""Limits of an index."""
SPREAD = (0.0, math.inf)
"""Limits of a standard deviation."""


@dataclass(frozen=True, eq=False)
class Numbers:
    """One number for each input (or pair of inputs) with its interval before any discretisation error.

    Attributes
    ----------
    value, low, high : float arrays (k,)
        NaN where nothing is stated.
    source : "sampling" or "surrogate"
        What the interval is about, a member of `Statement.error`.
    reasons : tuple of (str or None), k of them
        Why nothing is stated.
    """

    value: FloatArray
    low: FloatArray
    high: FloatArray
    source: Literal["sampling", "surrogate"]
    reasons: tuple[str | None, ...]

    @staticmethod
    def sampled(found: Indices) -> Numbers:
        """The only output (k, 1) of an estimate from samples."""
        return Numbers(
            found.value[:, 0], found.low[:, 0], found.high[:, 0], "sampling", found.reason * len(found.value)
        )

    @staticmethod
    def from_surrogate(value: FloatArray, low: FloatArray, high: FloatArray) -> Numbers:
        """Numbers (k,) of a surrogate; NaN where it has no variance."""
        reasons = tuple(None if math.isfinite(v) else NO_SPREAD for v in value)
        return Numbers(value, low, high, "surrogate", reasons)

    @staticmethod
    def nothing(reason: str, k: int) -> Numbers:
        """k numbers that are not determined."""
        none = np.full(k, np.nan)
        return Numbers(none, none, none, "sampling", (reason,) * k)


@dataclass(frozen=True, eq=False)
class Changes:
    """Bounds on what the discretisation does to k numbers.

    Attributes
    ----------
    size, noise : mapping of part to float array (k,)
        F |D| and the half-width of F D, D the difference between the run and the finer level.
    unmeasured : tuple of str
        Parts that apply but could not be measured.
    note : str or None
        Why not.
    """

    size: Mapping[str, FloatArray]
    noise: Mapping[str, FloatArray]
    unmeasured: tuple[str, ...] = ()
    note: str | None = None

    def bound(self) -> FloatArray | float:
        """Sum of sizes and noises, (k,); 0 without parts."""
        noise = sum((np.square(part) for part in self.noise.values()), start=np.zeros(()))
        size: FloatArray = sum(self.size.values(), start=np.zeros(())) + np.sqrt(noise)
        return size


def statements(
    numbers: Numbers, changes: Changes, limits: tuple[float, float], notes: tuple[str, ...] = ()
) -> tuple[Statement, ...]:
    """A statement for each number.

    Parameters
    ----------
    numbers : Numbers
    changes : Changes
    limits : (float, float)
        Smallest and largest possible value: intervals are cut there, values and errors are not.  An interval that
        lies outside altogether begins there.
    notes : tuple of str

    Returns
    -------
    tuple of Statement, k of them
        With B the sum of the sizes, N^2 that of the squared noises and (l, r) the lengths of the interval to both
        sides: [v - B - hypot(l, N), v + B + hypot(r, N)] from samples, [v - B - l - N, v + B + r + N] from a
        surrogate, whose error is a bound like those of the discretisation.
    """
    said = notes if changes.note is None else (*notes, changes.note)
    return tuple(_statement(numbers, changes, k, limits, said) for k in range(len(numbers.value)))


def _statement(
    numbers: Numbers, changes: Changes, k: int, limits: tuple[float, float], notes: tuple[str, ...]
) -> Statement:
    reason = numbers.reasons[k]
    if reason is not None:
        return no_statement(reason)
    value = float(numbers.value[k])
    left, right = max(value - float(numbers.low[k]), 0.0), max(float(numbers.high[k]) - value, 0.0)
    sizes = {name: float(part[k]) for name, part in changes.size.items()}
    noise = math.hypot(*(float(part[k]) for part in changes.noise.values()))
    bias = math.fsum(sizes.values())

    def side(half: float) -> float:
        return bias + (math.hypot(half, noise) if numbers.source == "sampling" else half + noise)

    low, high = value - side(left), value + side(right)
    # an estimate may lie outside by more than its error: then what is possible next to it, as far as the error reaches
    if high < limits[0]:
        low, high = limits[0], limits[0] + side(right)
    elif low > limits[1]:
        low, high = limits[1] - side(left), limits[1]
    low, high = max(low, limits[0]), min(high, limits[1])
    error: dict[str, float | None] = dict.fromkeys(ERROR_KEYS)
    error.update(sizes, bias_noise=noise if sizes else None, total=max(side(left), side(right)))
    error[numbers.source] = max(left, right)
    return representable(Statement(value, error, (low, high), notes=notes))


def complement(share: Statement) -> Statement:
    """The share that a share leaves of 1, with the same error: from the parameters' share that of the noise."""
    if share.value is None or share.interval is None:
        return share
    low, high = share.interval
    return Statement(
        1.0 - share.value,
        share.error,
        (None if high is None else 1.0 - high, None if low is None else 1.0 - low),
        notes=share.notes,
        orders=share.orders,
    )
