"""Expansions against polynomials they must find and closed forms they must reach."""

from __future__ import annotations

import math
import pickle

import numpy as np
import pytest
from scipy.stats import spearmanr

from aleafield.arrays import FloatArray
from aleafield.chaos.germs import dependent_groups
from aleafield.chaos.search import relative_error, search
from aleafield.randomness.copula import Copula
from aleafield.randomness.laws import Discrete, Gamma, Law, LogNormal, Normal, Sampled, Triangular, Uniform
from aleafield.randomness.points import SobolPoints
from tests.sensitivity.known_functions import FRONT, G4, ISHIGAMI, KnownFunction, scrambled

MIXED: list[Law] = [
    Uniform(1.0, 2.0),
    Normal(0.5, 0.2),
    Triangular(0.0, 0.5, 2.0),
    Discrete([1, 2, 4], [1, 1, 1]),
]


def test_polynomials_of_the_values_are_found_exactly() -> None:
    """Of degree 3 in laws of four kinds; their mean and variance from products of moments, by hand."""
    u, block = scrambled(4, 8, 1)
    a, b, c, k = (law.ppf(u[:, i]) for i, law in enumerate(MIXED))
    y = np.column_stack((a * b * c, a + b**2, k**2 + c, np.full(len(u), 3.0)))
    found = search(u, y, MIXED, block=block)
    far = np.random.default_rng(1).random((500, 4))
    a, b, c, k = (law.ppf(far[:, i]) for i, law in enumerate(MIXED))
    exact = np.column_stack((a * b * c, a + b**2, k**2 + c, np.full(500, 3.0)))
    np.testing.assert_allclose(found.evaluate(far), exact, atol=1e-10)
    mean = [1.5 * 0.5 * MIXED[2].mean, 1.5 + 0.29, 7.0 + MIXED[2].mean, 3.0]
    np.testing.assert_allclose(found.mean, mean, rtol=1e-11)
    # Var (mu + s z)^2 = 4 mu^2 s^2 + 2 s^4; of 1, 4, 16 in equal parts: 273 / 3 - 49
    variance = [1 / 12 + 4 * 0.25 * 0.04 + 2 * 0.04**2, 91.0 - 49.0 + MIXED[2].sd ** 2]
    np.testing.assert_allclose(found.variance[1:3], variance, rtol=1e-10)
    assert found.loo.max() < 1e-20
    assert found.condition < 100


@pytest.mark.parametrize(
    ("truth", "runs", "within", "error"),
    [(FRONT, 64, 9e-4, 6e-5), (ISHIGAMI, 512, 1.1e-3, 1.5e-4), (G4, 512, 2.2e-2, 3.2e-2)],
)
def test_indices_of_known_functions(truth: KnownFunction, runs: int, within: float, error: float) -> None:
    """Within three times the rms error over 60 designs that tests/benchmarks/chaos.py prints; the sd within the
    root of the largest relative mean square error over 30, by the triangle inequality of L2."""
    u, block = scrambled(truth.inputs, runs // 16, 2)
    found = search(u, truth.evaluate(u)[:, None], [Uniform(0, 1)] * truth.inputs, block=block)
    np.testing.assert_allclose(found.first()[:, 0], truth.first, atol=within)
    np.testing.assert_allclose(found.total()[:, 0], truth.total, atol=within)
    assert abs(math.sqrt(found.variance[0] / truth.variance) - 1) < math.sqrt(error)


def test_second_order_and_closed_indices() -> None:
    """Front speed: second order of a product of factors is r_i r_j / ((1 + r_1)(1 + r_2)(1 + r_3) - 1)."""
    u, _ = scrambled(3, 16, 3)
    found = search(u, FRONT.evaluate(u)[:, None], [Uniform(0, 1)] * 3)
    expected = [0.011621695424, 0.012007066273, 0.000703829205]
    np.testing.assert_allclose(found.second()[:, 0], expected, atol=1e-6)
    closed = FRONT.first[0] + FRONT.first[2] + expected[1]
    np.testing.assert_allclose(found.closed([0, 2]), closed, atol=1e-6)
    np.testing.assert_allclose(found.partial_variance.sum(axis=0), found.variance)


def test_a_basis_in_u_wins_where_the_response_is_smooth_in_u() -> None:
    """cos of the distribution function itself: for a gamma law no polynomial of the value."""
    u, _ = scrambled(1, 4, 4)
    found = search(u, np.cos(2 * u), [Gamma(4.0, 1.0)])
    assert [germ.name for germ in found.basis.germs] == ["legendre"]
    assert found.loo[0] < 1e-12


def test_failed_rows_are_left_out() -> None:
    u, block = scrambled(3, 8, 5)
    y = FRONT.evaluate(u)[:, None]
    y[[3, 77]] = np.nan
    found = search(u, y, [Uniform(0, 1)] * 3, block=block)
    assert (found.rows, found.missing) == (126, 2 / 128)
    np.testing.assert_allclose(found.first()[:, 0], FRONT.first, atol=1e-4)
    with pytest.raises(ValueError, match="1 runs"):
        search(u, np.where(np.arange(128)[:, None] == 5, y, np.nan), [Uniform(0, 1)] * 3)


def test_one_design_serves_a_field() -> None:
    """200 outputs at once as each alone with the same basis; the basis is chosen on components."""
    u, _ = scrambled(3, 16, 6)
    x = np.linspace(0, 1, 200)
    y = np.exp(-(u[:, [0]] + 0.5 * u[:, [1]] * x)) * (1 + 0.1 * u[:, [2]])
    found = search(u, y, [Uniform(0, 1)] * 3)
    assert found.coefficients.shape == (len(found.basis), 200)
    alone = search(u, y[:, [150]], [Uniform(0, 1)] * 3)
    np.testing.assert_allclose(found.output(150).first(), alone.first(), atol=1e-6)
    # E and E^2 of exp(-a U) for the node x = 0: a = 1
    mean = -math.expm1(-1) * 1.05
    assert abs(found.mean[0] - mean) < 1e-7


def test_correlated_inputs() -> None:
    """s / tau of lognormals whose logarithms have correlation 0.5: lognormal with mu, sd of the logarithm below."""
    copula = Copula(["s", "tau"], [("s", "tau", 6 / math.pi * math.asin(0.25))])
    laws: list[Law] = [LogNormal(0.0, 0.2), LogNormal(math.log(10.0), 0.3)]
    u = SobolPoints(4, 7).at(np.arange(64))[:, :2]
    dependent = copula.correlate(u)
    y = laws[0].ppf(dependent[:, 0]) / laws[1].ppf(dependent[:, 1])
    found = search(u, y[:, None], laws, groups=dependent_groups(copula.latent))
    log_variance = 0.04 + 0.09 - 2 * 0.5 * 0.2 * 0.3
    mean = 0.1 * math.exp(log_variance / 2)
    assert abs(found.mean[0] / mean - 1) < 1e-5
    assert abs(math.sqrt(found.variance[0] / math.expm1(log_variance)) / mean - 1) < 1e-4
    for ask in (found.first, found.total, found.second, lambda: found.closed([0])):
        with pytest.raises(ValueError, match="depend on one another"):
            ask()
    np.testing.assert_allclose(found.closed([0, 1]), 1.0)
    assert spearmanr(dependent).statistic > 0.3


def test_a_sparse_fit_where_inputs_are_many() -> None:
    """Twelve inputs, 128 runs, a pair that acts only together: 0.3^2 of the variance is x1 x2's."""
    u, block = scrambled(12, 8, 8)
    x = math.sqrt(12) * (u - 0.5)
    y = x[:, 0] + 0.5 * x[:, 3] ** 2 + 0.8 * x[:, 5] * x[:, 7]
    found = search(u, y[:, None], [Uniform(0, 1)] * 12, block=block)
    # Var x^2 / 4 = (9 / 5 - 1) / 4 = 0.2
    variance = 1 + 0.2 + 0.64
    np.testing.assert_allclose(found.variance, variance, rtol=1e-8)
    expected = np.zeros(12)
    expected[[0, 3, 5, 7]] = np.array([1, 0.2, 0.64, 0.64]) / variance
    np.testing.assert_allclose(found.total()[:, 0], expected, atol=1e-8)
    assert len(found.basis) < 10


def test_the_cross_validated_error_of_a_sparse_fit_is_honest() -> None:
    """Twelve inputs with a response that 96 runs do not resolve: claimed within 3 of the true error."""
    u, block = scrambled(12, 6, 9)

    def response(v: FloatArray) -> FloatArray:
        value: FloatArray = np.exp(np.sin(3 * v[:, 0]) * v[:, 1] + v[:, 2:6].prod(axis=1) * 4)
        return value

    found = search(u, response(u)[:, None], [Uniform(0, 1)] * 12, block=block)
    far = np.random.default_rng(10).random((20000, 12))
    error = np.mean((response(far) - found.evaluate(far)[:, 0]) ** 2) / response(far).var()
    assert 1 / 3 < found.loo[0] / error < 3


def test_measured_and_discrete_laws() -> None:
    """A polynomial of resampled values: mean and variance over the values themselves."""
    numbers = np.random.default_rng(11).lognormal(size=60)
    laws: list[Law] = [Sampled("file.csv", "column", tuple(numbers)), Discrete([0.0, 1.0], [3.0, 1.0])]
    u, _ = scrambled(2, 8, 12)
    y = laws[0].ppf(u[:, 0]) ** 2 + 2 * laws[1].ppf(u[:, 1])
    found = search(u, y[:, None], laws)
    np.testing.assert_allclose(found.mean, (numbers**2).mean() + 0.5, rtol=1e-10)
    np.testing.assert_allclose(found.variance, (numbers**2).var() + 4 * 3 / 16, rtol=1e-10)


def test_a_constant_has_no_indices() -> None:
    u, _ = scrambled(2, 4, 13)
    found = search(u, np.full((64, 1), 0.1), [Uniform(0, 1)] * 2)
    assert (found.mean[0], found.variance[0], found.loo[0]) == (0.1, 0.0, 0.0)
    assert np.isnan(found.first()).all()


def test_an_expansion_can_be_pickled() -> None:
    u, _ = scrambled(3, 4, 14)
    found = search(u, FRONT.evaluate(u)[:, None], [Uniform(0, 1)] * 3)
    again = pickle.loads(pickle.dumps(found))
    np.testing.assert_array_equal(again.evaluate(u), found.evaluate(u))


def test_relative_error_of_certain_outputs() -> None:
    """Rounding of a constant is no error; a constant that is missed has an undefined one."""
    y = np.full((10, 2), 0.1)
    found = relative_error(np.array([1e-34, 1e-6]), y)
    assert found[0] == 0.0
    assert not found[1] < 1e6
