"""Shapley effects of dependent inputs, from a function that is cheap to evaluate."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from math import comb

import numpy as np
from scipy.special import ndtri

from aleafield.arrays import BoolArray, FloatArray
from aleafield.errors import InputError
from aleafield.estimates.blocks import BlockArray, student
from aleafield.sensitivity.ratios import NO_SPREAD, Indices, jackknife_error

MOST_PLAYERS = 10
"""All subsets are visited: 2^10 samples of the function."""

Function = Callable[[FloatArray], FloatArray]
"""Outputs (N, o) from normal scores (N, d) with the correlation of the inputs."""


def in_latent_normals(evaluate: Function, correlation: FloatArray) -> Function:
    """A surrogate of independent coordinates as a function of the dependent normal scores.

    Parameters
    ----------
    evaluate : callable
        u (N, d) -> (N, o), where the inputs come from u as `randomness.copula` makes them: scores z = L zeta with L
        the Cholesky factor of the latent correlation and zeta the normal scores of u.
    correlation : float array (d, d)
        That latent correlation.
    """
    from scipy.linalg import solve_triangular
    from scipy.special import ndtr

    factor = np.linalg.cholesky(correlation)
    edge = 2.0**-53

    def function(scores: FloatArray) -> FloatArray:
        independent = solve_triangular(factor, scores.T, lower=True).T
        return evaluate(np.clip(ndtr(independent), edge, 1.0 - edge))

    return function


def correlated_blocks(correlation: FloatArray) -> tuple[tuple[int, ...], ...]:
    """The finest groups of inputs between which nothing is correlated, (d, d) -> groups in order.

    Groups are independent of one another, so closed indices of groups are exact where effects of single inputs
    are too many to visit.
    """
    from scipy.sparse.csgraph import connected_components

    label = connected_components(correlation != 0.0, directed=False)[1]
    return tuple(tuple(np.flatnonzero(label == g).tolist()) for g in range(label.max() + 1))


def shapley_weights(players: int) -> FloatArray:
    """Matrix (players, 2^players) that takes c of all subsets to the Shapley effects.

    Subset u is the number whose binary digit i says whether player i is in.  The row of i has
    +-1 / (k binom(k - 1, |u without i|)), k players.
    """
    subsets = np.arange(1 << players)
    digit = (subsets[None, :] >> np.arange(players)[:, None]) & 1
    size = digit.sum(axis=0)
    share = np.array([1.0 / (players * comb(players - 1, n)) for n in range(players)])
    weights: FloatArray = np.where(digit == 1, share[size - 1], -share[np.minimum(size, players - 1)])
    return weights


class _Redraw:
    """Scores of which a subset is kept and the rest drawn anew, given the kept ones.

    z' = z_u, then z_v = C_vu C_uu^-1 z_u + chol(C_vv - C_vu C_uu^-1 C_uv) zeta_v.
    """

    def __init__(self, correlation: FloatArray, kept: BoolArray) -> None:
        self._kept, self._free = np.flatnonzero(kept), np.flatnonzero(~kept)
        u, v = self._kept, self._free
        cross = correlation[np.ix_(v, u)]
        self._slope = np.linalg.solve(correlation[np.ix_(u, u)], cross.T)
        left = correlation[np.ix_(v, v)] - cross @ self._slope
        self._factor = np.linalg.cholesky(left).T

    def __call__(self, scores: FloatArray, fresh: FloatArray) -> FloatArray:
        drawn = scores.copy()
        drawn[:, self._free] = scores[:, self._kept] @ self._slope + fresh[:, self._free] @ self._factor
        return drawn


def shapley_effects(
    function: Function,
    correlation: FloatArray,
    unit: FloatArray,
    block: BlockArray,
    n_blocks: int,
    confidence: float,
    *,
    groups: Sequence[Sequence[int]] | None = None,
    refits: Sequence[Function] = (),
) -> Indices:
    """Shapley effects: how the variance is shared fairly among inputs that come together.

    With c(u) = Var E[Y | X_u], which is 0 for no input and Var Y for all,

        Sh_i = sum over u without i of [c(u and i) - c(u)] / (k binom(k - 1, |u|)) / Var Y

    (Shapley 1953, Owen 2014, Song, Nelson and Staum 2016; from memory).  They are not negative and sum to 1.  c(u) =
    Var Y - mean (y - y')^2 / 2, where y' has the inputs of u kept and the rest drawn anew given them, by the
    conditional Gaussian law of the scores and the same uniform numbers for all subsets.

    Parameters
    ----------
    function : callable
        Outputs (N, o) of normal scores (N, d).
    correlation : float array (d, d)
        Of the scores, positive definite.
    unit : float array (N, 2 d)
        Scrambled points: the first half makes the scores, the second draws anew.
    block : int array (N,)
        0 .. n_blocks - 1, the scrambling of each row.
    n_blocks : int
    confidence : float in (0, 1)
    groups : sequence of sequences of int, optional
        Inputs that play as one; all inputs in one group each.  By default each alone.
    refits : sequence of callables
        The surrogate fitted without a part of the runs, each: the largest change of an effect under them is added
        to its interval, whose sampling part alone covers too seldom.

    Returns
    -------
    Indices
        (players, o).

    Raises
    ------
    InputError
        More than MOST_PLAYERS players.
    """
    players = [[i] for i in range(len(correlation))] if groups is None else [list(group) for group in groups]
    if len(players) > MOST_PLAYERS:
        raise InputError(
            "sensitivity.indices",
            f"shapley for {len(players)} inputs",
            f"at most {MOST_PLAYERS}; inputs that are correlated with no other can be grouped",
        )
    value, without, varies = _effects(function, correlation, unit, block, n_blocks, players)
    change = np.zeros_like(value)
    for refit in refits:
        change = np.maximum(
            change, np.abs(_effects(refit, correlation, unit, block, n_blocks, players)[0] - value)
        )
    half = student(confidence, n_blocks - 1) * jackknife_error(without) + change
    reason = tuple(None if spread else NO_SPREAD for spread in varies)
    return Indices(value, value - half, value + half, without, confidence, reason)


def _effects(
    function: Function,
    correlation: FloatArray,
    unit: FloatArray,
    block: BlockArray,
    n_blocks: int,
    players: list[list[int]],
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Effects (k, o), the same without one block each (G, k, o), and whether outputs vary (o,)."""
    d, k = len(correlation), len(players)
    normals = ndtri(unit)
    scores, fresh = normals[:, :d] @ np.linalg.cholesky(correlation).T, normals[:, d:]
    member = (np.arange(n_blocks)[:, None] == block).astype(np.float64)
    y = function(scores)
    lost = np.zeros((n_blocks, 1 << k, y.shape[1]))
    for subset in range((1 << k) - 1):
        kept = np.zeros(d, dtype=np.bool_)
        for player in range(k):
            kept[players[player]] = bool(subset >> player & 1)
        again = function(_Redraw(correlation, kept)(scores, fresh))
        lost[:, subset] = member @ (0.5 * np.square(y - again))
    weights = shapley_weights(k)
    whole = lost[:, 0].sum(axis=0)
    # c(u) / V = 1 - lost(u) / lost(none); the rows of the weights of all 1 cancel but for the empty set
    with np.errstate(invalid="ignore", divide="ignore"):
        value = weights @ (1.0 - lost.sum(axis=0) / whole)
        left = lost.sum(axis=0) - lost
        without = weights @ (1.0 - left / left[:, :1])
    return value, without, whole > 0.0
