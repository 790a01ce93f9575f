"""Least squares against brute force."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.chaos.basis import Basis
from aleafield.chaos.germs import choose_germs
from aleafield.chaos.multi_index import total_degree
from aleafield.chaos.pursuit import FOLDS, pursue
from aleafield.chaos.regression import fit
from aleafield.randomness.laws import Normal, Uniform

RNG = np.random.default_rng(4)


def values(rows: int, p: int) -> FloatArray:
    """Basis of two inputs at random points."""
    return Basis(choose_germs([Uniform(0, 1), Normal(0, 1)]), total_degree(2, p)).evaluate(
        RNG.random((rows, 2))
    )


def test_leave_one_out_is_what_leaving_one_out_gives() -> None:
    basis, y = values(40, 3), RNG.normal(size=(40, 3))
    found = fit(basis, y)
    for row in range(40):
        others = np.arange(40) != row
        without = np.linalg.lstsq(basis[others], y[others], rcond=None)[0]
        np.testing.assert_allclose(found.residuals[row], y[row] - basis[row] @ without, rtol=1e-9)


def test_coefficients_leverage_condition_and_influence() -> None:
    basis, y = values(50, 3), RNG.normal(size=(50, 4))
    found = fit(basis, y)
    np.testing.assert_allclose(found.coefficients, np.linalg.lstsq(basis, y, rcond=None)[0], rtol=1e-10)
    np.testing.assert_allclose(found.leverage, np.diag(basis @ np.linalg.pinv(basis)), rtol=1e-10)
    np.testing.assert_allclose(found.condition, np.linalg.cond(basis), rtol=1e-9)
    np.testing.assert_allclose(found.influence(), np.linalg.pinv(basis).T, rtol=1e-9, atol=1e-12)


def test_a_large_offset_costs_no_digits() -> None:
    """Residuals of 1e9 + f are those of f to the rounding of the sum, 2^-53 1e9 = 1e-7, times the condition."""
    basis = values(60, 2)
    f = RNG.normal(size=(60, 1))
    plain, shifted = fit(basis, f), fit(basis, 1e9 + f)
    assert np.abs(shifted.residuals - plain.residuals).max() < 4e-7
    assert abs(shifted.coefficients[0, 0] - 1e9 - plain.coefficients[0, 0]) < 4e-7


def test_dependent_columns_have_no_fit() -> None:
    basis = values(30, 1)
    found = fit(np.column_stack((basis, basis[:, 1])), RNG.normal(size=(30, 1)))
    assert found.condition == np.inf
    assert np.isinf(found.residuals).all()


def test_pursuit_finds_the_terms_that_are_there() -> None:
    """Three of 286 terms, without noise: exactly these, and nothing is left."""
    basis = Basis(choose_germs([Uniform(0, 1)] * 10), total_degree(10, 3)).evaluate(RNG.random((80, 10)))
    truth = {0: 2.0, 7: -1.0, 120: 0.5, 280: 0.3}
    y = sum(c * basis[:, term] for term, c in truth.items())
    folds = np.arange(80) % FOLDS
    selection = pursue(basis, np.asarray(y)[:, None], folds, 40)
    assert set(truth) <= set(selection.terms.tolist())
    assert np.abs(selection.residuals(basis, np.asarray(y)[:, None], folds)).max() < 1e-10


def test_pursuit_repeats_the_selection_without_each_fold() -> None:
    """On pure noise the reported error is no smaller than the variance, whatever a fit to the rows can reach."""
    basis = Basis(choose_germs([Uniform(0, 1)] * 10), total_degree(10, 2)).evaluate(RNG.random((100, 10)))
    noise = RNG.normal(size=(100, 1))
    folds = np.arange(100) % FOLDS
    left = pursue(basis, noise, folds, 50).residuals(basis, noise, folds)
    assert (left**2).mean() > 0.9 * noise.var()
