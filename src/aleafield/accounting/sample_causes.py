"""Which input causes it, from samples and from runs that exchange inputs, without a surrogate."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from functools import cached_property

import numpy as np

from aleafield.accounting.index_statements import Numbers
from aleafield.arrays import BoolArray, FloatArray
from aleafield.estimates.blocks import BlockArray, student
from aleafield.randomness.law import Law
from aleafield.sensitivity.exchange import Exchange, ExchangeSums
from aleafield.sensitivity.given_data import first_order, halved_spread
from aleafield.sensitivity.next_measurement import (
    FIX_CONFIDENCE,
    PinDown,
    Ranking,
    pin_down,
    ranking,
    remaining_sd,
    surely_explained,
)
from aleafield.sensitivity.ratios import Indices, Ratios, jackknife_error


class SampleCauses:
    """Indices and what remains of a spread: first order from the sample, the rest from exchanged inputs.

    Parameters
    ----------
    laws : of the d inputs, independent
    u, y, block : float arrays (S, d), (S,), int array (S,)
    n_blocks : int
    row_values : float array (N, 2 d + 2) or None
        Runs of an exchange whose A are the first N samples.
    noise_left : (float, float, float) or None
        By what averages over noise paths lessen the variance of y below that of one run: the factor, and the ends
        of its interval; None where y is single runs.
    confidence : float in (0, 1)
    """

    def __init__(
        self,
        laws: Sequence[Law],
        u: FloatArray,
        y: FloatArray,
        block: BlockArray,
        n_blocks: int,
        row_values: FloatArray | None,
        noise_left: tuple[float, float, float] | None,
        confidence: float,
    ) -> None:
        self._laws = laws
        self._u, self._y, self._block, self._n_blocks = u, y[:, None], block, n_blocks
        self._row_values = row_values
        self._left = noise_left or (1.0, 1.0, 1.0)
        self._confidence = confidence

    @property
    def variance(self) -> float:
        """Of one run, in the square of the units of the quantity; NaN without values."""
        return float(self._first.whole[0, 0]) / self._left[0]

    @property
    def exchanged(self) -> bool:
        """Whether there are runs that exchange inputs."""
        return self._row_values is not None

    def first(self) -> Numbers:
        """First-order indices, (d,)."""
        return self._of(self._first, lambda removed: removed.indices(self._confidence))

    def total(self) -> Numbers:
        """Total indices, (d,)."""
        return Numbers.sampled(self._sums.total().indices(self._confidence))

    def second(self) -> Numbers:
        """Second-order indices of all pairs."""
        return Numbers.sampled(self._sums.second().indices(self._confidence))

    def total_at_most(self) -> FloatArray:
        """Upper ends of one-sided intervals of the total indices at FIX_CONFIDENCE, (d,)."""
        return self._sums.total().indices(self._confidence).at_most(FIX_CONFIDENCE)[:, 0]

    def known(self) -> Numbers:
        """Expected sd once each input is known exactly, (d,)."""
        return self._of(self._first, lambda removed: remaining_sd(removed, self._confidence))

    def halved(self) -> Numbers:
        """Expected sd once the spread of each input is halved, (d,)."""
        removed = halved_spread(self._u, self._y, self._block, self._n_blocks, self._laws)
        return self._of(removed, lambda scaled: remaining_sd(scaled, self._confidence))

    def pin_down(self, wanted_sd: float) -> PinDown:
        """The fewest inputs that surely bring the expected sd below a wanted one.

        Where inputs were exchanged: with the inputs u known at most the sum of V T_i over all others remains, which
        counts only interactions among these more than once.  Else all but the first-order parts of u may remain.
        The reason of the indices where there are none.
        """
        first = _scaled(self._first, self._left[0])
        found = (self._sums.total() if self.exchanged else first).indices(self._confidence)
        reason = first.reason[0] or found.reason[0]
        if reason is not None:
            return PinDown(None, float("nan"), True, reason)
        members, variance = np.eye(len(self._laws), dtype=np.bool_), self.variance
        parts = _times(found, first)
        if not self.exchanged:
            lower = surely_explained(members, parts, 0, self._confidence)
            return pin_down(members, parts.part[:, 0], variance, wanted_sd, lower=lower)
        of_total, replicates = parts.part[:, 0], parts.part_without[:, :, 0]
        t = student(2.0 * self._confidence - 1.0, self._n_blocks - 1)

        def surely(chosen: BoolArray) -> float:
            error = jackknife_error(replicates[:, ~chosen].sum(axis=1))
            return float(variance - of_total[~chosen].sum() - t * error)

        # estimates of total indices may sum to less than 1: no set may then seem to explain less than `surely` says
        missing = max(variance - float(of_total.sum()), 0.0)
        return pin_down(members, of_total + missing, variance, wanted_sd, lower=surely)

    def ranking(self) -> Ranking | None:
        """How sure the order is of the total indices, of the first ones where nothing was exchanged."""
        ratios = self._sums.total() if self.exchanged else self._first
        found = ratios.indices(self._confidence)
        return None if found.reason[0] is not None else ranking(found, 0)

    @cached_property
    def _first(self) -> Ratios:
        return first_order(self._u, self._y, self._block, self._n_blocks, self._laws)

    @cached_property
    def _sums(self) -> ExchangeSums:
        assert self._row_values is not None
        sums = Exchange(len(self._laws)).sums(self._n_blocks, 1, second=True)
        sums.add(self._row_values[:, :, None], self._block[: len(self._row_values)])
        return sums

    def _of(self, removed: Ratios, estimate: Callable[[Ratios], Indices]) -> Numbers:
        """Numbers of parts of the variance of one run; what is unsure of the noise in it widens them."""
        middle, *ends = (Numbers.sampled(estimate(_scaled(removed, left))) for left in self._left)
        unsure = np.max([np.abs(end.value - middle.value) for end in ends], axis=0)
        low = middle.value - np.hypot(middle.value - middle.low, unsure)
        high = middle.value + np.hypot(middle.high - middle.value, unsure)
        return replace(middle, low=low, high=high)


def _scaled(removed: Ratios, left: float) -> Ratios:
    """The same parts of the variance of one run, of which averages over noise leave a share."""
    return replace(removed, whole=removed.whole / left, whole_without=removed.whole_without / left)


def _times(found: Indices, removed: Ratios) -> Ratios:
    """Indices (k, 1) times the variance that parts (d, 1) stand beside, replicate by replicate."""
    return Ratios(
        found.value * removed.whole,
        removed.whole,
        found.without * removed.whole_without,
        removed.whole_without,
        removed.reason,
    )
