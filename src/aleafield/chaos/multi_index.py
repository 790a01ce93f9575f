"""Sets of multi-indices: which products of one-input polynomials a basis holds.

A multi-index is a row of d degrees.  Every set here is downward closed and starts with the constant.
"""

from __future__ import annotations

from collections.abc import Iterable
from itertools import combinations

import numpy as np

from aleafield.arrays import BoolArray, IntArray


def total_degree(d: int, p: int) -> IntArray:
    """All multi-indices of d inputs with degrees that sum to at most p, (terms, d), by increasing sum.

    >>> total_degree(2, 1).tolist()
    [[0, 0], [1, 0], [0, 1]]
    """
    return _grow(d, p, 1.0, d)


def hyperbolic(d: int, p: int, q: float, most_inputs: int = 3) -> IntArray:
    """Multi-indices with (sum alpha_i^q)^(1/q) <= p in at most `most_inputs` inputs, (terms, d).

    q < 1 thins out high interactions (Blatman and Sudret 2011, from memory); q = 1 is the total degree.
    """
    return _grow(d, p, q, most_inputs)


def _grow(d: int, p: int, q: float, most_inputs: int) -> IntArray:
    """Each set of one sum from that of the sum before: no index is reached twice.

    An index is raised only at or behind its last positive entry.
    """
    level: IntArray = np.zeros((1, d), dtype=np.int64)
    last = np.zeros(1, dtype=np.int64)
    levels = [level]
    limit = float(p) ** q * (1.0 + 1e-12)
    for _ in range(p):
        raised, places = [], []
        for j in range(d):
            child = level[last <= j].copy()
            child[:, j] += 1
            inside = (child.astype(np.float64) ** q).sum(axis=1) <= limit
            child = child[inside & ((child > 0).sum(axis=1) <= most_inputs)]
            raised.append(child)
            places.append(np.full(len(child), j))
        level, last = np.concatenate(raised), np.concatenate(places)
        if not len(level):
            break
        levels.append(level)
    return np.concatenate(levels)


def within(indices: IntArray, highest: Iterable[int]) -> IntArray:
    """The multi-indices (terms, d) that exceed the highest degree of no input."""
    kept: IntArray = indices[(indices <= np.array(list(highest), dtype=np.int64)).all(axis=1)]
    return kept


def first_terms(indices: IntArray) -> BoolArray:
    """For each input the terms of it alone, (d, terms)."""
    alone: BoolArray = (indices > 0).T & ((indices > 0).sum(axis=1) == 1)
    return alone


def total_terms(indices: IntArray) -> BoolArray:
    """For each input the terms that hold it, (d, terms)."""
    return np.ascontiguousarray((indices > 0).T)


def second_terms(indices: IntArray) -> BoolArray:
    """For each pair of inputs, in the order of `pairs`, the terms of just these two, (d (d - 1) / 2, terms)."""
    used = indices > 0
    two = used.sum(axis=1) == 2
    chosen = [used[:, i] & used[:, j] & two for i, j in pairs(indices.shape[1])]
    return np.array(chosen, dtype=np.bool_).reshape(len(chosen), len(indices))


def closed_terms(indices: IntArray, subset: Iterable[int]) -> BoolArray:
    """The terms in inputs of the subset and in no others, the constant left out, (terms,)."""
    outside = np.ones(indices.shape[1], dtype=np.bool_)
    outside[list(subset)] = False
    within_subset: BoolArray = np.logical_and(
        (indices > 0).any(axis=1), ~(indices[:, outside] > 0).any(axis=1)
    )
    return within_subset


def pairs(d: int) -> list[tuple[int, int]]:
    """Pairs of d inputs in the order of second-order indices.

    >>> pairs(3)
    [(0, 1), (0, 2), (1, 2)]
    """
    return list(combinations(range(d), 2))
