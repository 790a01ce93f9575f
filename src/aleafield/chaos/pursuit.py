"""Sparse fits for many inputs: orthogonal matching pursuit, its length by cross-validation.

Terms are taken one after another, each time the one whose part orthogonal to those taken explains most of
what is left (Pati, Rezaiifar and Krishnaprasad 1993; Blatman and Sudret 2011 for chaos; both from memory).
The leave-one-out error after such a selection is far too small; here the whole selection is repeated without
each fold, and the error in the fold decides on the length and is the error that is reported.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray, IntArray

FOLDS = 5
_NOTHING = 1e-26
"""A path ends where this share of the sum of squares is left: rounding."""
PATIENCE = 15
"""Terms without a smaller error in the fold after which its path ends."""


@dataclass(frozen=True, eq=False)
class Selection:
    """The terms of a sparse fit.

    Attributes
    ----------
    terms : int array (k,)
        Columns of the basis values, in the order taken; the constant first.
    without : tuple of int arrays (k,)
        The same for each fold, selected without its rows.
    """

    terms: IntArray
    without: tuple[IntArray, ...]

    def residuals(self, values: FloatArray, y: FloatArray, folds: IntArray) -> FloatArray:
        """Each row's value less what selection and fit without its fold say, (N, o).

        `values` and `folds` are those of the selection; y (N, o) may be other outputs.
        """
        left = np.empty_like(y)
        for fold, terms in enumerate(self.without):
            held = folds == fold
            chosen = values[:, terms]
            coefficients = np.linalg.lstsq(chosen[~held], y[~held], rcond=None)[0]
            left[held] = y[held] - chosen[held] @ coefficients
        return left


def pursue(values: FloatArray, y: FloatArray, folds: IntArray, longest: int) -> Selection:
    """Select terms for all outputs together.

    Parameters
    ----------
    values : float array (N, terms)
        Basis at the points, the constant first.
    y : float array (N, o)
        Outputs; terms are chosen by the sum of squares over all of them.
    folds : int array (N,)
        0 to FOLDS - 1; whole blocks of dependent points belong in one fold.
    longest : int
        Most terms of the result.
    """
    paths, curves = [], []
    for fold in range(FOLDS):
        held = folds == fold
        path, curve = _path(values[~held], y[~held], longest, values[held], y[held])
        paths.append(path)
        curves.append(curve)
    length = min(len(curve) for curve in curves)
    best = 1 + int(np.argmin(np.sum([curve[:length] for curve in curves], axis=0)))
    terms, _ = _path(values, y, best)
    return Selection(terms, tuple(path[:best] for path in paths))


def _path(
    values: FloatArray,
    y: FloatArray,
    longest: int,
    held_values: FloatArray | None = None,
    held_y: FloatArray | None = None,
) -> tuple[IntArray, FloatArray]:
    """Terms in the order taken, and the squared error on held-out rows after each.

    The part of every column orthogonal to those taken is known by its squared norm and its products with the
    outputs alone: one product with the newest direction per step brings both up to date.
    """
    n, count = values.shape
    longest = min(longest, n - 1, count)
    taken = [0]
    directions = np.zeros((longest, n))
    directions[0] = values[:, 0] / np.linalg.norm(values[:, 0])
    along = directions[0] @ values
    squares = np.einsum("ij,ij->j", values, values)
    least = 1e-8 * squares
    squares -= along**2
    left = y - np.outer(directions[0], directions[0] @ y)
    products = values.T @ left
    errors = []
    # rows of `triangle` are the products of the directions with the terms taken
    triangle = np.zeros((longest, longest))
    triangle[0, 0] = along[0]
    heights = [directions[0] @ y]

    def record() -> None:
        if held_values is not None and held_y is not None:
            from scipy.linalg import solve_triangular

            k = len(taken)
            coefficients = solve_triangular(triangle[:k, :k], np.array(heights))
            errors.append(float(((held_y - held_values[:, taken] @ coefficients) ** 2).sum()))

    record()
    whole = float((left**2).sum())
    for k in range(1, longest):
        if float((left**2).sum()) <= _NOTHING * whole:
            break
        free = squares > least
        free[taken] = False
        if not free.any():
            break
        gain = np.where(free, (products**2).sum(axis=1) / np.where(free, squares, 1.0), -1.0)
        term = int(np.argmax(gain))
        direction = values[:, term].copy()
        for _ in range(2):
            direction -= directions[:k].T @ (directions[:k] @ direction)
        direction /= np.linalg.norm(direction)
        directions[k] = direction
        triangle[: k + 1, k] = directions[: k + 1] @ values[:, term]
        heights.append(direction @ left)
        left = left - np.outer(direction, heights[-1])
        along = direction @ values
        squares -= along**2
        products -= np.outer(along, heights[-1])
        taken.append(term)
        record()
        if errors and len(errors) - 1 - int(np.argmin(errors)) >= PATIENCE:
            break
    return np.array(taken, dtype=np.int64), np.array(errors)
