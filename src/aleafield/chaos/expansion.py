"""A polynomial expansion of one or many outputs, and what its coefficients say."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np

from aleafield.arrays import BoolArray, FloatArray
from aleafield.chaos.basis import Basis
from aleafield.chaos.germs import Groups
from aleafield.chaos.multi_index import closed_terms, first_terms, second_terms, total_terms

_CHUNK = 1 << 13
"""Points that are evaluated at a time."""


@dataclass(frozen=True, eq=False)
class Expansion:
    """Outputs as sums of orthonormal polynomials of independent germs.

    Variances and indices are sums of squared coefficients (Sudret 2008, from memory).  Where inputs depend on
    one another the germs are those of the independent scores behind them, and how the variance is shared among
    scores of one group depends on the order of the inputs: only shares of whole groups are given then.

    Attributes
    ----------
    basis : Basis
    coefficients : float array (terms, o)
    loo : float array (o,)
        Mean square of the residuals of rows that were not used (leave-one-out, or cross-validation around a
        sparse selection; for a projection the change from the level before) over the variance of the output.
    condition : float
        Of the regression; 1 for a projection.
    rows : int
        Solver runs that it rests on.
    missing : float
        Share of the runs that gave no value and were left out.
    residuals : float array (rows, o) or None
        Those of `loo`, in the units of the output; None for a projection.
    influence : float array (rows, terms) or None
        How coefficients hang on the values of the rows; None for a projection.
    groups : tuple of tuple of int
        Columns that depend on one another; () when all are independent.
    """

    basis: Basis
    coefficients: FloatArray
    loo: FloatArray
    condition: float
    rows: int
    missing: float = 0.0
    residuals: FloatArray | None = None
    influence: FloatArray | None = None
    groups: Groups = ()

    def evaluate(self, u: FloatArray) -> FloatArray:
        """The outputs at points u (N, d) of the unit cube, before any copula: (N, o), in their units."""
        values = np.empty((len(u), self.coefficients.shape[1]))
        for start in range(0, len(u), _CHUNK):
            part = slice(start, start + _CHUNK)
            values[part] = self.basis.evaluate(u[part]) @ self.coefficients
        return values

    def output(self, column: int) -> Expansion:
        """The expansion of one output alone, o = 1."""
        only = slice(column, column + 1)
        residuals = None if self.residuals is None else self.residuals[:, only]
        return replace(self, coefficients=self.coefficients[:, only], loo=self.loo[only], residuals=residuals)

    @property
    def mean(self) -> FloatArray:
        """Expectation of each output, (o,)."""
        mean: FloatArray = self.coefficients[0]
        return mean

    @property
    def partial_variance(self) -> FloatArray:
        """Part of each term in the variance, (terms, o); that of the constant is 0."""
        squares: FloatArray = self.coefficients**2
        squares[0] = 0.0
        return squares

    @property
    def variance(self) -> FloatArray:
        """Variance of each output, (o,)."""
        return np.asarray(self.partial_variance.sum(axis=0))

    def first(self) -> FloatArray:
        """First-order indices, (d, o); NaN where an output has no variance."""
        return self.shares(self.first_terms())

    def total(self) -> FloatArray:
        """Total indices, (d, o); NaN where an output has no variance."""
        return self.shares(self.total_terms())

    def second(self) -> FloatArray:
        """Second-order indices of the pairs in the order of `multi_index.pairs`, (d (d - 1) / 2, o)."""
        return self.shares(self.second_terms())

    def closed(self, subset: Iterable[int]) -> FloatArray:
        """Share of the variance that inputs of a subset explain together, (o,)."""
        return np.asarray(self.shares(self.closed_terms(subset)[None])[0])

    def shares(self, terms: BoolArray) -> FloatArray:
        """Share of the variance that sets of terms (k, terms) hold, (k, o); NaN without variance."""
        variance = self.variance
        held = terms.astype(np.float64) @ self.partial_variance
        return np.asarray(held / np.where(variance > 0, variance, np.nan))

    def first_terms(self) -> BoolArray:
        """For each input its own terms, (d, terms)."""
        self._require_independence()
        return first_terms(self.basis.indices)

    def total_terms(self) -> BoolArray:
        """For each input all terms that hold it, (d, terms)."""
        self._require_independence()
        return total_terms(self.basis.indices)

    def second_terms(self) -> BoolArray:
        """For each pair of inputs its own terms, (d (d - 1) / 2, terms)."""
        self._require_independence()
        return second_terms(self.basis.indices)

    def closed_terms(self, subset: Iterable[int]) -> BoolArray:
        """The terms in inputs of a subset alone, (terms,).

        Raises
        ------
        ValueError
            The subset parts inputs that depend on one another.
        """
        subset = set(subset)
        for group in self.groups:
            if subset & set(group) and not set(group) <= subset:
                raise ValueError(f"columns {group} depend on one another: their share cannot be parted")
        return closed_terms(self.basis.indices, subset)

    def _require_independence(self) -> None:
        for group in self.groups:
            if len(group) > 1:
                raise ValueError(
                    f"columns {group} depend on one another: an expansion has no indices of each of them"
                )
