"""Fields on the ring with known solutions."""

from __future__ import annotations

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.projection.pairing import resolve
from aleafield.projection.scheme import Scheme
from tests.convergence.rates import observed_orders
from tests.manufactured.problems import (
    BUMP_AMPLITUDE,
    BUMP_HALF_WIDTH,
    CIRCLE,
    THREE_MODES_AT_2,
    bump_on_the_ring,
    exponential_wave,
    gaussian_wave,
    growth_factor,
    linear_modes,
    three_modes,
)
from tests.manufactured.solving import (
    Solution,
    dense_points,
    eight_shifts,
    root_mean_square,
    solve,
    solve_level,
)

X = dense_points(-np.pi, np.pi)[:-1]


def three_coefficients(solution: Solution) -> FloatArray:
    """Coefficients (3, 8) of 1, cos and sin, by the periodic trapezoid rule at many points."""
    values = solution.each(X)
    return np.array(
        [(values * wave).mean(axis=1) for wave in (np.ones(len(X)), 2 * np.cos(X), 2 * np.sin(X))]
    )


@pytest.mark.parametrize("method", ["collocation", "galerkin"])
def test_three_modes_meet_the_reduced_equations(method: str) -> None:
    """Within the step's error, 0.025**4 times a factor of order 1e-3, and the 256-point trapezoid rule's."""
    solution = solve(three_modes(), "fourier", method, 128, 0.025)
    np.testing.assert_allclose(three_coefficients(solution)[:, 0], THREE_MODES_AT_2, rtol=0, atol=2e-9)
    finer = solve(three_modes(), "fourier", method, 128, 0.0125)
    np.testing.assert_allclose(three_coefficients(finer)[:, 0], THREE_MODES_AT_2, rtol=0, atol=2e-9 / 14)


@pytest.mark.parametrize("method", ["collocation", "galerkin"])
def test_piecewise_linear_follows_the_three_modes_at_order_two(method: str) -> None:
    mean, cosine, sine = THREE_MODES_AT_2
    exact = mean + cosine * np.cos(X) + sine * np.sin(X)
    sizes = (32, 64, 128, 256)
    errors = [
        float(np.abs(solve(three_modes(), "piecewise linear", method, n, 0.05).at(X) - exact).max())
        for n in sizes
    ]
    for order in observed_orders(errors, [1 / n for n in sizes]):
        assert 1.9 <= order <= 2.1


def test_linear_modes_decay() -> None:
    """Closed factors 0.6376.., 0.3771.., 0.2544.. of modes 0, 1, 3 at t = 1.5."""
    solution = solve(linear_modes(), "fourier", "collocation", 64, 1 / 128)
    exact = 0.6376281516218 + 0.3771923535632 * np.cos(X) + 0.254424791856 * np.cos(3 * X)
    np.testing.assert_allclose(solution.at(X), exact, rtol=0, atol=1e-10)


def test_discrete_modes_decay_as_the_aliased_symbol_and_the_step_say() -> None:
    """Eight points replace w_k by g (r^k + r^(8-k)) / (1 - r^8), a step multiplies by its growth factor."""
    aliased = np.array([0.7054901960784, 0.356862745098, 0.1098039215686])
    steps, step = 30, 0.05
    solution = solve(linear_modes(), "fourier", "collocation", 8, step)
    factors = growth_factor(-(1 - aliased) * step) ** steps
    exact = factors[0] + factors[1] * np.cos(X) + factors[2] * np.cos(3 * X)
    np.testing.assert_allclose(solution.at(X), exact, rtol=0, atol=1e-12)


def test_exact_symbol_needs_no_smooth_kernel() -> None:
    """The same smooth wave under a smooth and a kinked kernel, matched: spectral either way.

    The wave's singularities in the complex plane leave about 0.38**n at n points.
    """
    for problem in (gaussian_wave(), exponential_wave()):
        errors = []
        for n in (24, 48, 96):
            solution = solve(problem.equation, "fourier", "collocation", n, 1 / 128)
            errors.append(float(np.abs(solution.at(X) - problem.exact(X, 1.0)).max()))
        assert errors[1] < errors[0] ** 1.7
        assert errors[2] < 2e-10


def test_sampling_a_kinked_kernel_is_of_order_two() -> None:
    problem = exponential_wave()
    sizes = (48, 96, 192)
    errors = []
    for n in sizes:
        solution = solve(problem.equation, "fourier", "collocation", n, 0.02, quadrature="trapezoid")
        errors.append(float(np.abs(solution.at(X) - problem.exact(X, 1.0)).max()))
    for order in observed_orders(errors, [1 / n for n in sizes]):
        assert 1.95 <= order <= 2.05


def bump_errors(projector: str, method: str, nodes: int, points: int) -> tuple[float, float, float]:
    """Root-mean-square errors over shifts of amplitude, half width and displacement after 6 time constants.

    By then the amplitude is that of the discrete bump up to exp(-0.928 * 6) = 0.4 per cent of its error.
    """
    equation = bump_on_the_ring(6.0)
    pairing = resolve(Scheme(projector, method, nodes), equation)  # type: ignore[arg-type]
    shifts = eight_shifts(CIRCLE.length / points)
    solution = solve_level(equation, pairing, Level(nodes, points), 0.25, (), shifts)
    mean, cosine, sine = three_coefficients(solution)
    np.testing.assert_allclose(mean, 0.0, atol=1e-12)
    amplitude = np.hypot(cosine, sine)
    return (
        root_mean_square(amplitude - BUMP_AMPLITUDE),
        root_mean_square(np.arccos(0.5 / amplitude) - BUMP_HALF_WIDTH),
        root_mean_square(np.arctan2(sine, cosine) - shifts["initial.shift"]),
    )


@pytest.mark.parametrize("method", ["collocation", "galerkin"])
@pytest.mark.parametrize("projector", ["fourier", "piecewise linear"])
def test_bump_under_a_step_rate(projector: str, method: str) -> None:
    """Amplitude, width and place converge at order 2; nodal sampling would hold the place to the points.

    The constant of the h^2 depends on where the crossings lie in their panels: eight shifts leave a factor
    of up to about 1.7, which three halvings reduce to 0.25 of an order.
    """
    counts = (40, 320)
    errors = np.array(
        [bump_errors(projector, method, 10 if projector == "fourier" else n, n) for n in counts]
    )
    for quantity in errors.T:
        for order in observed_orders(quantity.tolist(), [1 / n for n in counts]):
            assert 1.75 <= order <= 2.25
    assert errors[-1].max() < 1e-4
