"""Intervals of shares of the variance."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.chaos.acceptance import judge
from aleafield.chaos.indices import Shares, share_intervals
from aleafield.chaos.search import search
from aleafield.randomness.laws import Uniform
from tests.sensitivity.known_functions import FRONT, scrambled
from tests.statistical.coverage import least_hits

DESIGNS = 100
LAWS = [Uniform(0.0, 1.0)] * 3


def front_shares(seed: int) -> Shares:
    """First and total indices of the front speed from 32 runs and 32 held-out ones."""
    u, _ = scrambled(3, 2, seed)
    y = FRONT.evaluate(u)[:, None]
    found = search(u, y, LAWS)
    held = np.random.default_rng(seed).random((32, 3))
    error = judge(found, u, y, held, FRONT.evaluate(held)[:, None])[0].error
    terms = np.concatenate((found.first_terms(), found.total_terms()))
    return share_intervals(found, terms, np.array([error]), 0.95)


def holds(shares: Shares) -> FloatArray:
    """Which of the six intervals hold the truth."""
    truth = np.concatenate((FRONT.first, FRONT.total))[:, None]
    inside: FloatArray = ((shares.low <= truth) & (truth <= shares.high)).astype(np.float64)[:, 0]
    return inside


def test_intervals_hold_the_truth() -> None:
    hits = np.sum([holds(front_shares(seed)) for seed in range(DESIGNS)], axis=0)
    assert hits.min() >= least_hits(DESIGNS)


def test_standard_error_is_the_sandwich_to_first_order() -> None:
    """Against 4000 draws of the coefficients from the sandwich covariance, to their own sampling error of 1 %."""
    u, _ = scrambled(3, 4, 5)
    found = search(u, FRONT.evaluate(u)[:, None], LAWS)
    terms = found.first_terms()
    shares = share_intervals(found, terms, np.zeros(1), 0.95)
    assert found.influence is not None
    assert found.residuals is not None
    pulls = found.influence * found.residuals
    draws = found.coefficients + pulls.T @ np.random.default_rng(6).normal(size=(len(pulls), 4000))
    squares = draws**2
    squares[0] = 0.0
    spread = ((terms.astype(float) @ squares) / squares.sum(axis=0)).std(axis=1)
    half = 0.5 * (shares.high - shares.low)[:, 0] / 1.959963984540054
    np.testing.assert_allclose(half, spread, rtol=0.06)


def test_aggregated_shares_weigh_by_variance() -> None:
    """Of equal outputs the aggregate is each; of unlike ones the weighted mean; errors alike."""
    u, _ = scrambled(3, 4, 7)
    y = FRONT.evaluate(u)
    found = search(u, np.column_stack((y, 3.0 * y, u[:, 0])), LAWS)
    terms = found.total_terms()
    error = np.array([0.01, 0.01, 0.0])
    each = share_intervals(found, terms, error, 0.9)
    same = share_intervals(found, terms, error, 0.9, np.array([0.3, 0.7, 0.0]))
    for one, other in zip(each, same, strict=True):
        np.testing.assert_allclose(other[:, 0], one[:, 0], rtol=1e-10)
    weights = np.array([1.0, 0.0, 2.0])
    parts = found.variance * weights
    both = share_intervals(found, terms, error, 0.9, weights)
    np.testing.assert_allclose(both.value[:, 0], each.value @ parts / parts.sum(), rtol=1e-12)


def test_many_outputs_are_worked_on_in_parts() -> None:
    u, _ = scrambled(3, 4, 8)
    y = FRONT.evaluate(u)[:, None] * np.linspace(1, 2, 150)
    found = search(u, y, LAWS)
    shares = share_intervals(found, found.first_terms(), np.full(150, 1e-3), 0.95)
    np.testing.assert_allclose(shares.low, np.repeat(shares.low[:, :1], 150, axis=1), rtol=1e-6)
