"""Pseudo-spectral projection: nodes against numpy and scipy, coefficients against polynomials and closed forms."""

from __future__ import annotations

from math import comb

import numpy as np
import pytest
from scipy import special

from aleafield.chaos.projection import GridName, nodes, project
from aleafield.errors import InputError
from aleafield.randomness.laws import Beta, Discrete, Exponential, Law, Normal, Triangular, Uniform
from tests.sensitivity.known_functions import FRONT

UNIT = Uniform(0.0, 1.0)


def test_nodes_from_chaospy_are_gauss_nodes() -> None:
    """Of degree 6: Legendre and Hermite by numpy, Jacobi and Laguerre by scipy."""
    cases: list[tuple[Law, np.ndarray, np.ndarray]] = []
    x, w = np.polynomial.legendre.leggauss(6)
    cases.append((UNIT, 0.5 * (x + 1), w / 2))
    z, w = np.polynomial.hermite_e.hermegauss(6)
    cases.append((Normal(1.0, 2.0), 1 + 2 * z, w / w.sum()))
    x, w = special.roots_jacobi(6, 4.0, 1.0)
    cases.append((Beta(2.0, 5.0, -1.0, 1.0), x, w / w.sum()))
    x, w = special.roots_laguerre(6)
    cases.append((Exponential(3.0), 3 * x, w))
    for law, places, weights in cases:
        grid = nodes([law], 5)
        order = np.argsort(grid.points[:, 0])
        np.testing.assert_allclose(law.ppf(grid.points[order, 0]), places, rtol=1e-7, atol=1e-9)
        np.testing.assert_allclose(grid.weights[order], weights, rtol=1e-9)


@pytest.mark.parametrize("grid", ["tensor", "sparse"])
def test_polynomials_are_projected_exactly(grid: GridName) -> None:
    """Level 3 resolves total degree 3."""
    laws: list[Law] = [UNIT, Normal(0.0, 1.0), Triangular(0.0, 0.5, 1.0)]
    made = nodes(laws, 3, grid)
    assert made.weights.sum() == pytest.approx(1.0, abs=1e-12)
    a, b, c = (law.ppf(made.points[:, i]) for i, law in enumerate(laws))
    found = project(made, np.column_stack((a * b * c, b**3 - a**2, np.full(len(a), 2.0))))
    far = np.random.default_rng(1).random((200, 3))
    a, b, c = (law.ppf(far[:, i]) for i, law in enumerate(laws))
    exact = np.column_stack((a * b * c, b**3 - a**2, np.full(200, 2.0)))
    np.testing.assert_allclose(found.evaluate(far), exact, atol=1e-9)
    assert found.loo[2] == pytest.approx(0.0, abs=1e-20)


@pytest.mark.parametrize(
    ("grid", "level", "mean", "sd"), [("tensor", 3, 1e-6, 1e-5), ("sparse", 4, 1e-6, 5e-5)]
)
def test_front_speed(grid: GridName, level: int, mean: float, sd: float) -> None:
    """Closed form.  In the units of the speed trials with another program's nodes had 2e-7 and 3e-6 of mean and sd
    on the tensor grid of 64 runs, 3e-7 and 1e-5 on a sparse one of 83."""
    made = nodes([UNIT] * 3, level, grid)
    found = project(made, FRONT.evaluate(made.points)[:, None])
    assert abs(found.mean[0] - 0.07428809578584) < mean
    assert abs(np.sqrt(found.variance[0]) - np.sqrt(FRONT.variance)) < sd
    np.testing.assert_allclose(found.first()[:, 0], FRONT.first, atol=1e-3)
    assert found.residuals is None


def test_a_sparse_grid_combines_coefficients_not_weights() -> None:
    """x^4 y^4 at level 2: internal aliasing of combined weights would give x y-like terms that are not there."""
    made = nodes([UNIT] * 2, 2, "sparse")
    found = project(made, (made.points[:, 0] ** 4 + made.points[:, 1] ** 4)[:, None])
    mixed = (found.basis.indices > 0).all(axis=1)
    assert np.abs(found.coefficients[mixed]).max() < 1e-12
    assert len(found.basis) == comb(4, 2)


def test_too_many_inputs_and_laws_without_a_density() -> None:
    with pytest.raises(InputError, match="tensor grid in 4 inputs"):
        nodes([UNIT] * 4, 1)
    with pytest.raises(InputError, match="sparse grid in 5 inputs"):
        nodes([UNIT] * 5, 1, "sparse")
    with pytest.raises(InputError, match="between the possible values"):
        nodes([Discrete([1.0, 2.0], [1.0, 1.0])], 1)


def test_one_failed_run_spoils_a_grid() -> None:
    made = nodes([UNIT], 2)
    with pytest.raises(ValueError, match="gave no value"):
        project(made, np.array([[1.0], [np.nan], [2.0]]))


def test_correlated_inputs_are_projected_in_their_scores() -> None:
    made = nodes([UNIT, UNIT], 2, groups=((0, 1),))
    assert [germ.name for germ in made.germs] == ["hermite", "hermite"]
    found = project(made, made.points[:, :1])
    with pytest.raises(ValueError, match="depend on one another"):
        found.first()
