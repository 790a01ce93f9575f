"""Orthonormal polynomials of every law, against Gauss rules and densities that scipy and numpy give."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import special, stats

from aleafield.arrays import FloatArray
from aleafield.chaos.germs import Germ, all_in_u, choose_germs, dependent_groups
from aleafield.randomness.laws import (
    Beta,
    Discrete,
    Exponential,
    Gamma,
    Law,
    LogNormal,
    LogUniform,
    Normal,
    Sampled,
    Triangular,
    TruncatedNormal,
    Uniform,
)

DEGREE = {"gamma": 5, "exponential": 5}
"""Degrees that the rules below integrate the squares of; 8 where none stands here.  A longer Gauss-Laguerre rule
has nodes so far out that u = cdf(x) rounds to 1."""
LAWS: dict[str, Law] = {
    "uniform": Uniform(-3.0, 5.0),
    "normal": Normal(2.0, 0.3),
    "lognormal": LogNormal(0.4, 0.8),
    "truncated_normal": TruncatedNormal(0.0, 1.0, -1.0, 2.5),
    "loguniform": LogUniform(0.5, 20.0),
    "triangular": Triangular(1.0, 1.5, 4.0),
    "beta": Beta(2.0, 5.0, -1.0, 3.0),
    "arcsine": Beta(0.5, 0.5, 0.0, 1.0),
    "gamma": Gamma(4.0, 0.5),
    "exponential": Exponential(3.0),
}


def between(low: float, high: float, density: object) -> tuple[FloatArray, FloatArray]:
    """Gauss-Legendre nodes in an interval with weights times a density: exact to rounding where it is smooth."""
    nodes, weights = np.polynomial.legendre.leggauss(80)
    x = low + (high - low) * 0.5 * (nodes + 1.0)
    return x, 0.5 * (high - low) * weights * density(x)  # type: ignore[operator]


def rule(name: str) -> tuple[FloatArray, FloatArray]:
    """Values of the law and weights that integrate polynomials of them up to degree 16, or 10; not ours."""
    if name == "uniform":
        return between(-3.0, 5.0, stats.uniform(-3.0, 8.0).pdf)
    if name in ("normal", "lognormal"):
        z, w = np.polynomial.hermite_e.hermegauss(10)
        w = w / w.sum()
        return (2.0 + 0.3 * z, w) if name == "normal" else (np.exp(0.4 + 0.8 * z), w)
    if name == "truncated_normal":
        return between(-1.0, 2.5, stats.truncnorm(-1.0, 2.5).pdf)
    if name == "loguniform":
        return between(0.5, 20.0, stats.loguniform(0.5, 20.0).pdf)
    if name == "triangular":
        density = stats.triang(0.5 / 3.0, 1.0, 3.0).pdf
        sides = between(1.0, 1.5, density), between(1.5, 4.0, density)
        return np.concatenate([x for x, _ in sides]), np.concatenate([w for _, w in sides])
    if name in ("beta", "arcsine"):
        a, b, low, high = (2.0, 5.0, -1.0, 3.0) if name == "beta" else (0.5, 0.5, 0.0, 1.0)
        x, w = special.roots_jacobi(20, b - 1.0, a - 1.0)
        return low + (high - low) * 0.5 * (x + 1.0), w / w.sum()
    shape, scale = (4.0, 0.5) if name == "gamma" else (1.0, 3.0)
    x, w = special.roots_genlaguerre(6, shape - 1.0)
    return scale * x, w / w.sum()


def gram(germ: Germ, u: FloatArray, weights: FloatArray, degree: int) -> FloatArray:
    """Products of the polynomials under weights."""
    values = germ.evaluate(u, degree)
    product: FloatArray = values.T @ (weights[:, None] * values)
    return product


@pytest.mark.parametrize("name", LAWS)
def test_orthonormal_for_the_law_itself(name: str) -> None:
    """u near 1 holds the value to 1e-16 over the tail beyond it only: 1e-8 for the outermost Gauss node."""
    law = LAWS[name]
    x, weights = rule(name)
    (germ,) = choose_germs([law])
    found = gram(germ, law.cdf(x), weights, DEGREE.get(name, 8))
    np.testing.assert_allclose(found, np.eye(len(found)), atol=1e-8 if np.isinf(law.support[1]) else 1e-9)


@pytest.mark.parametrize("name", LAWS)
def test_orthonormal_in_u(name: str) -> None:
    (germ,) = all_in_u(choose_germs([LAWS[name]]))
    u, weights = between(0.0, 1.0, np.ones_like)
    np.testing.assert_allclose(gram(germ, u, weights, 20), np.eye(21), atol=1e-12)


def test_atoms_carry_as_many_polynomials_as_they_are() -> None:
    law = Discrete([3.0, 1.0, 2.0, 5.0, 1.0], [1.0, 2.0, 3.0, 0.0, 2.0])
    (germ,) = choose_germs([law])
    assert germ.highest == 2
    values, weights = np.array([1.0, 2.0, 3.0]), np.array([4.0, 3.0, 1.0]) / 8
    u = law.cdf(values) - 1e-9
    np.testing.assert_allclose(gram(germ, u, weights, 2), np.eye(3), atol=1e-13)
    with pytest.raises(ValueError, match="degree 3"):
        germ.evaluate(u, 3)
    assert all_in_u([germ]) == (germ,)


def test_measured_values_are_taken_as_they_are() -> None:
    numbers = np.random.default_rng(3).gamma(2.0, size=200)
    (germ,) = choose_germs([Sampled("file.csv", "column", tuple(numbers))])
    assert germ.highest == 10
    u = (np.arange(200) + 0.5) / 200
    np.testing.assert_allclose(gram(germ, u, np.full(200, 1 / 200), 10), np.eye(11), atol=1e-10)
    (few,) = choose_germs([Sampled("file.csv", "column", tuple(numbers[:30]))])
    assert few.highest == 5


def test_one_possible_value_has_the_constant_alone() -> None:
    (germ,) = choose_germs([Discrete([2.0, 2.0], [1.0, 1.0])])
    assert germ.highest == 0
    assert germ.evaluate(np.array([0.3]), 0).tolist() == [[1.0]]


def test_recurrences_from_chaospy_are_those_of_the_handbooks() -> None:
    """Monic coefficients: Legendre n^2 / (4 n^2 - 1), Hermite n, Laguerre 2 n + 1 and n^2 (Gautschi 2004)."""
    n = np.arange(1, 21)
    legendre, hermite, laguerre = choose_germs([Uniform(0, 1), Normal(0, 1), Exponential(2.0)])
    np.testing.assert_allclose(legendre.beta[1:], n**2 / (4 * n**2 - 1), rtol=1e-14)
    np.testing.assert_allclose(hermite.beta[1:], n, rtol=1e-14)
    np.testing.assert_allclose(laguerre.beta[1:], n**2, rtol=1e-14)
    np.testing.assert_allclose(laguerre.alpha, 2 * np.arange(21), rtol=1e-14, atol=1e-14)
    assert not legendre.alpha.any()
    assert not hermite.alpha.any()


def test_own_recurrence_agrees_with_the_closed_one() -> None:
    """loguniform by Stieltjes, checked on the smallest moments: a_0 = 0, b_1 = 1, a_1 the skewness."""
    law = LogUniform(0.5, 20.0)
    (germ,) = choose_germs([law])
    skewness = float(stats.loguniform(0.5, 20.0).stats(moments="s"))
    np.testing.assert_allclose(germ.alpha[:2], [0.0, skewness], atol=1e-11)
    np.testing.assert_allclose(germ.beta[1], 1.0, atol=1e-12)


def test_correlated_inputs_are_expanded_in_normal_scores() -> None:
    latent = np.array([[1.0, 0.0, 0.5], [0.0, 1.0, 0.0], [0.5, 0.0, 1.0]])
    germs = choose_germs([Uniform(0, 1)] * 3, dependent_groups(latent))
    assert [germ.name for germ in germs] == ["hermite", "legendre", "hermite"]


@pytest.mark.parametrize("name", ["uniform", "normal", "loguniform", "triangular", "beta", "gamma"])
def test_coordinate_inverts_variable(name: str) -> None:
    (germ,) = choose_germs([LAWS[name]])
    u = np.linspace(0.01, 0.99, 33)
    np.testing.assert_allclose(germ.coordinate(germ.variable(u)), u, rtol=1e-12)
