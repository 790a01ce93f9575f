"""Firing rates against scipy's distribution functions, and their largest slopes against differences."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from scipy.stats import logistic, norm, uniform

from aleafield.arrays import FloatArray
from aleafield.field.rates import (
    FormulaRate,
    LinearRate,
    LogisticRate,
    NormalOgiveRate,
    RampRate,
    Rate,
    StepRate,
)
from tests.manufactured.problems import term

GAIN: Any = np.array([2.0, 30.0, 0.1])
THRESHOLD: Any = np.array([0.3, -0.2, 1.5])
MAXIMUM: Any = np.array([1.0, 2.5, -3.0])
U = np.concatenate([np.linspace(-3.0, 3.0, 6001), [-1e3, 1e3]])

FORMS: dict[str, tuple[Rate, Callable[[FloatArray], FloatArray]]] = {
    "logistic": (LogisticRate(GAIN, THRESHOLD, MAXIMUM), logistic.cdf),
    "normal-ogive": (NormalOgiveRate(GAIN, THRESHOLD, MAXIMUM), norm.cdf),
    "ramp": (RampRate(GAIN, THRESHOLD, MAXIMUM), uniform.cdf),
}


@pytest.mark.parametrize("form", FORMS)
def test_a_bounded_rate_is_a_distribution_function(form: str) -> None:
    rate, distribution = FORMS[form]
    expected = MAXIMUM[:, None] * distribution(GAIN[:, None] * (U - THRESHOLD[:, None]))
    np.testing.assert_allclose(rate(np.tile(U, (3, 1))), expected, rtol=1e-13, atol=1e-300)
    assert rate.bounded
    assert rate.smoothness == ("kinked" if form == "ramp" else "smooth")


@pytest.mark.parametrize("form", FORMS)
def test_the_largest_slope(form: str) -> None:
    """Central differences of width 1e-3 about the steepest place: 1 + (30e-3)^2 / 12 at the gain of 30."""
    rate, _ = FORMS[form]
    steepest = THRESHOLD + (0.5 / GAIN if form == "ramp" else 0.0)
    ends = rate(steepest[:, None] + np.array([-5e-4, 5e-4]))
    differences = np.abs(ends[:, 1] - ends[:, 0]) / 1e-3
    np.testing.assert_allclose(rate.slope(), differences, rtol=1e-4)  # type: ignore[arg-type]
    everywhere = np.abs(np.diff(rate(np.tile(U[:-2], (3, 1))), axis=1)) / 1e-3
    assert np.all(everywhere <= rate.slope()[:, None] * (1 + 1e-9))  # type: ignore[index]


def test_defaults() -> None:
    u = U[None, :]
    np.testing.assert_array_equal(LogisticRate(3.0)(u), LogisticRate(3.0, 0.0, 1.0)(u))
    np.testing.assert_array_equal(LinearRate()(u), u)
    np.testing.assert_array_equal(StepRate()(u), u > 0)


def test_step_linear_and_formula() -> None:
    u = np.tile(U, (3, 1))
    step = StepRate(THRESHOLD, MAXIMUM)
    np.testing.assert_array_equal(step(u), np.where(THRESHOLD[:, None] < U, MAXIMUM[:, None], 0.0))
    assert not step(np.array([[0.3], [-0.2], [1.5]])).any(), "a field at its threshold is inactive"
    assert (step.slope(), step.smoothness) == (None, "step")
    linear = LinearRate(GAIN, THRESHOLD)
    np.testing.assert_allclose(linear(u), GAIN[:, None] * (U - THRESHOLD[:, None]), rtol=1e-14, atol=1e-13)
    np.testing.assert_array_equal(linear.slope(), GAIN)
    assert not linear.bounded
    formula = FormulaRate(term("u**2 / (1 + u**2)"))
    np.testing.assert_allclose(formula(u), u**2 / (1 + u**2), rtol=1e-14)
    assert (formula.smoothness, formula.slope()) == ("smooth", None)
    assert FormulaRate(term("maximum(u, 0)")).smoothness == "kinked"
