"""Value, mean, integral, norm, spectral power, formula and function against closed forms."""

from __future__ import annotations

import math

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.field.formula_term import FormulaTerm
from aleafield.field.parameter import Binding
from aleafield.formula import Formula
from aleafield.geometry import Domain
from aleafield.quantities import (
    At,
    FormulaQuantity,
    FunctionQuantity,
    Integral,
    Maximum,
    Mean,
    Norm,
    SpectralPower,
    Value,
)
from tests.exactness.trajectories import (
    EPS,
    INTERVAL,
    PAIRS,
    RING,
    SMOOTH_PAIRS,
    Trajectory,
    follow,
    of_function,
    of_state,
    random_elements,
    space_of,
)

HEIGHTS = np.array([[0.5], [1.0], [-2.0]])
KAPPA = 2 * math.pi / RING.length


def line(x: FloatArray) -> FloatArray:
    """1 + a x for three slopes."""
    return 1.0 + HEIGHTS * x


def wave(x: FloatArray) -> FloatArray:
    """2 + a cos(3 kappa x) for three heights."""
    return 2.0 + HEIGHTS * np.cos(3 * KAPPA * x)


def line_moment(power: int) -> FloatArray:
    """Integral of (1 + a x)^power over the interval."""
    a = HEIGHTS[:, 0]
    return ((1 + a * INTERVAL.high) ** (power + 1) - (1 + a * INTERVAL.low) ** (power + 1)) / (
        a * (power + 1)
    )


def formula(text: str, **options: object) -> FormulaQuantity:
    return FormulaQuantity("f", FormulaTerm(Formula(text)), **options)  # type: ignore[arg-type]


@pytest.mark.parametrize("projector", ["piecewise linear", "chebyshev", "legendre"])
def test_integrals_of_a_line_are_exact(projector: str) -> None:
    space = space_of((projector, INTERVAL), 9)
    length = INTERVAL.length
    close = {"rtol": 1e3 * EPS, "atol": 1e3 * EPS}
    np.testing.assert_allclose(of_function(Integral("q"), space, line)[0], line_moment(1), **close)
    np.testing.assert_allclose(of_function(Mean("q"), space, line)[0], line_moment(1) / length, **close)
    np.testing.assert_allclose(of_function(Norm("q"), space, line)[0], np.sqrt(line_moment(2)), **close)
    np.testing.assert_allclose(
        of_function(Value("q", 0.7), space, line)[0], line(np.array([0.7]))[:, 0], **close
    )


def test_integrals_of_a_wave_are_exact_in_its_own_space() -> None:
    space = space_of(("fourier", RING), 16)
    a = HEIGHTS[:, 0]
    close = {"rtol": 1e3 * EPS, "atol": 1e3 * EPS}
    np.testing.assert_allclose(
        of_function(Integral("q"), space, wave)[0], 2 * RING.length * np.ones(3), **close
    )
    np.testing.assert_allclose(of_function(Mean("q"), space, wave)[0], 2 * np.ones(3), **close)
    np.testing.assert_allclose(
        of_function(Norm("q"), space, wave)[0], np.sqrt(RING.length * (4 + a**2 / 2)), **close
    )
    for k, power in ((0, 4 * np.ones(3)), (3, a**2 / 4), (2, np.zeros(3))):
        np.testing.assert_allclose(of_function(SpectralPower("q", k), space, wave)[0], power, **close)


@pytest.mark.parametrize("n", [12, 24])
def test_spectral_power_of_a_piecewise_linear_wave_is_damped_by_the_fourth_power_of_sinc(n: int) -> None:
    """The Fourier coefficients of a linear interpolant are those of its samples times sinc(k / n)^2."""
    space = space_of(("piecewise linear", RING), n)
    found = of_function(SpectralPower("q", 3), space, wave)[0]
    np.testing.assert_allclose(found, HEIGHTS[:, 0] ** 2 / 4 * np.sinc(3 / n) ** 4, rtol=1e3 * EPS)


@pytest.mark.parametrize("pair", PAIRS)
def test_the_rule_for_formulas_is_exact_for_squares(pair: tuple[str, Domain]) -> None:
    """u^2 has degree 2 on elements, 2n - 2 on intervals and n on rings: the rule is exact for all of "
    "these."""
    space = space_of(pair, 17)
    u = random_elements(space, np.random.default_rng(3), 8)
    square = of_state(Norm("q"), space, u)[0] ** 2
    np.testing.assert_allclose(
        of_state(formula("u**2", in_space="integral"), space, u)[0], square, rtol=1e3 * EPS
    )
    mean = of_state(formula("u**2"), space, u)[0]
    np.testing.assert_allclose(mean * space.domain.length, square, rtol=1e3 * EPS)


@pytest.mark.parametrize("pair", PAIRS)
def test_a_formula_sees_the_field_its_place_and_the_time(pair: tuple[str, Domain]) -> None:
    space = space_of(pair, 17)
    still = Trajectory(lambda x, t: np.full((2, len(x)), 3.0), lambda x, t: np.zeros((2, len(x))))
    quantity = formula("u * x + 10 * t + (t > 0.6)", in_space="value", at=0.5, when=At(0.75))
    values, margin = follow(quantity, space, still, [0.0, 0.75, 1.0])
    np.testing.assert_allclose(values, np.full(2, 3 * 0.5 + 7.5 + 1), rtol=1e2 * EPS)
    assert margin is None


def test_numbers_beside_a_formula_differ_from_sample_to_sample() -> None:
    space = space_of(("fourier", RING), 8)
    term = FormulaTerm(Formula("c * u + d"), {"c": Formula("2 * d")})
    d = np.array([1.0, 2.0, 5.0])
    bound = FormulaQuantity("f", term, "maximum").bind("quantity.f", Binding({}, {"d": d}))
    u = np.ones((3, 8)) * np.array([[1.0], [-1.0], [0.0]])
    np.testing.assert_allclose(of_state(bound, space, u)[0], 2 * d * u[:, 0] + d, rtol=1e2 * EPS)


@pytest.mark.parametrize("pair", SMOOTH_PAIRS)
def test_the_maximum_of_a_monotone_formula_is_that_of_the_maximum(pair: tuple[str, Domain]) -> None:
    """Golden sections stop at 4e-9 of a cell; the height is wrong by the square of that."""
    space = space_of(pair, 40)
    u = random_elements(space, np.random.default_rng(5), 8)
    found = of_state(formula("exp(u)", in_space="maximum"), space, u)[0]
    np.testing.assert_allclose(found, np.exp(of_state(Maximum("q"), space, u)[0]), rtol=1e-12)


def test_the_maximum_of_a_formula_on_elements_is_the_vertex_of_a_parabola() -> None:
    """1.3 u - u^2 of the line u = x is a parabola with vertex 0.4225 at 0.65, off the nodes."""
    space = space_of(("piecewise linear", INTERVAL), 15)
    found = of_function(formula("1.3 * u - u**2", in_space="maximum"), space, lambda x: x[None, :])[0]
    np.testing.assert_allclose(found, [0.4225], rtol=1e2 * EPS)


@pytest.mark.parametrize("pair", PAIRS)
def test_a_function_gets_ascending_nodes_and_their_values(pair: tuple[str, Domain]) -> None:
    space = space_of(pair, 9)

    def both(u: FloatArray, x: FloatArray) -> FloatArray:
        assert np.all(np.diff(x) > 0)
        return (u - (1.0 + HEIGHTS * x)).max(axis=1)

    values, margin = of_function(FunctionQuantity("q", both), space, line)
    np.testing.assert_allclose(values, np.zeros(3), atol=1e3 * EPS)
    assert margin is None


def test_a_function_must_give_one_number_for_each_row() -> None:
    space = space_of(("fourier", RING), 8)
    with pytest.raises(InputError, match=r"quantity.q.function: an array of shape \(3, 8\); one number"):
        of_function(FunctionQuantity("q", lambda u, x: u), space, line)
