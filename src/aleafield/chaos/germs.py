"""The germ of each input: the variable in which it is expanded, and its orthonormal polynomials.

With monic coefficients a_n, b_n the orthonormal polynomials q_n of a law obey

    sqrt(b_(n+1)) q_(n+1)(t) = (t - a_n) q_n(t) - sqrt(b_n) q_(n-1)(t),   q_0 = 1

(Gautschi 2004, "Orthogonal polynomials: computation and approximation", from memory).  chaospy gives them for
the laws whose coefficients it knows in closed form; for the others Stieltjes' procedure runs on a fine Gauss
rule, or on the atoms.  No germ is best for every response: `all_in_u` is the second choice that a search tries.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.randomness.laws import (
    Beta,
    Discrete,
    Exponential,
    Gamma,
    Law,
    LogNormal,
    Normal,
    Sampled,
    Triangular,
    Uniform,
)

GermName = Literal["legendre", "hermite", "own"]
Groups = tuple[tuple[int, ...], ...]
"""A partition of the columns into groups that are independent of one another."""

HIGHEST = 20
"""Highest degree in one input."""
HIGHEST_OF_ATOMS = 10
"""Highest degree on the atoms of a sampled or discrete law; it needs as many atoms and one more."""
_LEAST_NORM = 1e-12
"""A recurrence ends where the next polynomial vanishes on all atoms."""
_CELLS, _POINTS, _REACH = 60, 20, 30.0
"""Cells, and Gauss points in each, of the logit of u in (-30, 30): they stand for a law with a density.  In the logit
the inverse of a distribution function is smooth whatever its ends; what lies beyond has a probability of 1e-13."""


@dataclass(frozen=True, eq=False)
class Germ:
    """The variable t in which one input is expanded, with its orthonormal polynomials.

    Attributes
    ----------
    name : "legendre", "hermite" or "own"
        t is 2 u - 1, the normal score of u, or the input's own value, standardised; u is the input's
        coordinate in the unit cube.
    law : Law
        Of the input.
    alpha, beta : float arrays (highest + 1,)
        Monic recurrence coefficients; beta[0] = 1.
    """

    name: GermName
    law: Law
    alpha: FloatArray
    beta: FloatArray

    @property
    def highest(self) -> int:
        """The highest degree that the law admits."""
        return len(self.beta) - 1

    def variable(self, u: FloatArray) -> FloatArray:
        """t (N,) at coordinates u (N,) strictly inside (0, 1)."""
        if self.name == "legendre":
            return 2.0 * u - 1.0
        if self.name == "hermite":
            from scipy.special import ndtri

            return np.asarray(ndtri(u))
        return (self.law.ppf(u) - self.law.mean) / (self.law.sd or 1.0)

    def coordinate(self, t: FloatArray) -> FloatArray:
        """u (N,) at values t (N,) of the variable; the inverse of `variable` for laws with a density."""
        if self.name == "legendre":
            return 0.5 * (t + 1.0)
        if self.name == "hermite":
            from scipy.special import ndtr

            return np.asarray(ndtr(t))
        return np.asarray(self.law.cdf(self.law.mean + (self.law.sd or 1.0) * t))

    def evaluate(self, u: FloatArray, degree: int) -> FloatArray:
        """Orthonormal polynomials of degrees 0 to `degree` at u (N,): (N, degree + 1), column by column.

        Raises
        ------
        ValueError
            The degree exceeds `highest`.
        """
        if degree > self.highest:
            raise ValueError(f"degree {degree} of a germ that has degrees up to {self.highest}")
        t = self.variable(np.asarray(u, dtype=np.float64))
        table = np.ones((degree + 1, len(t)))
        norms = np.sqrt(self.beta)
        for n in range(degree):
            table[n + 1] = (t - self.alpha[n]) * table[n]
            if n:
                table[n + 1] -= norms[n] * table[n - 1]
            table[n + 1] /= norms[n + 1]
        return table.T


def choose_germs(laws: Sequence[Law], groups: Groups = ()) -> tuple[Germ, ...]:
    """The germs that suit most responses.

    uniform: Legendre; normal, lognormal and every input that is correlated with another: Hermite, in the
    independent normal scores from which correlated inputs are mixed; all others: the law's own polynomials.

    Parameters
    ----------
    laws : of the inputs, in the order of the columns
    groups : columns that depend on one another; () when all inputs are independent
    """
    correlated = {column for group in groups if len(group) > 1 for column in group}
    return tuple(
        _germ("hermite", law)
        if column in correlated or isinstance(law, Normal | LogNormal)
        else _germ("legendre" if isinstance(law, Uniform) else "own", law)
        for column, law in enumerate(laws)
    )


def all_in_u(germs: Sequence[Germ]) -> tuple[Germ, ...]:
    """The same inputs with Legendre polynomials of u; laws of few atoms keep their own polynomials."""
    return tuple(
        germ if germ.name == "own" and isinstance(germ.law, Discrete) else _germ("legendre", germ.law)
        for germ in germs
    )


def dependent_groups(latent: FloatArray) -> Groups:
    """The finest partition of the columns that a latent correlation (d, d) does not join.

    >>> dependent_groups(np.array([[1.0, 0.0, 0.3], [0.0, 1.0, 0.0], [0.3, 0.0, 1.0]]))
    ((0, 2), (1,))
    """
    from scipy.sparse.csgraph import connected_components

    _, labels = connected_components(latent != 0.0, directed=False)
    return tuple(tuple(int(i) for i in np.flatnonzero(labels == label)) for label in dict.fromkeys(labels))


def _germ(name: GermName, law: Law) -> Germ:
    if name == "own":
        return Germ(name, law, *_own_recurrence(law))
    return Germ(name, law, *_standard_recurrence(name))


@lru_cache
def _standard_recurrence(name: GermName) -> tuple[FloatArray, FloatArray]:
    import chaospy

    return _closed_recurrence(chaospy.Uniform(-1, 1) if name == "legendre" else chaospy.Normal(0, 1))


@lru_cache(maxsize=256)
def _own_recurrence(law: Law) -> tuple[FloatArray, FloatArray]:
    """Coefficients of the standardised value, as far as the law has polynomials."""
    import chaospy

    mean, sd = law.mean, law.sd or 1.0
    if isinstance(law, Beta):
        low, high = ((end - mean) / sd for end in law.support)
        return _closed_recurrence(chaospy.Beta(law.a, law.b, low, high))
    if isinstance(law, Gamma):
        return _closed_recurrence(chaospy.Gamma(law.shape, law.scale / sd, -mean / sd))
    if isinstance(law, Exponential):
        return _closed_recurrence(chaospy.Gamma(1.0, 1.0, -1.0))
    if isinstance(law, Sampled | Discrete):
        values, weights = _atoms(law)
        n_rows = len(law.values) if isinstance(law, Sampled) else len(values) ** 2
        degree = min(HIGHEST_OF_ATOMS, len(values) - 1, math.isqrt(n_rows))
        return _stieltjes((values - mean) / sd, weights, degree)
    u, weights = _fine_rule(float(law.cdf(law.mode)) if isinstance(law, Triangular) else 0.0)
    return _stieltjes((law.ppf(u) - mean) / sd, weights, HIGHEST)


def _fine_rule(kink: float) -> tuple[FloatArray, FloatArray]:
    """Points u and weights that integrate functions of a law's value that are smooth on both sides of a kink."""
    nodes, shares = np.polynomial.legendre.leggauss(_POINTS)
    width = 2.0 * _REACH / _CELLS
    logit = (-_REACH + width * (np.arange(_CELLS)[:, None] + 0.5 * (nodes + 1.0))).ravel()
    share = 1.0 / (1.0 + np.exp(-logit))
    density = np.tile(0.5 * width * shares, _CELLS) * share * (1.0 - share)
    sides = [(0.0, kink), (kink, 1.0)] if 0.0 < kink < 1.0 else [(0.0, 1.0)]
    u = np.concatenate([low + (high - low) * share for low, high in sides])
    weights = np.concatenate([(high - low) * density for low, high in sides])
    return u, weights / weights.sum()


def _closed_recurrence(distribution: object) -> tuple[FloatArray, FloatArray]:
    """The coefficients that a chaospy distribution knows in closed form."""
    alpha, beta = distribution.ttr(np.arange(HIGHEST + 1))  # type: ignore[attr-defined]
    beta = np.array(beta, dtype=np.float64).ravel()
    beta[0] = 1.0
    return np.array(alpha, dtype=np.float64).ravel(), beta


def _atoms(law: Sampled | Discrete) -> tuple[FloatArray, FloatArray]:
    """Distinct values in order, and their probabilities."""
    given = np.array(law.values)
    weights = np.full(len(given), 1.0 / len(given)) if isinstance(law, Sampled) else np.array(law.weights)
    values, place = np.unique(given[weights > 0], return_inverse=True)
    shares = np.zeros(len(values))
    np.add.at(shares, place, weights[weights > 0])
    return values, shares / shares.sum()


def _stieltjes(t: FloatArray, weights: FloatArray, degree: int) -> tuple[FloatArray, FloatArray]:
    """Recurrence of the polynomials orthonormal under weights at t, up to the degree or the last one."""
    alpha, beta = [], [1.0]
    before, now = np.zeros_like(t), np.ones_like(t)
    for n in range(degree + 1):
        alpha.append(float(weights @ (t * now**2)))
        if n == degree:
            break
        following = (t - alpha[n]) * now - (math.sqrt(beta[n]) if n else 0.0) * before
        square = float(weights @ following**2)
        if square < _LEAST_NORM:
            break
        beta.append(square)
        before, now = now, following / math.sqrt(square)
    return np.array(alpha), np.array(beta)
