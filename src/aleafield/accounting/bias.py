"""Size and noise of the bias that one discretisation part gives to a statistic."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from aleafield.accounting.measured import MeasuredPart, PairedValues
from aleafield.accounting.order import SAFETY, safety_factor
from aleafield.accounting.regression import Shift
from aleafield.accounting.shifted import range_of
from aleafield.accounting.statistic import MEAN, Statistic
from aleafield.arrays import FloatArray
from aleafield.estimates.blocks import BlockArray
from aleafield.estimates.sd import standard_deviation

OPEN = (
    "extremes over a window of a noisy path are seen at the ends of steps only (order 1/2 at best); those of a point "
    "value, mean or integral of the field are found between steps too"
)
"""Why a part has an open side, and what to do."""


@dataclass(frozen=True)
class Bias:
    """A bound on the bias of a statistic, in its units.

    Attributes
    ----------
    size : float
        F b: enters the total linearly.
    noise : float
        F h: half-width of the bias estimate, enters in quadrature with the sampling error.
    correction : float
        The best guess of the signed bias, run minus truth.  Offered for the mean only: f mean D; where the
        quantity may not occur, f / F times the change of the mean in the shifted sample, because the probes
        show few of the samples that cease or come to occur.
    """

    size: float
    noise: float
    correction: float = 0.0


@dataclass(frozen=True)
class Unmeasured:
    """A bias that the probes do not determine, and why."""

    reason: str


def bias_of(
    measured: MeasuredPart, statistic: Statistic, value: float, confidence: float
) -> Bias | Unmeasured:
    """The bias that one part gives to a statistic of the run.

    Parameters
    ----------
    measured : MeasuredPart
    statistic : Statistic
    value : float
        The statistic of the whole sample.
    confidence : float in (0, 1)

    Returns
    -------
    Bias or Unmeasured
        Mean and sd: from influence values per probe.  Quantiles and probabilities: from the regression of
        the difference on the quantity, applied to the whole sample; counting samples that cross a level, or
        comparing quantiles of the probes, sees too little.  For the position of a peak the larger of the
        finer difference and the scaled coarser one.
    """
    name = measured.part.name
    if not measured.usable.any():
        return Unmeasured(f"the {name} part cannot be measured: every probe failed")
    if statistic.kind == "sd" and measured.sample.certain:
        return Bias(0.0, 0.0)
    sides = measured.open_sides(statistic)
    if len(sides) == 2 or (sides and statistic.kind == "sd"):
        return Unmeasured(f"the {name} part gives no bound: {OPEN}")
    if statistic.kind not in ("exceed", "occurs") and not measured.enough_pairs:
        return Unmeasured(f"the {name} part cannot be measured: the quantity occurs on too few probes")
    if statistic.has_influence:
        found = _influence_bias(measured, statistic, value, confidence)
    else:
        found = _shift_bias(measured, statistic, value, confidence)
    if found is None:
        return Unmeasured(f"with the {name} part the quantity might not occur at all")
    return found


def joint_change(measured: Sequence[MeasuredPart], statistic: Statistic, value: float) -> float:
    """Largest change of a quantile or probability when all parts act at once, in the worst combination.

    Far from linear where the biases are large: three shifts into the tail of a law change a probability by
    more than the three changes one by one.  Per sample, the shifts of one sign are added and those of the
    other left out; quantity and margin take both signs.  Infinite where nothing occurs any more.
    """
    sample = measured[0].sample
    worst = 0.0
    for sign in (-1.0, 1.0):
        by_value = _one_sided([m.shifts for m in measured], sign)
        for margin_sign in (-1.0, 1.0) if sample.margin is not None else (None,):
            by_margin = None
            if margin_sign is not None:
                by_margin = _one_sided([(m.margin_shift,) for m in measured], margin_sign)
            found = range_of(statistic, sample, by_value, by_margin)
            if found is None:
                return math.inf
            worst = max(worst, *(abs(end - value) for end in found))
    return worst


def _one_sided(shifts: Sequence[Sequence[Shift]], sign: float) -> Shift:
    """Sum over parts of the largest shift of one sign."""

    def total_at(values: FloatArray) -> FloatArray:
        total = np.zeros_like(values)
        for candidates in shifts:
            largest = np.zeros_like(values)
            for shift in candidates:
                np.maximum(largest, sign * shift(values), out=largest)
            total += largest
        return sign * total

    return total_at


def mean_influence(pair: PairedValues, mean: float, share: float) -> FloatArray:
    """By what each probe (k,) changes the mean given occurrence between two levels.

    psi = [(T 1)_l - (T 1)_(l+1) - m (1_l - 1_(l+1))] / P, P the share that occurs; D where it always does.
    """
    upper = np.where(pair.in_upper, pair.upper - mean, 0.0)
    lower = np.where(pair.in_lower, pair.lower - mean, 0.0)
    influence: FloatArray = (upper - lower) / share
    return influence


def sd_influence(pair: PairedValues, mean: float, sd: float, share: float) -> FloatArray:
    """By what each probe (k,) changes the sd given occurrence between two levels, sd > 0.

    psi = [(Q - m)^2 - (Q - D - m + mean D)^2] / (2 s) where the quantity always occurs; in general each
    square counts where it occurs, less the variance there, over P, and mean D is the mean of
    `mean_influence`.
    """
    finer_mean = mean - float(mean_influence(pair, mean, share).mean())
    upper = np.where(pair.in_upper, (pair.upper - mean) ** 2 - sd**2, 0.0)
    lower = np.where(pair.in_lower, (pair.lower - finer_mean) ** 2 - sd**2, 0.0)
    influence: FloatArray = (upper - lower) / (2.0 * sd * share)
    return influence


def _influence_bias(
    measured: MeasuredPart, statistic: Statistic, value: float, confidence: float
) -> Bias | None:
    """Mean and sd: |mean psi| and the half-width of mean psi, both times F.

    Where the quantity may not occur, at least as much as the shifted sample says: a few probes may show
    none of the samples that cease or come to occur.
    """
    sample, factor = measured.sample, measured.conditional_order.factor
    found = [
        _influence_of(measured, pair, statistic, value, confidence)
        for pair in measured.candidates
        if pair.in_both.any()
    ]
    size = factor * max(abs(centre) for centre, _ in found) + measured.round_off
    noise = factor * max(half_width for _, half_width in found)
    signed = _richardson(measured) * found[0][0] if statistic == MEAN else 0.0
    if sample.margin is None:
        return Bias(size, noise, signed)
    flips = _shift_bias(measured, statistic, value, confidence)
    if flips is None:
        return None
    if statistic == MEAN:
        signed = _richardson(measured) / factor * flips.correction
    return Bias(max(size, flips.size), max(noise, flips.noise), signed)


def _influence_of(
    measured: MeasuredPart, pair: PairedValues, statistic: Statistic, value: float, confidence: float
) -> tuple[float, float]:
    """Mean psi of one pair and its half-width.

    Where all samples are equal the sd has no influence values: the sd of the differences stands for both.
    """
    sample = measured.sample
    share = len(sample.given) / sample.n_valid
    if statistic == MEAN:
        return mean_and_half_width(measured, mean_influence(pair, value, share), pair.block, confidence)
    if value == 0.0:
        spread = standard_deviation((pair.upper - pair.lower)[pair.in_both])
        return spread, spread
    influence = sd_influence(pair, float(sample.given.mean()), value, share)
    return mean_and_half_width(measured, influence, pair.block, confidence)


def _richardson(measured: MeasuredPart) -> float:
    """f = rho^p / (rho^p - 1): difference of two levels to error of the coarser one; 1 for spectral parts."""
    part, observed = measured.part, measured.order.observed
    if part.known_factor is not None:
        return part.known_factor / SAFETY
    if part.observed_only:
        return safety_factor(min(max(observed or 1.0, 0.5), 2.0), part.ratio_fine, 1.0)
    if part.expected_order is None:
        return 1.0
    return safety_factor(part.expected_order, part.ratio_fine, 1.0)


def mean_and_half_width(
    measured: MeasuredPart, influence: FloatArray, block: BlockArray, confidence: float
) -> tuple[float, float]:
    """Mean over the probes (k,), and t over probes or clusters (as drawn from a finite sample) or scramblings."""
    mean = measured.sample.mean_over(influence, block)
    finite = 0.0 if measured.sample.certain else measured.finite(len(influence))
    return mean.value, finite * mean.half_width(confidence) if finite > 0.0 else 0.0


def _shift_bias(measured: MeasuredPart, statistic: Statistic, value: float, confidence: float) -> Bias | None:
    """Change of the statistic when F times the fitted differences are taken off quantity and margin.

    Size: the largest change, rounding of either sign included.  Noise: the further change when the fits
    move by what they may be off either way (F included), quantity and margin in quadrature; mean and sd take
    the noise of the quantity's own difference from their influence values instead.
    """
    sample = measured.sample
    margin_shift = None if sample.margin is None else measured.margin_shift
    shifts: list[Shift | None] = list(measured.shifts)
    noises: list[Shift | None] = list(measured.noises(confidence))
    if statistic.kind == "occurs" or len(sample.given) == 0:
        shifts, noises = [np.zeros_like], [None]
    elif not shifts:
        shifts, noises = [None], [None]
    if statistic.has_influence:
        noises = [None] * len(shifts)
    margin_noise = None if margin_shift is None else measured.margin_noise(confidence)
    size, noise, signed = 0.0, 0.0, None
    for shift, off in zip(shifts, noises, strict=True):
        centre = range_of(statistic, sample, shift, margin_shift)
        if centre is None:
            return None
        signed = value - 0.5 * (centre[0] + centre[1]) if signed is None else signed
        size = max(size, abs(centre[0] - value), abs(centre[1] - value))
        for sign in (-1.0, 1.0):
            rounded = range_of(
                statistic,
                sample,
                _moved(shift, sign * measured.round_off),
                _moved(margin_shift, sign * measured.margin_round_off),
            )
            if rounded is None:
                return None
            size = max(size, abs(rounded[0] - value), abs(rounded[1] - value))
        by_value, by_margin = 0.0, 0.0
        for sign in (-1.0, 1.0):
            if off is not None:
                moved = range_of(statistic, sample, _moved_along(shift, sign, off), margin_shift)
                by_value = max(by_value, _change(centre, moved))
            if margin_noise is not None:
                moved = range_of(statistic, sample, shift, _moved_along(margin_shift, sign, margin_noise))
                by_margin = max(by_margin, _change(centre, moved))
        noise = max(noise, math.hypot(by_value, by_margin))
    return None if math.isinf(noise) else Bias(size, noise, signed or 0.0)


def _moved(shift: Shift | None, by: float) -> Shift | None:
    return None if shift is None else lambda values: shift(values) + by


def _moved_along(shift: Shift | None, sign: float, by: Shift) -> Shift | None:
    return None if shift is None else lambda values: shift(values) + sign * by(values)


def _change(centre: tuple[float, float], moved: tuple[float, float] | None) -> float:
    """How far either end of a range moves; infinite where nothing is left."""
    if moved is None:
        return math.inf
    return max(abs(moved[0] - centre[0]), abs(moved[1] - centre[1]))
