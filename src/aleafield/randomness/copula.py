"""The Gaussian copula: inputs with given rank correlations and untouched laws.

Independent uniform numbers become independent Gaussian ones, these are mixed by a Cholesky factor of the
latent correlation, and go back to uniform ones. Between Gaussian numbers of correlation c Spearman's
correlation is (6 / pi) arcsin(c / 2) (Kruskal 1958, "Ordinal measures of association"; from memory), and
ranks do not change under a continuous law; so c = 2 sin(pi rho / 6) reaches rho exactly for continuous laws.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.formula import nearest_name

KEY = "dependence.rank_correlation"
_SMALLEST = 2.0**-53
"""Distance that uniform numbers keep from 0 and 1."""
_SINGULAR = 1e-10
"""Least eigenvalue of a latent matrix that is still called positive definite."""


class Copula:
    """Gives columns of independent uniform numbers the wanted rank correlations.

    Parameters
    ----------
    paths : sequence of str
        The inputs, in the order of the columns.
    rank_correlation : sequence of (path, path, float)
        Spearman's correlations; pairs that are not named are uncorrelated.

    Attributes
    ----------
    latent : float array, (d, d)
        Correlation of the Gaussian numbers behind the inputs.

    Raises
    ------
    InputError
        An unknown input, a pair named twice or an input paired with itself, a correlation of size 1 or more,
        or a latent matrix that is not positive definite.
    """

    def __init__(self, paths: Sequence[str], rank_correlation: Sequence[tuple[str, str, float]]) -> None:
        self.latent: FloatArray = np.eye(len(paths))
        named: set[frozenset[str]] = set()
        for first, second, correlation in rank_correlation:
            for path in (first, second):
                if path not in paths:
                    raise InputError(
                        KEY,
                        f"{path!r} is no uncertain input",
                        "the inputs are " + (", ".join(paths) or "none"),
                        nearest=nearest_name(path, paths),
                    )
            if first == second:
                raise InputError(KEY, f"{first!r} paired with itself", "name two inputs")
            if frozenset((first, second)) in named:
                raise InputError(KEY, f"{first!r} and {second!r} paired twice", "name each pair once")
            named.add(frozenset((first, second)))
            if not abs(correlation) < 1:
                raise InputError(
                    KEY,
                    f"{correlation!r} for {first!r} and {second!r}",
                    "it lies strictly between -1 and 1; for 1 use one parameter in both places",
                )
            i, j = paths.index(first), paths.index(second)
            self.latent[i, j] = self.latent[j, i] = 2 * np.sin(np.pi * correlation / 6)
        smallest = float(np.linalg.eigvalsh(self.latent)[0]) if len(paths) else 1.0
        if smallest < _SINGULAR:
            pairs = ", ".join(f"{first} and {second}: {value!r}" for first, second, value in rank_correlation)
            raise InputError(
                KEY,
                f"{pairs} cannot hold together: their latent matrix has the eigenvalue {smallest:.3g}",
                "it must be positive definite; move the correlations closer to 0",
            )
        self._factor: FloatArray = np.linalg.cholesky(self.latent).astype(np.float64)
        self._mixed = [j for j in range(len(paths)) if np.any(self._factor[j, :j])]

    def correlate(self, points: FloatArray) -> FloatArray:
        """Dependent uniform numbers from independent ones.

        Rows do not influence one another, to the bit. Columns that depend on no earlier one stay as they are.

        Parameters
        ----------
        points : float array, (S, d)
            Strictly between 0 and 1.

        Returns
        -------
        float array, (S, d)
            Strictly between 0 and 1.
        """
        if not self._mixed:
            return points
        from scipy.special import ndtr, ndtri

        dependent = points.copy()
        latent: FloatArray = ndtri(points)
        for j in self._mixed:
            mixture: FloatArray = self._factor[j, j] * latent[:, j]
            for k in np.flatnonzero(self._factor[j, :j]):
                mixture += self._factor[j, k] * latent[:, k]
            dependent[:, j] = np.clip(ndtr(mixture), _SMALLEST, 1 - _SMALLEST)
        return dependent
