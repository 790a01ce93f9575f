"""Fields on [-1, 1] with known solutions: every projector, its order, and the size of its error.

Printed errors are those of independent computations with exact inner integrals (or the rule named), time
error negligible; they are met within 3 per cent unless a line says why not.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from tests.convergence.rates import observed_orders
from tests.manufactured.problems import (
    Problem,
    analytic,
    kinked_kernel,
    kinked_solution,
    legendre_modes,
    stepped_legendre_modes,
    twice_differentiable_solution,
)
from tests.manufactured.solving import dense_points, solve

ELEMENTS = (20, 40, 80, 160)
X = dense_points(-1.0, 1.0)


def sup_error(
    problem: Problem, projector: str, method: str, nodes: int, step: float, **rule: object
) -> float:
    """Largest error at the end of the run, at 4001 points."""
    solution = solve(problem.equation, projector, method, nodes, step, **rule)  # type: ignore[arg-type]
    return float(np.abs(solution.at(X) - problem.exact(X, problem.equation.dynamics.duration)).max())


@pytest.mark.parametrize(
    "problem", [analytic(), kinked_solution(), twice_differentiable_solution(), kinked_kernel()], ids=range(4)
)
def test_solution_and_drive_agree_with_independent_values(problem: Problem) -> None:
    """The records themselves: 12 printed digits, from adaptive quadrature and finite-difference residuals."""
    for x, t, value, drive in problem.table:
        assert problem.exact(np.array([x]), t)[0] == pytest.approx(value, rel=2e-12)
        found = problem.equation.drive.evaluate({"x": np.array([x]), "t": t}, axes=1)
        assert found[0] == pytest.approx(drive, rel=1e-11)
    start = problem.equation.initial.evaluate({"x": X}, axes=1)
    np.testing.assert_allclose(start, problem.exact(X, 0.0), rtol=0, atol=1e-14)


@pytest.mark.parametrize(
    ("make", "printed"),
    [
        (analytic, (4.54e-3, 1.16e-3, 2.94e-4, 7.36e-5)),
        (kinked_solution, (4.38e-3, 1.12e-3, 2.81e-4, 7.05e-5)),
        (twice_differentiable_solution, (9.63e-3, 2.46e-3, 6.19e-4, 1.55e-4)),
        (kinked_kernel, (3.44e-3, 8.70e-4, 2.18e-4, 5.45e-5)),
    ],
)
def test_piecewise_linear_collocation_with_nearly_exact_integrals(
    make: Callable[[], Problem], printed: tuple[float, ...]
) -> None:
    """Two Gauss points in each element (order 4) stand for the exact inner integral; 0 is always a node."""
    errors = [
        sup_error(make(), "piecewise linear", "collocation", n + 1, 0.05, quadrature="gauss-legendre")
        for n in ELEMENTS
    ]
    np.testing.assert_allclose(errors, printed, rtol=0.03)
    for order in observed_orders(errors, [1 / n for n in ELEMENTS]):
        assert 1.9 <= order <= 2.1


@pytest.mark.parametrize("method", ["collocation", "galerkin"])
@pytest.mark.parametrize("make", [analytic, kinked_kernel])
def test_piecewise_linear_matched_is_of_order_two(make: Callable[[], Problem], method: str) -> None:
    errors = [sup_error(make(), "piecewise linear", method, n + 1, 0.05) for n in ELEMENTS]
    for order in observed_orders(errors, [1 / n for n in ELEMENTS]):
        assert 1.9 <= order <= 2.1


def test_galerkin_with_the_trapezoid_rule_is_collocation() -> None:
    """Mass lumping: the two schemes are the same, to the bit."""
    problem = analytic()
    one = solve(problem.equation, "piecewise linear", "galerkin", 21, 0.1, quadrature="trapezoid")
    other = solve(problem.equation, "piecewise linear", "collocation", 21, 0.1)
    np.testing.assert_array_equal(one.u, other.u)


@pytest.mark.parametrize(
    ("projector", "method", "nodes"), [("chebyshev", "collocation", 15), ("legendre", "galerkin", 14)]
)
def test_spectral_projectors_solve_the_analytic_problem(projector: str, method: str, nodes: int) -> None:
    assert sup_error(analytic(), projector, method, nodes, 1 / 256) < 1e-10


def test_collocation_at_gauss_points() -> None:
    """Legendre Galerkin with its own rule everywhere; printed to two digits, hence 5 per cent."""
    errors = [sup_error(analytic(), "legendre", "galerkin", n, 1 / 512) for n in (4, 6, 8, 12)]
    np.testing.assert_allclose(errors, (1.7e-2, 1.6e-4, 7.9e-7, 5.0e-12), rtol=0.05)


@pytest.mark.parametrize(
    ("projector", "method", "nodes"), [("chebyshev", "collocation", 25), ("legendre", "galerkin", 24)]
)
def test_a_trapezoid_rule_sets_the_error_of_a_spectral_projector(
    projector: str, method: str, nodes: int
) -> None:
    """Printed: 2.08e-3, 5.21e-4, 1.30e-4, 3.26e-5 for 16, 32, 64, 128 panels, order 2.000."""
    panels = (16, 32, 64, 128)
    errors = [
        sup_error(analytic(), projector, method, nodes, 0.02, quadrature="trapezoid", quadrature_points=m + 1)
        for m in panels
    ]
    np.testing.assert_allclose(errors, (2.08e-3, 5.21e-4, 1.30e-4, 3.26e-5), rtol=0.01)
    for order in observed_orders(errors, [1 / m for m in panels]):
        assert 1.95 <= order <= 2.05


@pytest.mark.parametrize(
    ("make", "printed", "order"),
    [
        (kinked_solution, (0.174, 0.0877, 0.0441), 1.0),
        (twice_differentiable_solution, (6.8e-3, 8.2e-4, 1.0e-4), 3.0),
        (kinked_kernel, (6.7e-3, 1.5e-3, 3.8e-4), 2.0),
    ],
)
def test_kinks_make_spectral_orders_algebraic(
    make: Callable[[], Problem], printed: tuple[float, ...], order: float
) -> None:
    """Collocation at 8, 16, 32 Gauss points, which is what Legendre Galerkin with its own rule amounts to.

    Printed to two or three digits, hence 5 per cent.
    """
    sizes = (8, 16, 32)
    errors = [sup_error(make(), "legendre", "galerkin", n, 0.02) for n in sizes]
    np.testing.assert_allclose(errors, printed, rtol=0.05)
    assert observed_orders(errors, [1 / n for n in sizes])[-1] == pytest.approx(order, abs=0.15)


@pytest.mark.parametrize(
    ("projector", "method", "nodes"), [("legendre", "galerkin", 6), ("chebyshev", "collocation", 7)]
)
def test_legendre_modes_decay(projector: str, method: str, nodes: int) -> None:
    """A cubic under a kernel of Legendre modes is in the space: the growth factor of the step is left."""
    solution = solve(legendre_modes().equation, projector, method, nodes, 1 / 64)
    np.testing.assert_allclose(solution.at(X), stepped_legendre_modes(X, 128, 1 / 64), rtol=0, atol=1e-13)
    np.testing.assert_allclose(solution.at(X), legendre_modes().exact(X, 2.0), rtol=0, atol=2e-9)
    np.testing.assert_allclose(
        legendre_modes().exact(np.array([0.3, -1.0]), 2.0), [0.53297307489, 0.008423165174258], rtol=1e-11
    )
