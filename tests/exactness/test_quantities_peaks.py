"""Maximum, minimum and peak position against closed forms."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from aleafield.arrays import FloatArray
from aleafield.field.formula_term import FormulaTerm
from aleafield.formula import Formula
from aleafield.geometry import Domain
from aleafield.quantities import FormulaQuantity, Maximum, Minimum, PeakPosition
from tests.exactness.trajectories import (
    EPS,
    INTERVAL,
    PAIRS,
    RING,
    SMOOTH_PAIRS,
    of_function,
    of_state,
    random_elements,
    space_of,
)

KAPPA = 2 * np.pi / RING.length
PLACES = np.array([-3.49, -3.5, 3.4, 0.0, 1.234, -2.2, 3.49, 0.02])[:, None]
"""On the ring, some beside the cut at 3.5."""


def ring_wave(x: FloatArray) -> FloatArray:
    """A wave with its only maximum, 1.5, at each of the places."""
    return 0.5 + np.cos(KAPPA * (x - PLACES))


def test_the_peak_of_a_wave_in_its_own_space() -> None:
    """The slope vanishes linearly there, so that the position is as exact as the slope."""
    space = space_of(("fourier", RING), 11)
    position = of_function(PeakPosition("q"), space, ring_wave)[0]
    np.testing.assert_allclose(
        RING.distance(position, PLACES[:, 0]), np.zeros(8), atol=100 * EPS * RING.length
    )
    assert np.all((RING.low <= position) & (position < RING.high))
    np.testing.assert_allclose(of_function(Maximum("q"), space, ring_wave)[0], np.full(8, 1.5), rtol=10 * EPS)
    np.testing.assert_allclose(
        of_function(Minimum("q"), space, ring_wave)[0], np.full(8, -0.5), rtol=20 * EPS
    )


@pytest.mark.parametrize("projector", ["fourier", "piecewise linear"])
@pytest.mark.parametrize("reference", [-3.0, 3.3, 20.0])
def test_positions_on_a_ring_are_unwrapped_about_the_reference(projector: str, reference: float) -> None:
    space = space_of((projector, RING), 16)
    raw = of_function(PeakPosition("q"), space, ring_wave)[0]
    about = of_function(PeakPosition("q", reference), space, ring_wave)[0]
    assert np.all(np.abs(about - reference) <= RING.length / 2 * (1 + 4 * EPS))
    turns = (about - raw) / RING.length
    np.testing.assert_allclose(turns, np.rint(turns), atol=20 * EPS)


@pytest.mark.parametrize("projector", ["chebyshev", "legendre", "piecewise linear"])
@pytest.mark.parametrize("vertex", [0.123, -2.95, -2.7, 3.8, 3.99, 1.0])
def test_the_vertex_of_a_parabola(projector: str, vertex: float) -> None:
    """Every rule is exact for it, also within half a cell of the ends."""
    space = space_of((projector, INTERVAL), 15)
    heights = np.array([[2.0], [3.0]])

    def parabola(x: FloatArray) -> FloatArray:
        return heights - heights * (x - vertex) ** 2

    rounding = 1e4 * EPS
    np.testing.assert_allclose(
        of_function(PeakPosition("q"), space, parabola)[0], [vertex] * 2, atol=rounding
    )
    np.testing.assert_allclose(of_function(Maximum("q"), space, parabola)[0], heights[:, 0], rtol=rounding)
    np.testing.assert_allclose(
        of_function(Minimum("q"), space, lambda x: -parabola(x))[0], -heights[:, 0], rtol=rounding
    )


@pytest.mark.parametrize("pair", [pair for pair in PAIRS if pair[1] is INTERVAL])
@pytest.mark.parametrize("vertex", [-5.0, 6.0])
def test_a_maximum_at_an_end(pair: tuple[str, Domain], vertex: float) -> None:
    """A parabola with its vertex outside is largest at the nearer end; the end itself is reported."""
    space = space_of(pair, 9)
    end = INTERVAL.low if vertex < 0 else INTERVAL.high

    def parabola(x: FloatArray) -> FloatArray:
        return -((x[None, :] - vertex) ** 2)

    position = of_function(PeakPosition("q"), space, parabola)[0]
    assert position[0] == end
    np.testing.assert_allclose(
        of_function(Maximum("q"), space, parabola)[0], [-((end - vertex) ** 2)], rtol=1e3 * EPS
    )


def test_the_parabola_goes_round_the_ring() -> None:
    """Three nodal values of -(distance to a point beside the cut)^2 are those of a parabola."""
    space = space_of(("piecewise linear", RING), 14)

    def bump(x: FloatArray) -> FloatArray:
        return 1.0 - RING.distance(x[None, :], PLACES) ** 2

    position = of_function(PeakPosition("q"), space, bump)[0]
    np.testing.assert_allclose(RING.distance(position, PLACES[:, 0]), np.zeros(8), atol=1e3 * EPS)
    np.testing.assert_allclose(of_function(Maximum("q"), space, bump)[0], np.ones(8), rtol=1e3 * EPS)


def test_a_flat_field_has_its_own_value_as_maximum() -> None:
    for pair in PAIRS:
        space = space_of(pair, 9)
        np.testing.assert_allclose(
            of_function(Maximum("q"), space, lambda x: np.full((2, len(x)), 0.3))[0],
            [0.3, 0.3],
            rtol=100 * EPS,
        )


@pytest.mark.parametrize("pair", SMOOTH_PAIRS)
def test_the_maximum_of_random_elements_against_bounded_minimisation(pair: tuple[str, Domain]) -> None:
    """scipy's bounded minimiser between the points of a dense grid beside its largest value."""
    space = space_of(pair, 24)
    u = random_elements(space, np.random.default_rng(11), 8)
    found = of_state(Maximum("q"), space, u)[0]
    position = of_state(PeakPosition("q"), space, u)[0]
    grid = np.linspace(space.domain.low, space.domain.high, 4001)
    values = space.evaluate_each(u, np.tile(grid, (8, 1)))
    for row in range(8):
        best = int(values[row].argmax())
        low, high = grid[max(best - 1, 0)], grid[min(best + 1, 4000)]
        reference = minimize_scalar(
            lambda x, row=row: -space.evaluate_each(u[row : row + 1], np.array([[x]]))[0, 0],
            bounds=(low, high),
            method="bounded",
            options={"xatol": 1e-9},
        )
        highest = max(-reference.fun, values[row, best])
        assert found[row] == pytest.approx(highest, rel=1e-13, abs=1e-13)
        at = space.evaluate_each(u[row : row + 1], position[row : row + 1, None])[0, 0]
        assert at == pytest.approx(found[row], rel=1e-13, abs=1e-13)


def test_of_nearly_equal_peaks_the_highest_one_is_found_off_the_grid() -> None:
    """cos(3 z) + d cos(z), z = kappa (x - s), has its maximum 1 + d at z = 0 and lower ones near -+2 pi / 3.

    A third of the ring is no multiple of the grid's spacing: each peak is missed by another way, by up to
    (3 pi / 32)^2 / 2 = 0.04 in height; the largest grid value must not decide.
    """
    space = space_of(("fourier", RING), 8)
    shifts = np.linspace(0.0, RING.length / 32, 33)[:, None]
    d = 1e-6

    def triple(x: FloatArray) -> FloatArray:
        z = KAPPA * (x - shifts)
        return np.cos(3 * z) + d * np.cos(z)

    on_grid = space.search_grid[triple(space.search_grid).argmax(axis=1)]
    assert np.any(RING.distance(on_grid, shifts[:, 0]) > RING.length / 4), "the grid alone is misled"
    position = of_function(PeakPosition("q"), space, triple)[0]
    np.testing.assert_allclose(RING.distance(position, shifts[:, 0]), np.zeros(33), atol=1e3 * EPS)
    np.testing.assert_allclose(of_function(Maximum("q"), space, triple)[0], np.full(33, 1 + d), rtol=20 * EPS)


def plateau(x: FloatArray) -> FloatArray:
    """0.5 on intervals about 0 that end at eight places between the nodes, else 0: a jump at either end."""
    return 0.5 * (np.abs(x) < np.linspace(1.9, 2.4, 8)[:, None])


def clipped(x: FloatArray) -> FloatArray:
    """Parabolas cut off at eight heights: kinks between the nodes, with at least three on the plateau."""
    return np.minimum(1.0 - 0.3 * x**2, np.linspace(0.15, 0.8, 8)[:, None])


@pytest.mark.parametrize("domain", [INTERVAL, RING])
@pytest.mark.parametrize("n", [15, 16, 57, 200])
@pytest.mark.parametrize("shape", [plateau, clipped])
def test_no_parabola_overshoots_at_a_jump_or_at_the_edge_of_a_plateau(
    domain: Domain, n: int, shape: Callable[[FloatArray], FloatArray]
) -> None:
    """The interpolant's own maximum is the plateau, which a parabola over a jump d would exceed by d / 8."""
    space = space_of(("piecewise linear", domain), n)
    nodal = shape(space.nodes)
    assert np.all(np.isin(shape(np.zeros(1)), nodal)), "a node lies on every plateau"
    np.testing.assert_array_equal(of_function(Maximum("q"), space, shape)[0], nodal.max(axis=1))
    lowest = of_function(Minimum("q"), space, lambda x: -shape(x))[0]
    np.testing.assert_array_equal(lowest, -nodal.max(axis=1))


def test_a_kink_at_the_peak_is_not_rounded() -> None:
    """A tent's triple has all the bend, its neighbours none: the highest node stands for it."""
    space = space_of(("piecewise linear", INTERVAL), 50)

    def tent(x: FloatArray) -> FloatArray:
        return -np.abs(x - PLACES[3:6])

    np.testing.assert_array_equal(of_function(Maximum("q"), space, tent)[0], tent(space.nodes).max(axis=1))


@pytest.mark.parametrize("n", [3, 4])
def test_a_triple_without_a_neighbour_is_not_confirmed(n: int) -> None:
    """Three nodes have one triple and the node stands for it; four have two, and a parabola is exact."""
    space = space_of(("piecewise linear", INTERVAL), n)

    def parabola(x: FloatArray) -> FloatArray:
        return 1.0 - np.square(x - 0.7)[None, :]

    expected = parabola(space.nodes).max() if n == 3 else 1.0
    np.testing.assert_allclose(of_function(Maximum("q"), space, parabola)[0], [expected], rtol=100 * EPS)


@pytest.mark.parametrize("text", ["minimum(u, 0.2)", "(u > 0.3)", "where(u > 0.3, 1, u)", "u * (x < 0.511)"])
def test_the_maximum_of_a_formula_with_a_kink_is_a_value_of_it(text: str) -> None:
    """A parabola through kinked values would give 0.2209 for the first and 1.125 for the second."""
    quantity = FormulaQuantity("q", FormulaTerm(Formula(text)), "maximum")
    for domain in (INTERVAL, RING):
        space = space_of(("piecewise linear", domain), 64)
        u = np.exp(-((space.nodes - np.linspace(-1.0, 1.0, 16)[:, None]) ** 2))
        nodal = quantity.term.evaluate({"u": u, "x": space.nodes}, axes=1)
        np.testing.assert_array_equal(of_state(quantity, space, u)[0], nodal.max(axis=1))
