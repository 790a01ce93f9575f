"""First-order Sobol' indices from samples at hand, without a further run."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.estimates.blocks import BlockArray
from aleafield.randomness.law import Law
from aleafield.sensitivity.main_effects import MainEffect, halving, main_effect
from aleafield.sensitivity.ratios import Ratios, plain_reasons

LEAST_POINTS = 16
"""Points that every scrambling needs, the fewest for which the coverage of intervals was measured."""
OUTPUTS_AT_ONCE = 256
"""Outputs whose coefficients are held at a time."""


def first_order(
    u: FloatArray, y: FloatArray, block: BlockArray, n_blocks: int, laws: Sequence[Law]
) -> Ratios:
    """Variances of the conditional means E[Y | X_i], beside the variance of Y.

    In each block (scrambling) g the centred output is projected on functions phi_k of one input,
    c_gk = mean of (y - its mean in g) phi_k(u_i), and only products of different blocks count:

        Var E[Y | X_i] = sum_k [ (sum_g c_gk)^2 - sum_g c_gk^2 ] / (G (G - 1)),

    which has no noise floor and needs no choice of a degree.  The variance is pooled over all rows with the
    divisor n.  Intervals by the jackknife over 16 scramblings, t with 15 degrees of freedom, held each index of six
    functions with known ones in 0.943 to 0.995 of 1,000 designs of 256 to 1024 rows; over 8 pairs of scramblings they
    hold as often and are a tenth wider (`tests.benchmarks.sensitivity`).  Fits pooled over all rows, corrected by
    degrees of freedom, are wrong on scrambled points, and so are estimators by ranks or neighbours.  Not for total
    indices.

    Parameters
    ----------
    u : float array (N, d)
        Points of the unit cube, independent coordinates.
    y : float array (N, o)
        Outputs; NaN where a run gives no value: its row is left out for that output.
    block : int array (N,)
        0 .. n_blocks - 1, the scrambling of each row.
    n_blocks : int
        At least 3.
    laws : sequence of Law, d of them
        They choose the functions: see `main_effects`.

    Returns
    -------
    Ratios
        part (d, o); nothing is stated below LEAST_POINTS points in a scrambling, above 5 per cent of missing
        values, or without spread.
    """
    return _explained(u, y, block, n_blocks, [main_effect(law) for law in laws])


def halved_spread(
    u: FloatArray, y: FloatArray, block: BlockArray, n_blocks: int, laws: Sequence[Law]
) -> Ratios:
    """Variance that is expected to go when the spread of one input is halved; arguments as `first_order`.

    A bounded law: the variance between the two halves, (mean above - mean below)^2 / 4.  An unbounded one: the
    normal score known through a Gaussian channel that leaves half its sd.  See `main_effects.halving`.
    """
    return _explained(u, y, block, n_blocks, [halving(law) for law in laws])


def _explained(
    u: FloatArray, y: FloatArray, block: BlockArray, n_blocks: int, effects: Sequence[MainEffect]
) -> Ratios:
    rows = [np.flatnonzero(block == g) for g in range(n_blocks)]
    functions = [
        np.concatenate([effect.evaluate(u[of_block, i]) for i, effect in enumerate(effects)], axis=1)
        for of_block in rows
    ]
    weights = np.concatenate([effect.weights for effect in effects])
    first = np.cumsum([0] + [len(effect.weights) for effect in effects[:-1]])
    pieces = [
        _of_few(
            functions, [y[of_block, start : start + OUTPUTS_AT_ONCE] for of_block in rows], weights, first
        )
        for start in range(0, y.shape[1], OUTPUTS_AT_ONCE)
    ]
    return Ratios(
        np.concatenate([piece.part for piece in pieces], axis=-1),
        np.concatenate([piece.whole for piece in pieces], axis=-1),
        np.concatenate([piece.part_without for piece in pieces], axis=-1),
        np.concatenate([piece.whole_without for piece in pieces], axis=-1),
        tuple(reason for piece in pieces for reason in piece.reason),
    )


def _of_few(
    functions: list[FloatArray], outputs: list[FloatArray], weights: FloatArray, first: IntArray
) -> Ratios:
    """The ratios of few outputs.

    Parameters
    ----------
    functions : list of G float arrays (rows of the block, K)
        All functions of all inputs.
    outputs : list of G float arrays (rows of the block, o)
    weights : float array (K,)
    first : int array (d,)
        Where the functions of each input begin.
    """
    n_blocks, n_outputs = len(outputs), outputs[0].shape[1]
    valid = [np.isfinite(y) for y in outputs]
    count = np.array([mask.sum(axis=0) for mask in valid], dtype=np.float64)
    held = np.maximum(count, 1.0)
    middle = sum(np.where(mask, y, 0.0).sum(axis=0) for y, mask in zip(outputs, valid, strict=True))
    middle = middle / np.maximum(count.sum(axis=0), 1.0)
    coefficient = np.empty((n_blocks, len(weights), n_outputs))
    total, square = np.empty((n_blocks, n_outputs)), np.empty((n_blocks, n_outputs))
    for g, (phi, y, mask) in enumerate(zip(functions, outputs, valid, strict=True)):
        deviation = np.where(mask, y - middle, 0.0)
        total[g], square[g] = deviation.sum(axis=0), np.square(deviation).sum(axis=0)
        deviation -= np.where(mask, total[g] / held[g], 0.0)
        coefficient[g] = phi.T @ deviation / held[g]

    def variance(n: FloatArray, s: FloatArray, q: FloatArray) -> FloatArray:
        n = np.maximum(n, 1.0)
        spread: FloatArray = q / n - np.square(s / n)
        return spread

    def explained(s: FloatArray, q: FloatArray, blocks: int) -> FloatArray:
        crossed = weights[:, None] * (np.square(s) - q) / (blocks * (blocks - 1))
        part: FloatArray = np.add.reduceat(crossed, first, axis=-2)
        return part

    n_inputs = len(first)
    c_sum, c_square = coefficient.sum(axis=0), np.square(coefficient).sum(axis=0)
    whole = variance(count.sum(axis=0), total.sum(axis=0), square.sum(axis=0))
    whole_without = variance(
        count.sum(axis=0) - count, total.sum(axis=0) - total, square.sum(axis=0) - square
    )
    part_without = explained(c_sum - coefficient, c_square - np.square(coefficient), n_blocks - 1)
    sizes = np.array([len(y) for y in outputs])
    missing = 1.0 - count.sum(axis=0) / sizes.sum()
    reason = plain_reasons(missing, whole, int(sizes.min()), LEAST_POINTS, "a first-order index")
    return Ratios(
        explained(c_sum, c_square, n_blocks),
        np.broadcast_to(whole, (n_inputs, n_outputs)),
        part_without,
        np.broadcast_to(whole_without[:, None], (n_blocks, n_inputs, n_outputs)),
        reason,
    )
