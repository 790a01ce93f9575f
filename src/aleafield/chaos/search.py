"""The expansion of least error among degrees, sets of terms, germs and, for many inputs, sparse selections."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.chaos.basis import Basis
from aleafield.chaos.expansion import Expansion
from aleafield.chaos.germs import Germ, Groups, all_in_u, choose_germs
from aleafield.chaos.multi_index import hyperbolic, total_degree, within
from aleafield.chaos.pursuit import FOLDS, Selection, pursue
from aleafield.chaos.regression import fit
from aleafield.randomness.laws import Law

OVERSAMPLING = 1.5
"""Least runs per term."""
OVERSAMPLING_HERMITE = 2.0
"""Least runs per term where a germ is Hermite: its bases are worse conditioned."""
WORST_CONDITION = 1e4
MANY_INPUTS = 10
"""From here on thinned sets and sparse selections are tried too."""
THINNED = (0.75, 0.6)
WORK = 2e9
"""Most rows times squared terms of one fit: larger bases are not tried."""
SPARSE_FROM = 1e-3
"""Least squares with a smaller error than this are left alone: a sparse selection would cost seconds."""
SPARSE_TERMS = 2000
"""Most terms that a sparse selection chooses from."""
SPARSE_WORK = 1e6
"""Most rows times terms of what it chooses from."""
MOST_SELECTED = 200
"""Most terms that it keeps."""
_COMPONENTS = 32
"""Most principal components on which the terms are chosen; all outputs when there are no more."""
_NEGLIGIBLE = 1e-12
"""Share of the variance below which a component is left out of that choice."""


@dataclass(frozen=True, eq=False)
class _Candidate:
    """A basis, the terms of it that were selected (all when None), and its error."""

    error: float
    basis: Basis
    selection: Selection | None = None


def search(
    u: FloatArray,
    y: FloatArray,
    laws: Sequence[Law],
    *,
    block: IntArray | None = None,
    groups: Groups = (),
    aim: float = 1e-12,
) -> Expansion:
    """The best expansion that the runs can carry.

    For every choice of germs, and of sets of terms, the degree is raised until the leave-one-out error has
    risen twice, the aim is met, or there are too few runs for the terms (fewer than 1.5 a term, 2 with Hermite
    germs) or the condition exceeds 1e4.  The least error wins.  From ten inputs on, sparse selections compete
    with their cross-validated error, unless least squares leave less than a thousandth.

    Parameters
    ----------
    u : float array (N, d)
        Points of the unit cube, strictly inside, before any copula.
    y : float array (N, o)
        Outputs in the same units: one basis serves all, chosen by the error summed over them.  Rows with a NaN
        are left out.
    laws : of the d inputs
    block : int array (N,), optional
        Scrambling of each point; sparse selections leave out whole scramblings.  Each row alone when left out.
    groups : columns that depend on one another, see `germs.dependent_groups`; () when all are independent
    aim : relative mean square error at which raising the degree ends

    Returns
    -------
    Expansion

    Raises
    ------
    ValueError
        Fewer than two rows without NaN.

    Notes
    -----
    16 scramblings of N / 16 points serve a fit less well than one scrambled sequence of N points.  Over 60 designs
    of each kind (tests/benchmarks/chaos.py) the mean square error was 1.2 to 2.2 times larger with three and four
    inputs and the rms error of indices 1.5 to 2.8 times; on a ring field with nine inputs 1.0 to 1.1 and 1.0 to
    1.8 times.  The leave-one-out error is cautious on one sequence (1.3 to 3 times the true one) and merely
    right on average on 16, at times a seventh of it: that is what held-out runs are for.  So where a study asks
    for chaos alone one sequence is the better design; a main sample of 16 scramblings serves sampling and chaos.
    """
    kept = np.isfinite(y).all(axis=1)
    missing = 1.0 - float(kept.mean())
    u, y = u[kept], y[kept]
    if len(u) < 2:
        raise ValueError(f"{len(u)} runs gave values: nothing can be fitted")
    folds = (np.arange(len(u)) if block is None else block[kept]) % FOLDS
    leading = _leading(y)
    best = _Candidate(math.inf, Basis(choose_germs(laws, groups), total_degree(len(laws), 0)))
    for candidate in _candidates(u, leading, laws, groups, folds, aim):
        if candidate.error < best.error:
            best = candidate
    basis, selection = best.basis, best.selection
    values = basis.evaluate(u)
    if selection is None:
        final = fit(values, y)
        residuals = final.residuals
    else:
        residuals = selection.residuals(values, y, folds)
        basis = Basis(basis.germs, basis.indices[selection.terms])
        final = fit(values[:, selection.terms], y)
    return Expansion(
        basis,
        final.coefficients,
        relative_error((residuals**2).mean(axis=0), y),
        final.condition,
        len(u),
        missing,
        residuals,
        final.influence(),
        groups,
    )


def relative_error(mean_square: FloatArray, y: FloatArray) -> FloatArray:
    """Mean square errors (o,) over the variances of outputs (M, o), (o,); 0 where both are rounding."""
    variance = y.var(axis=0, ddof=1)
    rounding = (8 * np.finfo(np.float64).eps * np.abs(y).max(axis=0)) ** 2
    certain = (variance <= rounding) & (mean_square <= rounding)
    relative: FloatArray = np.where(certain, 0.0, mean_square / np.where(variance > 0, variance, np.nan))
    return relative


def _leading(y: FloatArray) -> FloatArray:
    """Outputs without their means, (N, k): themselves, or the components that hold nearly all variance.

    Least squares and leave-one-out are linear in the outputs, and the error summed over outputs is the same
    in any orthogonal mixture of them.
    """
    centred: FloatArray = y - y.mean(axis=0)
    if y.shape[1] <= _COMPONENTS:
        return centred
    if len(y) <= y.shape[1]:
        squares, left = np.linalg.eigh(centred @ centred.T)
        scores: FloatArray = left * np.sqrt(np.maximum(squares, 0.0))
    else:
        squares, right = np.linalg.eigh(centred.T @ centred)
        scores = centred @ right
    kept = squares > _NEGLIGIBLE * squares.sum()
    kept[:-_COMPONENTS] = False
    leading: FloatArray = scores[:, kept] if kept.any() else centred[:, :1]
    return leading


def _candidates(
    u: FloatArray, y: FloatArray, laws: Sequence[Law], groups: Groups, folds: IntArray, aim: float
) -> Iterator[_Candidate]:
    """Everything that is tried."""
    usual = choose_germs(laws, groups)
    in_u = all_in_u(usual)
    choices = [usual]
    if [germ.name for germ in in_u] != [germ.name for germ in usual]:
        choices.append(in_u)
    thinned = THINNED if len(laws) >= MANY_INPUTS else ()
    least = math.inf
    for germs in choices:
        for q in (1.0, *thinned):
            for candidate in _by_degree(u, y, germs, q, aim):
                least = min(least, candidate.error)
                yield candidate
    if len(laws) >= MANY_INPUTS and least > SPARSE_FROM:
        for germs in choices:
            yield from _sparse(u, y, germs, folds)


def _indices(germs: Sequence[Germ], p: int, q: float) -> IntArray:
    """Total degree for q = 1, thinned sets else, within what the germs have."""
    d = len(germs)
    indices = total_degree(d, p) if q == 1.0 else hyperbolic(d, p, q)
    return within(indices, (germ.highest for germ in germs))


def _most_terms(rows: int, germs: Sequence[Germ]) -> int:
    hermite = any(germ.name == "hermite" for germ in germs)
    per_term = OVERSAMPLING_HERMITE if hermite else OVERSAMPLING
    return int(min(rows / per_term, math.sqrt(WORK / rows)))


def _by_degree(
    u: FloatArray, y: FloatArray, germs: Sequence[Germ], q: float, aim: float
) -> Iterator[_Candidate]:
    """Least squares of growing degree."""
    most = _most_terms(len(u), germs)
    error, rises, terms = math.inf, 0, 0
    for p in range(max((germ.highest for germ in germs), default=0) * len(germs) + 1):
        if math.comb(len(germs) + p, p) > most and q == 1.0 and all(germ.highest >= p for germ in germs):
            return
        indices = _indices(germs, p, q)
        if len(indices) > most and p > 0:
            return
        if len(indices) == terms:
            continue
        terms = len(indices)
        basis = Basis(germs, indices)
        tried = fit(basis.evaluate(u), y)
        if tried.condition > WORST_CONDITION:
            return
        before, error = error, _summed(tried.residuals, y)
        rises = rises + 1 if error > before else 0
        yield _Candidate(error, basis)
        if error <= aim or rises == 2:
            return


def _sparse(u: FloatArray, y: FloatArray, germs: Sequence[Germ], folds: IntArray) -> Iterator[_Candidate]:
    """Sparse selections from the largest sets of degree 2 and above that are not too large."""
    most = min(SPARSE_TERMS, int(SPARSE_WORK / len(u)))
    for q in (1.0, *THINNED):
        largest = None
        for p in range(2, 6):
            if q == 1.0 and math.comb(len(germs) + p, p) > most:
                break
            indices = _indices(germs, p, q)
            if len(indices) > most:
                break
            largest = indices
        if largest is None:
            continue
        basis = Basis(germs, largest)
        values = basis.evaluate(u)
        longest = min(MOST_SELECTED, _most_terms(len(u), germs))
        selection = pursue(values, y, folds, longest)
        yield _Candidate(_summed(selection.residuals(values, y, folds), y), basis, selection)


def _summed(residuals: FloatArray, y: FloatArray) -> float:
    """Mean square of all residuals over the variance of all outputs; 0 for outputs that are all constant."""
    variance = float(y.var(axis=0, ddof=1).sum())
    mean_square = float((residuals**2).mean(axis=0).sum())
    return mean_square / variance if variance > 0 else 0.0
