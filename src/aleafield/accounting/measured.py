"""One discretisation part of one quantity, measured: differences, orders, regressions."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from aleafield.accounting.order import RELATIVE_ROUND_OFF, Order, judge_order, reduction
from aleafield.accounting.records import Pair, PartDifferences
from aleafield.accounting.regression import DifferenceFit, Shift, fit_differences
from aleafield.accounting.statistic import Statistic
from aleafield.arrays import BoolArray, FloatArray, IntArray
from aleafield.ensemble.level import Side
from aleafield.estimates import Sample
from aleafield.estimates.blocks import BlockArray
from aleafield.estimates.sd import standard_deviation

LEAST_PAIRS = 5
"""Probes on which a conditional statistic must occur at both levels, where the sample has as many."""


@dataclass(frozen=True, eq=False)
class PairedValues:
    """The quantity on k probes at two neighbouring levels, carried to the run's values.

    A pair of levels along the path of refinement need not hold the run itself; its difference is taken as
    that of the run's value Q and Q - D, so that all parts refer to the same statistic.

    Attributes
    ----------
    upper, lower : float arrays (k,)
        Q and Q - D; NaN where the quantity does not occur at that level.
    in_upper, in_lower : bool arrays (k,)
        Where it occurs.
    in_run : bool array (k,)
        Where it occurs at the run's level.
    block : int array (k,)
        Independent block of each probe.
    at : int array (k,)
        Position of each probe in the sample.
    """

    upper: FloatArray
    lower: FloatArray
    in_upper: BoolArray
    in_lower: BoolArray
    in_run: BoolArray
    block: BlockArray
    at: IntArray

    @property
    def in_both(self) -> BoolArray:
        """Where the quantity occurs at both levels and in the run, (k,)."""
        return self.in_upper & self.in_lower & self.in_run


def pair_with_run(sample: Sample, probes: IntArray, pair: Pair, divisor: float) -> PairedValues:
    """The pair on the probes that did not fail, its differences divided by `divisor`."""
    usable = pair.valid & sample.valid[probes]
    at = probes[usable]
    run, in_run = sample.values[at], sample.occurs[at]
    upper, lower = pair.coarser.values[usable], pair.finer.values[usable]
    in_upper, in_lower = pair.coarser.occurs[usable], pair.finer.occurs[usable]
    carried = np.where(in_run & in_upper, run, upper)
    lower = np.where(in_upper & in_lower, carried - (upper - lower) / divisor, lower)
    return PairedValues(carried, lower, in_upper, in_lower, in_run, sample.replicate[at], at)


@dataclass(frozen=True, eq=False)
class MeasuredPart:
    """One part with what all statistics of the quantity need from it.

    Attributes
    ----------
    sample : Sample
    part : PartDifferences
    """

    sample: Sample
    part: PartDifferences

    @cached_property
    def usable(self) -> BoolArray:
        """Probes that failed neither in the run nor on the finer pair, (n_p,)."""
        return self.part.fine.valid & self.sample.valid[self.part.probes]

    @cached_property
    def candidates(self) -> tuple[PairedValues, ...]:
        """The difference that is the part; where chance may make it small, the coarser one brought down too."""
        part = self.part
        found = [pair_with_run(self.sample, part.probes, part.fine, 1.0)]
        if part.order_of_chance is not None and part.coarse is not None:
            divisor = reduction(part.order_of_chance, part.ratio_fine, part.ratio_coarse)
            found.append(pair_with_run(self.sample, part.probes, part.coarse, divisor))
        return tuple(found)

    @cached_property
    def enough_pairs(self) -> bool:
        """Whether the quantity occurs at both levels on enough probes."""
        pair = self.candidates[0]
        count = self.sample.independent_in(pair.block[pair.in_both])
        return count >= max(1, min(LEAST_PAIRS, self.sample.independent))

    @cached_property
    def round_off(self) -> float:
        """Size of a difference of the quantity that is rounding."""
        return _round_off(self.sample.given, self.part.round_off)

    @cached_property
    def margin_round_off(self) -> float:
        """Size of a difference of the margin that is rounding; 0 without a margin."""
        if self.sample.margin is None:
            return 0.0
        return _round_off(self.sample.valid_margin, 0.0)

    @cached_property
    def order(self) -> Order:
        """Order of the quantity, from the probes on which it occurs at all levels; that of the margin for a passage."""
        if self.part.passage:
            return self.margin_order
        fine, coarse = self.part.fine, self.part.coarse
        both = self.usable & fine.occurs
        difference = fine.coarser.values - fine.finer.values
        seen = both if coarse is None else both & coarse.occurs
        if coarse is None or not seen.any():
            return judge_order(self.part, difference[both], np.zeros(0), self.round_off)
        above = coarse.coarser.values - coarse.finer.values
        return judge_order(self.part, difference[seen], above[seen], self.round_off)

    @cached_property
    def margin_order(self) -> Order:
        """Order of the margin, from the probes that did not fail."""
        fine, coarse = self.part.fine, self.part.coarse
        difference = _margin_difference(fine)
        seen = self.usable if coarse is None else self.usable & coarse.valid
        if coarse is None or not seen.any():
            return judge_order(self.part, difference[self.usable], np.zeros(0), self.margin_round_off)
        above = _margin_difference(coarse)
        return judge_order(self.part, difference[seen], above[seen], self.margin_round_off)

    @cached_property
    def conditional_order(self) -> Order:
        """The more cautious of the quantity's order and, where it may not occur, its margin's."""
        if self.sample.margin is None or self.margin_order.factor <= self.order.factor:
            return self.order
        return self.margin_order

    @cached_property
    def fits(self) -> tuple[DifferenceFit, ...]:
        """Regression of each candidate's difference on the quantity; empty without enough pairs."""
        if not self.enough_pairs:
            return ()
        given = self.sample.given
        centre, scale = float(given.mean()), standard_deviation(given)
        found = []
        for pair in self.candidates:
            both = pair.in_both
            if both.any():
                upper, lower = pair.upper[both], pair.lower[both]
                found.append(self._fit(upper, upper - lower, centre, scale, pair.block[both]))
        return tuple(found)

    @property
    def shifts(self) -> tuple[Shift, ...]:
        """F times each regression, to be taken off the values of the whole sample."""
        return tuple(_times(self.order.factor, fit) for fit in self.fits)

    @cached_property
    def margin_fit(self) -> DifferenceFit:
        """Regression of the margin's difference on the run's margin; needs a margin and a usable probe."""
        assert self.sample.margin is not None
        margin = self.sample.valid_margin
        at_probes = self.sample.margin[self.part.probes[self.usable]]
        difference = _margin_difference(self.part.fine)[self.usable]
        centre, scale = float(margin.mean()), standard_deviation(margin)
        block = self.sample.replicate[self.part.probes[self.usable]]
        return self._fit(at_probes, difference, centre, scale, block)

    def _fit(
        self, quantity: FloatArray, difference: FloatArray, centre: float, scale: float, block: BlockArray
    ) -> DifferenceFit:
        """A regression over probes in these blocks, with its covariance where the differences are noisy."""
        own = np.arange(len(block)) if self.sample.plain else block
        return fit_differences(
            quantity,
            difference,
            centre,
            scale,
            self.sample.certain,
            independent=self.sample.independent_in(block),
            block=own if self.part.noisy else None,
        )

    @property
    def margin_shift(self) -> Shift:
        """F times the regression of the margin."""
        return _times(self.margin_order.factor, self.margin_fit)

    def noises(self, confidence: float) -> tuple[Shift, ...]:
        """F times what each regression may be off by."""
        finite = self.finite(int(self.usable.sum()))
        return tuple(_times(self.order.factor, fit.half_width(confidence, finite)) for fit in self.fits)

    def margin_noise(self, confidence: float) -> Shift:
        """F times what the regression of the margin may be off by."""
        finite = self.finite(int(self.usable.sum()))
        return _times(self.margin_order.factor, self.margin_fit.half_width(confidence, finite))

    def finite(self, probes: int) -> float:
        """By what so many probes, drawn from a finite sample, know its mean better than that of the law.

        0 where they are all of it; scrambled points are not drawn from one another.
        """
        if self.sample.scrambled:
            return 1.0
        return math.sqrt(max(0.0, 1.0 - probes / self.sample.n_valid))

    def open_sides(self, statistic: Statistic) -> frozenset[Side]:
        """Sides of the run's statistic on which this part bounds nothing.

        A quantity whose occurrence is open is read off the wrong samples: a mean, sd or quantile given that it
        occurs may then lie on either side, unless all samples occur and the truth can only add some.
        """
        part, sample = self.part, self.sample
        occurrence = None if sample.margin is None else part.open_occurrence
        sides: set[Side | None] = set()
        if statistic.kind != "occurs":
            sides.add(part.open_side)
        if statistic.is_probability:
            sides.add(occurrence)
        elif occurrence == "below" or (occurrence == "above" and len(sample.given) < sample.n_valid):
            sides |= {"above", "below"}
        return frozenset(side for side in sides if side is not None)


def _times(factor: float, fit: Shift) -> Shift:
    return lambda values: factor * fit(values)


def _round_off(values: FloatArray, least: float) -> float:
    largest = float(max(values.max(), -values.min())) if len(values) else 0.0
    return max(RELATIVE_ROUND_OFF * largest, least)


def _margin_difference(pair: Pair) -> FloatArray:
    if pair.coarser.margin is None or pair.finer.margin is None:
        raise ValueError("a quantity with a margin needs it at every level")
    return pair.coarser.margin - pair.finer.margin
