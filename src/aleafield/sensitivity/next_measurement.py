"""What to measure next: how much narrower a quantity becomes when inputs are known better."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from aleafield.arrays import BoolArray, FloatArray, IntArray
from aleafield.estimates.blocks import student
from aleafield.sensitivity.ratios import Indices, Ratios, jackknife_error

FIX_BELOW = 0.01
"""An input may be fixed where its total index is surely below this, if the study asks for no other threshold."""
FIX_CONFIDENCE = 0.95
"""One-sided confidence of "surely"."""
MOST_IN_ALL_SUBSETS = 20
"""Inputs up to which all subsets are looked at."""


def remaining_sd(removed: Ratios, confidence: float) -> Indices:
    """Standard deviation that is expected to remain once something is learnt; units of the output.

    sqrt(V - removed part): of one input known exactly with `given_data.first_order`, `ExchangeSums.first` or the
    partial variances of an expansion, of one whose spread is halved with `given_data.halved_spread`.  The expected
    remaining variance is meant; a particular value learnt may leave more.

    Parameters
    ----------
    removed : Ratios
        Variance that goes, beside the whole.
    confidence : float in (0, 1)

    Returns
    -------
    Indices
        (k, o); parts above the whole leave 0, and no end of an interval lies below 0.
    """

    def root(whole: FloatArray, part: FloatArray) -> FloatArray:
        left: FloatArray = np.sqrt(np.maximum(whole - part, 0.0))
        return left

    silent = np.isnan(removed.indices(confidence).value)
    found = Indices.of(
        np.where(silent, np.nan, root(removed.whole, removed.part)),
        np.where(silent, np.nan, root(removed.whole_without, removed.part_without)),
        confidence,
        removed.reason,
    )
    return Indices(
        found.value, np.maximum(found.low, 0.0), found.high, found.without, confidence, found.reason
    )


def remaining_sd_known(first: Ratios, confidence: float) -> Indices:
    """Expected sd once each input is known exactly, from its first-order part: sqrt(V - V S_i), (k, o)."""
    return remaining_sd(first, confidence)


def may_be_fixed(total: Indices, threshold: float = FIX_BELOW) -> BoolArray:
    """Whether each input may be fixed without changing the answer, (k, o).

    Where its total index is below the threshold at one-sided 95 per cent.  Fixing it at a random value changes the
    quantity by a mean square of 2 V T.  A first-order index near 0 says nothing of this.  False where no index is
    stated.
    """
    fixed: BoolArray = total.at_most(FIX_CONFIDENCE) < threshold
    return fixed


@dataclass(frozen=True)
class PinDown:
    """The inputs to pin down so that the sd falls below a wanted one.

    Attributes
    ----------
    inputs : tuple of int, or None
        Positions of the inputs, increasing; empty where the sd is small enough as it is, None where none suffice.
    remaining_sd : float
        Expected sd with these known; with all known where none suffice.
    exhaustive : bool
        Whether all subsets were looked at; else the set suffices, but a cheaper one may have been missed.
    reason : str or None
        Why there is none, or what a reader must know.
    """

    inputs: tuple[int, ...] | None
    remaining_sd: float
    exhaustive: bool
    reason: str | None = None


def closed_variances(members: BoolArray, variances: FloatArray) -> FloatArray:
    """Variance that knowledge of each subset explains, for all subsets by the subset-sum transform.

    Subset u is the number whose binary digit i says whether input i is in; its closed variance is the sum over terms
    whose inputs all lie in u.

    Parameters
    ----------
    members : bool array (terms, d)
        Inputs of each term (of an expansion, or index of first and second order).
    variances : float array (terms,)
        Partial variance of each, not negative.

    Returns
    -------
    float array (2^d,)
    """
    d = members.shape[1]
    closed: FloatArray = np.bincount(
        members.astype(np.int64) @ (1 << np.arange(d)), weights=variances, minlength=1 << d
    ).astype(np.float64)
    for i in range(d):
        with_and_without = closed.reshape(-1, 2, 1 << i)
        with_and_without[:, 1] += with_and_without[:, 0]
    return closed


def surely_explained(
    members: BoolArray, parts: Ratios, output: int, confidence: float
) -> Callable[[BoolArray], float]:
    """Lower bound of what a set explains, for `pin_down` with the variance that the parts are measured against.

    One-sided, by the jackknife of the variance that a set leaves: errors of the whole and of its parts go together.

    Parameters
    ----------
    members : bool array (k, d)
        Inputs of each part, first and second order.
    parts : Ratios
        (k, o), all of one whole.
    output : int
    confidence : float in (0.5, 1)
    """
    t = student(2 * confidence - 1, len(parts.part_without) - 1)
    part, part_without = parts.part[:, output], parts.part_without[:, :, output]
    whole_without = parts.whole_without[:, 0, output]

    def lower(chosen: BoolArray) -> float:
        inside = (~(members & ~chosen).any(axis=1)) & (part > 0.0)
        left = whole_without - part_without[:, inside].sum(axis=1)
        return float(part[inside].sum() - t * jackknife_error(left))

    return lower


def pin_down(
    members: BoolArray,
    variances: FloatArray,
    variance: float,
    wanted_sd: float,
    *,
    cost: FloatArray | None = None,
    lower: Callable[[BoolArray], float] | None = None,
) -> PinDown:
    """The cheapest set of inputs that, known exactly, leave an expected sd below a wanted one.

    Cheapest first, of equal cost the set that explains most.  Up to 20 inputs all subsets are looked at; greedy
    choices fail on interactions, in both directions.  Above, sets from adding, from removing and from exchanges are
    compared, which is a heuristic and said to be one.  Terms that are left out (higher orders) only make the promise
    more cautious: they explain more, never less.

    Parameters
    ----------
    members : bool array (terms, d)
    variances : float array (terms,)
        As for `closed_variances`; negative estimates count as 0.
    variance : float
        Of the quantity, or an upper bound so that the promise holds; noise in it can be pinned down by no input.
    wanted_sd : float
        Positive, in the units of the quantity.
    cost : float array (d,), optional
        Of pinning down each input, positive; by default all alike.
    lower : callable, optional
        Lower bound of the closed variance of a set (d,), so that the promise holds in spite of the errors of the
        variances, as `surely_explained`; never above the sum of the variances.  By default the variances are taken
        as they are.
    """
    terms = np.maximum(variances, 0.0)
    price = np.ones(members.shape[1]) if cost is None else cost
    needed = variance - wanted_sd**2

    def explained(chosen: BoolArray) -> float:
        return float(terms[~(members & ~chosen).any(axis=1)].sum()) if lower is None else lower(chosen)

    def of(chosen: BoolArray, exhaustive: bool, reason: str | None = None) -> PinDown:
        left = float(np.sqrt(max(variance - explained(chosen), 0.0)))
        return PinDown(tuple(np.flatnonzero(chosen).tolist()), left, exhaustive, reason)

    everything = np.ones(members.shape[1], dtype=np.bool_)
    if needed <= 0.0:
        return of(~everything, True, "the sd is as small as wanted already")
    if explained(everything) < needed:
        left = float(np.sqrt(max(variance - explained(everything), 0.0)))
        return PinDown(
            None, left, True, f"with all inputs known the sd is only sure to be at most {left:.3g}"
        )
    if members.shape[1] <= MOST_IN_ALL_SUBSETS:
        return of(_best_of_all(members, terms, needed, price, explained), True)
    chosen = _best_found(members.shape[1], needed, price, explained)
    return of(chosen, False, "found by a search that may miss a cheaper set")


def _best_of_all(
    members: BoolArray,
    terms: FloatArray,
    needed: float,
    price: FloatArray,
    explained: Callable[[BoolArray], float],
) -> BoolArray:
    """The cheapest subset that suffices, given that all inputs do."""
    d = members.shape[1]
    closed = closed_variances(members, terms)
    subsets: IntArray = np.arange(1 << d)
    costs = np.zeros(1 << d)
    for i in range(d):
        costs += price[i] * ((subsets >> i) & 1)
    # sums in another order may differ by rounding; what counts is asked below
    at_hand = np.flatnonzero(closed >= needed * (1.0 - 1e-12))
    order = at_hand[np.lexsort((-closed[at_hand], costs[at_hand]))]
    for subset in order:
        chosen: BoolArray = ((subset >> np.arange(d)) & 1).astype(np.bool_)
        if explained(chosen) >= needed:
            return chosen
    return np.ones(d, dtype=np.bool_)


def _best_found(
    d: int, needed: float, price: FloatArray, explained: Callable[[BoolArray], float]
) -> BoolArray:
    """The cheapest of the sets that greedy addition and greedy removal end in, improved by exchanges."""
    found = [
        _improved(chosen, needed, price, explained)
        for chosen in (
            _by_adding(d, needed, price, explained),
            _by_removing(np.ones(d, dtype=np.bool_), needed, price, explained),
        )
    ]
    return min(found, key=lambda chosen: (float(price[chosen].sum()), -explained(chosen)))


def _changed(chosen: BoolArray, *at: int) -> BoolArray:
    other = chosen.copy()
    other[list(at)] ^= True
    return other


def _by_adding(
    d: int, needed: float, price: FloatArray, explained: Callable[[BoolArray], float]
) -> BoolArray:
    """Adds the input, or pair of inputs, that explains most for its price until enough is explained."""
    chosen = np.zeros(d, dtype=np.bool_)
    while explained(chosen) < needed:
        free = np.flatnonzero(~chosen)
        steps = [(int(i),) for i in free] + [(int(i), int(j)) for i in free for j in free if i < j]
        have = explained(chosen)
        best = max(steps, key=lambda s: (explained(_changed(chosen, *s)) - have) / price[list(s)].sum())
        chosen = _changed(chosen, *best)
    return _by_removing(chosen, needed, price, explained)


def _by_removing(
    chosen: BoolArray, needed: float, price: FloatArray, explained: Callable[[BoolArray], float]
) -> BoolArray:
    """Removes the input whose loss costs least for its price as long as enough stays explained."""
    while True:
        have = explained(chosen)
        smaller = [(int(i), explained(_changed(chosen, int(i)))) for i in np.flatnonzero(chosen)]
        allowed = [(i, left) for i, left in smaller if left >= needed]
        if not allowed:
            return chosen
        drop = min(allowed, key=lambda entry: (have - entry[1]) / price[entry[0]])[0]
        chosen = _changed(chosen, drop)


def _improved(
    chosen: BoolArray, needed: float, price: FloatArray, explained: Callable[[BoolArray], float]
) -> BoolArray:
    """Exchanges one input for another as long as that explains more at no higher price, removing where it can."""
    while True:
        swaps = [
            _changed(chosen, int(i), int(j))
            for i in np.flatnonzero(chosen)
            for j in np.flatnonzero(~chosen)
            if price[j] <= price[i]
        ]
        better = max(swaps, key=explained, default=chosen)
        if explained(better) <= explained(chosen):
            return chosen
        chosen = _by_removing(better, needed, price, explained)


@dataclass(frozen=True)
class Ranking:
    """Inputs from the most to the least important, and how sure that order is.

    Attributes
    ----------
    order : tuple of int
        Positions of the inputs.
    above_next : tuple of float, one less
        Certainty that each one's index really exceeds the next one's.
    first_is_largest : float
        Certainty, at least, that the first one is the largest.
    """

    order: tuple[int, ...]
    above_next: tuple[float, ...]
    first_is_largest: float


def ranking(indices: Indices, output: int) -> Ranking:
    """How sure the order of the inputs is for one output whose indices are stated.

    From the jackknife of differences, in which what is common to two indices falls out; that the first is the
    largest by Bonferroni's inequality.
    """
    value = indices.value[:, output]
    order = np.argsort(-value, kind="stable")
    surer = indices.exceeds()[:, :, output]
    doubt = float((1.0 - surer[order[0], order[1:]]).sum())
    return Ranking(
        tuple(order.tolist()),
        tuple(float(surer[i, j]) for i, j in pairwise(order)),
        max(0.0, 1.0 - doubt),
    )
