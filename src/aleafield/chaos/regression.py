"""Least squares for all outputs by one orthogonal factorisation, with leave-one-out residuals."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray

_LEAST_REST = 1e-12
"""Least value of 1 - leverage: a row that alone decides a coefficient has no residual of its own."""


@dataclass(frozen=True, eq=False)
class Fit:
    """Coefficients of a least-squares fit and what they rest on.

    Attributes
    ----------
    coefficients : float array (terms, o)
    residuals : float array (N, o)
        Leave-one-out: a row's value less what the fit to all other rows says, r / (1 - h).
    leverage : float array (N,)
        h, the diagonal of the projector.
    condition : float
        Ratio of the extreme singular values of the basis values.
    q, r : float arrays (N, terms), (terms, terms)
        Their orthogonal factors.
    """

    coefficients: FloatArray
    residuals: FloatArray
    leverage: FloatArray
    condition: float
    q: FloatArray
    r: FloatArray

    def influence(self) -> FloatArray:
        """How each coefficient hangs on the value of each row, (N, terms)."""
        from scipy.linalg import solve_triangular

        return np.asarray(solve_triangular(self.r, self.q.T)).T


def fit(values: FloatArray, y: FloatArray) -> Fit:
    """Least-squares coefficients of outputs in a basis whose first term is the constant 1.

    Parameters
    ----------
    values : float array (N, terms), N >= terms
        Basis at the points.
    y : float array (N, o)
        Outputs, finite.

    Returns
    -------
    Fit
        Where the basis values are linearly dependent to rounding the condition is infinite, and so are all
        residuals.

    Notes
    -----
    Leave-one-out residuals from the leverages: Allen 1974 (PRESS), from memory.  The mean of y is taken out
    first, so that a large offset costs no digits.
    """
    from scipy.linalg import qr, solve_triangular

    q, r = (np.asarray(f, dtype=np.float64) for f in qr(values, mode="economic", check_finite=False))
    singular = np.linalg.svd(r, compute_uv=False)
    leverage = np.einsum("ij,ij->i", q, q)
    if not singular[-1] > singular[0] * np.finfo(np.float64).eps * len(values):
        nothing = np.zeros((values.shape[1], y.shape[1]))
        return Fit(nothing, np.full(y.shape, np.inf), leverage, np.inf, q, r)
    centre = y.mean(axis=0)
    projected = q.T @ (y - centre)
    residuals = (y - centre - q @ projected) / np.maximum(1.0 - leverage, _LEAST_REST)[:, None]
    coefficients = np.asarray(solve_triangular(r, projected))
    coefficients[0] += centre
    return Fit(coefficients, residuals, leverage, float(singular[0] / singular[-1]), q, r)
