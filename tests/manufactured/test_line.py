"""Step-rate fields of the infinite line, computed on an interval that is long enough."""

from __future__ import annotations

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from tests.convergence.rates import observed_orders
from tests.manufactured.problems import (
    FRONT_SPEED,
    LINE_BUMP_PEAK,
    LINE_BUMP_WIDTH,
    bump_on_the_line,
    moving_front,
)
from tests.manufactured.solving import eight_shifts, root_mean_square, solve


def edges(x: FloatArray, u: FloatArray, level: float) -> tuple[FloatArray, FloatArray]:
    """First and last crossing (8,) of a level by the linear interpolants of nodal values u (8, n)."""
    found = []
    for row in u:
        place = np.flatnonzero((row[:-1] > level) != (row[1:] > level))
        share = (level - row[place]) / (row[place + 1] - row[place])
        crossed = x[place] + share * (x[place + 1] - x[place])
        found.append((crossed[0], crossed[-1]))
    first, last = np.array(found).T
    return first, last


@pytest.mark.parametrize("method", ["collocation", "galerkin"])
def test_wide_bump_on_the_line(method: str) -> None:
    """Started at the bump; its width eigenvalue is -0.2164, most of the error has built up by t = 10.

    A drive wrong by d makes the width wrong by d / |w(width)| = 33 d.  On panels of size h the linear
    interpolation of the kernel errs by h^2/12 times the integral of w'', 0.51, and by at most h^2/8 in the
    panel of the kink, whose slope jumps by 1: 5.5 h^2 in the width.  That of the field, |u''/u'| = 1.8 at
    the edges, moves each by h^2/8 * 1.8: 0.5 h^2.  Under Galerkin the mean of the error over shifts nearly
    cancels, so that only this bound has a meaning there.
    """
    counts = (201, 401, 801)
    widths, peaks = [], []
    for n in counts:
        h = 30.0 / (n - 1)
        solution = solve(bump_on_the_line(10.0), "piecewise linear", method, n, 0.5, inputs=eight_shifts(h))
        x = solution.space.nodes
        left, right = edges(x, solution.each(x), 0.05)
        wrong = right - left - LINE_BUMP_WIDTH
        assert np.abs(wrong).max() < 6.0 * h**2
        widths.append(root_mean_square(wrong))
        peaks.append(root_mean_square(solution.each(x).max(axis=1) - LINE_BUMP_PEAK))
    if method == "collocation":
        for errors in (widths, peaks):
            for order in observed_orders(errors, [1 / (n - 1) for n in counts]):
                assert 1.8 <= order <= 2.2
    assert peaks[-1] < 1e-4


def test_exact_front_has_the_printed_values() -> None:
    problem = moving_front()
    x = np.array([0.2, 0.6, 1.5])
    np.testing.assert_allclose(
        problem.exact(x, 1.7), [0.4870484356995, 0.349602367951, 0.1424994343478], rtol=2e-12
    )


@pytest.mark.parametrize("method", ["collocation", "galerkin"])
def test_front_moves_at_its_speed(method: str) -> None:
    """No transient: the level set is at c t from the start, at order 2 in the mesh."""
    problem = moving_front()
    counts = (151, 301, 601)
    places, errors = [], []
    for n in counts:
        shifts = eight_shifts(30.0 / (n - 1))
        solution = solve(problem.equation, "piecewise linear", method, n, 0.05, inputs=shifts)
        x = solution.space.nodes
        _, front = edges(x, solution.each(x), 0.3)
        shift = shifts["initial.shift"]
        places.append(root_mean_square(front - shift - FRONT_SPEED * 1.7))
        right = np.linspace(0.5, 10.0, 500)
        exact = np.array([problem.exact(right - one, 1.7) for one in shift])
        errors.append(root_mean_square(solution.each(right) - exact))
    for quantity in (places, errors):
        for order in observed_orders(quantity, [1 / (n - 1) for n in counts]):
            assert 1.8 <= order <= 2.2
    assert places[-1] < 1e-3
    assert errors[-1] < 1e-4
