"""Designs on functions with known indices, and how often intervals hold the truth."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from scipy.stats import binom

from aleafield.arrays import FloatArray, IntArray
from aleafield.randomness.laws import Uniform
from aleafield.sensitivity.exchange import Exchange, ExchangeSums
from aleafield.sensitivity.given_data import first_order
from aleafield.sensitivity.ratios import Indices
from tests.sensitivity.known_functions import KnownFunction, scrambled

FALSE_ALARM = 1e-4
"""Chance that one index of one function fails a test of coverage although it covers as stated."""
UNIT = Uniform(0.0, 1.0)


def least_hits(designs: int, coverage: float) -> int:
    """Fewest hits that do not refute a coverage at FALSE_ALARM, exact binomial."""
    return int(binom.ppf(FALSE_ALARM, designs, coverage))


def held(found: Indices, truth: FloatArray) -> IntArray:
    """1 for every index (k,) whose interval holds the truth, for the only output."""
    inside: IntArray = ((found.low[:, 0] <= truth) & (truth <= found.high[:, 0])).astype(np.int64)
    return inside


def given_data_indices(
    function: KnownFunction, unit: FloatArray, block: IntArray, n_blocks: int, confidence: float = 0.95
) -> Indices:
    """First-order indices from one sample, as the first d columns of the points give it."""
    u = unit[:, : function.inputs]
    y = function.evaluate(u)[:, None]
    return first_order(u, y, block, n_blocks, [UNIT] * function.inputs).indices(confidence)


def run_values(function: KnownFunction, exchange: Exchange, unit: FloatArray) -> FloatArray:
    """Outputs (N, n_runs, 1) of all runs of an exchange."""
    points = exchange.points(unit)
    return function.evaluate(points.reshape(-1, function.inputs)).reshape(*points.shape[:2], 1)


def exchange_sums(
    function: KnownFunction, unit: FloatArray, block: IntArray, n_blocks: int, *, second: bool = False
) -> ExchangeSums:
    """The sums of an exchange of every single input."""
    exchange = Exchange(function.inputs)
    sums = exchange.sums(n_blocks, 1, second=second)
    sums.add(run_values(function, exchange, unit), block)
    return sums


def hits_of_design(
    function: KnownFunction, unit: FloatArray, block: IntArray, n_blocks: int
) -> Iterator[tuple[str, IntArray]]:
    """For each kind of index, which intervals hold the truth in one design."""
    yield "first, sample", held(given_data_indices(function, unit, block, n_blocks), function.first)
    sums = exchange_sums(function, unit, block, n_blocks)
    yield "first, exchange", held(sums.first().indices(0.95), function.first)
    yield "total, exchange", held(sums.total().indices(0.95), function.total)


def count_hits(
    function: KnownFunction, points: int, designs: int, seed: int, *, blocks_joined: int = 1
) -> dict[str, IntArray]:
    """Hits of every kind of index over designs of 16 scramblings with so many points each.

    Parameters
    ----------
    blocks_joined : 1 for a jackknife over 16 scramblings, 2 for one over 8 pairs of them
    """
    total: dict[str, IntArray] = {}
    for design in range(designs):
        unit, scrambling = scrambled(2 * function.inputs, points, seed + design)
        block = scrambling // blocks_joined
        for kind, hit in hits_of_design(function, unit, block, 16 // blocks_joined):
            total[kind] = total.get(kind, 0) + hit
    return total
