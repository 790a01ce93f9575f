"""Active width and front position: closed forms, and scipy's brentq on the interpolant."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import brentq

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.geometry import Domain, Interval, Ring
from aleafield.quantities import ActiveWidth, FrontPosition, Maximum
from aleafield.spaces import Space
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

KAPPA = 2 * math.pi / RING.length


def roots_by_brentq(space: Space, row: FloatArray, level: float) -> list[tuple[float, bool]]:
    """Crossings and whether they rise, each bracketed on a dense grid that holds the search grid."""
    domain = space.domain
    grid = np.unique(np.concatenate((np.linspace(domain.low, domain.high, 6001), space.search_grid)))

    def excess(x: float) -> float:
        return float(space.evaluate_each(row[None, :], np.array([[x]]))[0, 0]) - level

    values = space.evaluate_each(row[None, :], grid[None, :])[0] - level
    return [
        (brentq(excess, grid[k], grid[k + 1], xtol=1e-14, rtol=8 * EPS), bool(values[k + 1] > 0))
        for k in np.flatnonzero((values[:-1] > 0) != (values[1:] > 0))
    ]


def expected_width(space: Space, row: FloatArray, level: float) -> float:
    """Falling less rising crossings, and the ends of the domain where they are active."""
    domain = space.domain
    ends = space.evaluate_each(row[None, :], np.array([[domain.low, domain.high]]))[0] > level
    total = domain.high * ends[1] - domain.low * ends[0]
    return total + sum(-x if rising else x for x, rising in roots_by_brentq(space, row, level))


@pytest.mark.parametrize("pair", PAIRS)
@pytest.mark.parametrize("level", [-0.3, 0.0, 0.4])
def test_widths_of_random_elements(pair: tuple[str, Domain], level: float) -> None:
    """Roots are as exact as the element: 1e-14 brentq, and some hundred roundings over the smallest slope."""
    space = space_of(pair, 24)
    u = random_elements(space, np.random.default_rng(17), 8)
    found, margin = of_state(ActiveWidth("q", level), space, u)
    assert margin is not None
    assert np.all(margin >= 0)
    expected = [expected_width(space, row, level) for row in u]
    np.testing.assert_allclose(found, expected, atol=1e-11)


@pytest.mark.parametrize("pair", [pair for pair in PAIRS if pair[1] is INTERVAL])
@pytest.mark.parametrize("side", ["right", "left"])
def test_fronts_of_random_elements(pair: tuple[str, Domain], side: str) -> None:
    space = space_of(pair, 24)
    u = random_elements(space, np.random.default_rng(19), 16)
    found, margin = of_state(FrontPosition("q", 0.2, side), space, u)  # type: ignore[arg-type]
    assert margin is not None
    end = INTERVAL.high if side == "right" else INTERVAL.low
    occurring = 0
    for row, position, occurs in zip(u, found, margin >= 0, strict=True):
        crossings = [x for x, rising in roots_by_brentq(space, row, 0.2) if rising == (side == "left")]
        active_end = space.evaluate_each(row[None, :], np.array([[end]]))[0, 0] > 0.2
        assert occurs == (bool(crossings) and not active_end)
        if occurs:
            assert position == pytest.approx(max(crossings) if side == "right" else min(crossings), abs=1e-11)
            occurring += 1
        else:
            assert math.isnan(position)
    assert 4 <= occurring < 16, "both cases must be among the samples"


@pytest.mark.parametrize(("projector", "n"), [("chebyshev", 120), ("legendre", 110)])
def test_the_width_of_a_gaussian_bump(projector: str, n: int) -> None:
    """2 s sqrt(2 ln(a / level)); coefficients of a Gaussian of width 0.4 on half-length 3.5 fall below
    exp(-n^2 (0.4 / 3.5)^2 / 2) = 1e-34."""
    space = space_of((projector, INTERVAL), n)
    s, level = 0.4, np.array([0.3, 0.5, 0.9, 1.2])
    height, centre = np.array([1.0, 2.0, 1.0, 1.5])[:, None], np.array([0.0, 1.0, -1.1, 0.7])[:, None]

    def bump(x: FloatArray) -> FloatArray:
        return height * np.exp(-((x - centre) ** 2) / (2 * s**2))

    half = s * np.sqrt(2 * np.log(height[:, 0] / level))
    np.testing.assert_allclose(of_function(ActiveWidth("q", level), space, bump)[0], 2 * half, rtol=1e-11)
    right = of_function(FrontPosition("q", level), space, bump)[0]
    np.testing.assert_allclose(right, centre[:, 0] + half, atol=1e-11)
    left = of_function(FrontPosition("q", level, "left"), space, bump)[0]
    np.testing.assert_allclose(left, centre[:, 0] - half, atol=1e-11)


@pytest.mark.parametrize("n", [8, 9])
def test_the_width_of_a_wave_wherever_it_stands_on_the_ring(n: int) -> None:
    """cos is above c on a share arccos(c) / pi of each period; shifts move the patch over the cut and the "
    "grid."""
    space = space_of(("fourier", RING), n)
    shift = np.linspace(-RING.length / 2, RING.length / 2, 57)[:, None]
    for level in (-0.999, -0.5, 0.0, 0.7, 0.999):
        for k in (1, 2):

            def wave(x: FloatArray, k: int = k) -> FloatArray:
                return np.cos(k * KAPPA * (x - shift))

            found = of_function(ActiveWidth("q", level), space, wave)[0]
            np.testing.assert_allclose(
                found, np.full(57, RING.length * math.acos(level) / math.pi), atol=1e-11
            )


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_a_patch_and_a_gap_between_two_points_of_the_search_grid_are_found(sign: float) -> None:
    """Of width 2 arccos(1 - 1e-6) / kappa = 0.003, where the search grid has spacing 0.22.

    The slope at the crossing is sqrt(2e-6) kappa, and the excess is exact to some roundings: 1e-12.
    """
    space = space_of(("fourier", RING), 8)
    shift = np.linspace(0.05, 0.17, 8)[:, None]
    grid = space.search_grid
    assert np.all(np.cos(KAPPA * (grid - shift)) < 1 - 1e-6), "no point of the grid lies in the patch"
    narrow = 2 * math.acos(1 - 1e-6) / KAPPA
    level = sign * (1 - 1e-6)
    found, margin = of_function(ActiveWidth("q", level), space, lambda x: sign * np.cos(KAPPA * (x - shift)))
    expected = narrow if sign > 0 else RING.length - narrow
    np.testing.assert_allclose(found, np.full(8, expected), atol=1e-11)
    assert margin is not None
    np.testing.assert_allclose(margin, np.full(8, 1e-6 if sign > 0 else 2 - 1e-6), atol=1e-14)


@pytest.mark.parametrize("mirrored", [False, True])
@pytest.mark.parametrize("projector", ["chebyshev", "legendre"])
def test_a_patch_between_an_end_and_its_neighbour_on_the_search_grid(projector: str, mirrored: bool) -> None:
    """1 - (z - p)^2 (z + 2) is above 1 - 1e-10 for z < -2 + 3e-12 and within sqrt(1e-10 / (p + 2)) of p.

    z = x or its mirror image, p = 4 - 1e-4 beside the end 4.  The slope at the ends of the patch is 5e-5 and
    values, up to 50, carry some ten roundings: 1e-8.
    """
    space = space_of((projector, INTERVAL), 12)
    p, sign = 4.0 - 1e-4, -1.0 if mirrored else 1.0

    def polynomial(x: FloatArray) -> FloatArray:
        z = 0.5 + sign * (x[None, :] - 0.5)
        return 1.0 - (z - p) ** 2 * (z + 2.0)

    width = of_function(ActiveWidth("q", 1.0 - 1e-10), space, polynomial)[0]
    np.testing.assert_allclose(width - 1.0, [2 * math.sqrt(1e-10 / (p + 2))], atol=1e-8)


@pytest.mark.parametrize("domain", [Interval(0.0, 5.0), Ring(5.0)])
def test_piecewise_linear_hats(domain: Domain) -> None:
    """A hat of height 2 over two elements of size 1: above c on a length 2 (1 - c / 2), and at nodes too."""
    space = space_of(("piecewise linear", domain), 6 if isinstance(domain, Interval) else 5)
    values = np.zeros(space.n)
    values[space.display_order[2]] = 2.0
    for level, width in ((0.0, 2.0), (0.5, 1.5), (1.0, 1.0), (1.9, 0.1), (-0.1, 5.0)):
        found, margin = of_state(ActiveWidth("q", level), space, values[None, :])
        np.testing.assert_allclose(found, [width], rtol=20 * EPS)
        np.testing.assert_allclose(margin, [2.0 - level], rtol=EPS)


def test_a_plateau_at_the_level_is_not_above_it() -> None:
    space = space_of(("piecewise linear", Interval(0.0, 5.0)), 6)
    steps = np.array([[1.0, 1.0, 0.0, 0.0, 1.0, 0.0], [0.0, 0.0, 1.0, 1.0, 1.0, 2.0]])
    width, margin = of_state(ActiveWidth("q", 1.0), space, steps)
    assert math.isnan(width[0])
    assert width[1] == pytest.approx(1.0, rel=4 * EPS)
    assert margin is not None
    assert margin[0] < 0 < margin[1]
    # the front stands where the level is first exceeded from the right, at a node that has it
    front, margin = of_state(FrontPosition("q", 0.0), space, steps[:1])
    assert front[0] == 5.0
    assert margin is not None
    assert margin[0] == 0.0


@pytest.mark.parametrize("pair", PAIRS)
def test_no_crossing(pair: tuple[str, Domain]) -> None:
    space = space_of(pair, 9)
    u = space.coefficients(np.full((3, 9), 0.5))
    level = np.array([0.75, 0.25, 0.5 + 1e-12])
    width, margin = of_state(ActiveWidth("q", level), space, u)
    assert margin is not None
    assert list(margin >= 0) == [False, True, False]
    assert np.isnan(width[[0, 2]]).all()
    assert width[1] == pytest.approx(space.domain.length, rel=4 * EPS)
    np.testing.assert_allclose(margin, 0.5 - level, atol=100 * EPS)


@pytest.mark.parametrize("pair", SMOOTH_PAIRS)
def test_the_width_is_positive_exactly_where_its_margin_is(pair: tuple[str, Domain]) -> None:
    """Levels around the maximum by a few roundings and more."""
    space = space_of(pair, 20)
    u = random_elements(space, np.random.default_rng(23), 8)
    top = of_state(Maximum("q"), space, u)[0]
    for shift in (0.0, 1e-15, 1e-13, 1e-9, 1e-5, 1e-2):
        for level in (top - shift, top + shift):
            width, margin = of_state(ActiveWidth("q", level), space, u)
            assert margin is not None
            np.testing.assert_array_equal(margin >= 0, top > level)
            np.testing.assert_array_equal(np.isfinite(width), top > level)
            assert np.all(width[top > level] >= 0)


@pytest.mark.parametrize("projector", ["chebyshev", "legendre", "piecewise linear"])
def test_a_front_that_has_left_does_not_occur(projector: str) -> None:
    """tanh fronts at 0 and, on the right of the interval, at 4.5."""
    space = space_of((projector, INTERVAL), 60)
    centre = np.array([[0.0], [4.5]])

    def front(x: FloatArray) -> FloatArray:
        return 0.5 - 0.5 * np.tanh(x - centre)

    position, margin = of_function(FrontPosition("q", 0.5), space, front)
    assert margin is not None
    assert abs(position[0]) < 1e-3
    assert math.isnan(position[1])
    np.testing.assert_allclose(
        margin,
        [min(0.5 * math.tanh(3.0), 0.5 * math.tanh(4.0)), -0.5 * math.tanh(0.5)],
        atol=1e-9,
    )


def test_a_front_on_a_ring_is_refused() -> None:
    with pytest.raises(InputError, match=r"quantity.q.measure: 'front position' on a ring; .*interval"):
        FrontPosition("q", 0.1).observer(space_of(("fourier", RING), 8), 1.0)
