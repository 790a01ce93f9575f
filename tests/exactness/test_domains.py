"""Intervals and rings: coordinates, distances, grids, counts of points.  Oracles: arithmetic by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest

from aleafield.errors import InputError
from aleafield.geometry import Interval, Refinement, Ring, interval_grid, ring_grid

RING = Ring(3.0)


def test_interval() -> None:
    interval = Interval(-1.5, 2.0)
    assert interval.length == 3.5
    assert not interval.periodic
    x, y = np.array([-1.0, 0.5]), np.array([2.0, 0.25])
    assert np.array_equal(interval.displacement(x, y), [-3.0, 0.25])
    assert np.array_equal(interval.distance(x, y), [3.0, 0.25])
    assert np.array_equal(interval.wrap(x), x)


def test_ring_takes_the_shorter_way_and_keeps_its_sign() -> None:
    assert (RING.low, RING.high, RING.periodic) == (-1.5, 1.5, True)
    x = np.array([1.25, -1.25, 1.0, 0.5])
    y = np.array([-1.25, 1.25, -0.5, 0.25])
    assert np.array_equal(RING.displacement(x, y), [-0.5, 0.5, -1.5, 0.25])
    assert np.array_equal(RING.distance(x, y), [0.5, 0.5, 1.5, 0.25])


def test_wrapped_coordinates_lie_in_the_half_open_ring() -> None:
    given = np.array([1.5, -1.5, 3.0, 4.75, -4.75, 0.7, -1.5 - 1e-17, np.nextafter(-1.5, -2.0)])
    wrapped = RING.wrap(given)
    assert np.all((wrapped >= RING.low) & (wrapped < RING.high))
    np.testing.assert_allclose(wrapped[:6], [-1.5, -1.5, 0.0, -1.25, 1.25, 0.7], rtol=0.0, atol=1e-15)
    assert wrapped[5] == given[5]
    awkward = Ring(2 * math.pi / 7)
    x = np.random.default_rng(3).uniform(-50.0, 50.0, 10_000)
    turned = awkward.wrap(x)
    assert np.all((turned >= awkward.low) & (turned < awkward.high))
    turns = (x - turned) / awkward.length
    np.testing.assert_allclose(turns, np.rint(turns), rtol=0.0, atol=1e-12)
    assert np.array_equal(awkward.wrap(turned), turned)


def test_a_coordinate_that_is_not_finite_stays_so_and_warns_of_nothing() -> None:
    assert np.isnan(RING.wrap(np.array([np.nan, np.inf]))).all()


@pytest.mark.parametrize("length", [3.0, 2 * math.pi, 0.1])
@pytest.mark.parametrize("n", [3, 7, 64])
def test_finer_grids_hold_the_coarser_to_the_bit(length: float, n: int) -> None:
    ring, interval = Ring(length), Interval(-0.3 * length, 0.7 * length)
    assert np.array_equal(ring_grid(ring, 2 * n)[::2], ring_grid(ring, n))
    assert np.array_equal(interval_grid(interval, 2 * n)[::2], interval_grid(interval, n))
    assert ring_grid(ring, n)[0] == 0.0
    assert interval_grid(interval, n)[[0, -1]].tolist() == [interval.low, interval.high]


@pytest.mark.parametrize(
    ("both_ends", "n", "finer", "coarser"),
    [(True, 257, 513, 129), (True, 33, 65, 17), (False, 32, 64, 16), (False, 33, 66, 16)],
)
def test_counts_of_the_levels(both_ends: bool, n: int, finer: int, coarser: int) -> None:
    counts = Refinement(both_ends, smallest=2, key="scheme.nodes")
    assert counts.refined(n) == finer
    assert counts.coarsened(n) == (coarser, None)
    assert counts.admissible(n) == (n, None)


def test_an_even_count_with_both_ends_becomes_odd_and_says_so() -> None:
    counts = Refinement(both_ends=True, smallest=2, key="scheme.nodes")
    used, note = counts.admissible(256)
    assert used == 257
    assert note == "scheme.nodes = 256 is even; a coarser level needs an odd number, 257 is used"
    assert counts.coarsened(256) == (129, note)


def test_an_odd_count_round_a_ring_becomes_even_where_gaps_must_be_unions() -> None:
    counts = Refinement(both_ends=False, smallest=3, key="scheme.nodes", unions=True)
    note = "scheme.nodes = 63 is odd; a coarser level needs an even number, 64 is used"
    assert counts.admissible(63) == (64, note)
    assert counts.coarsened(63) == (32, note)
    assert counts.admissible(64) == (64, None)


@pytest.mark.parametrize(("both_ends", "minimum"), [(True, 5), (False, 6)])
def test_the_smallest_count_leaves_a_coarser_level(both_ends: bool, minimum: int) -> None:
    counts = Refinement(both_ends, smallest=3, key="scheme.nodes")
    assert counts.minimum == minimum
    assert counts.coarsened(minimum)[0] == 3
    with pytest.raises(InputError, match=rf"scheme\.nodes: {minimum - 1}; at least {minimum} is needed"):
        counts.admissible(minimum - 1)
    with pytest.raises(InputError, match=r"scheme\.nodes: 2; at least 3 is needed"):
        counts.check(2)


@pytest.mark.parametrize(
    ("low", "high", "key"),
    [
        (1.0, 1.0, "domain.to"),
        (2.0, 1.0, "domain.to"),
        (math.nan, 1.0, "domain.from"),
        (0.0, math.inf, "domain.to"),
    ],
)
def test_impossible_intervals(low: float, high: float, key: str) -> None:
    with pytest.raises(InputError) as caught:
        Interval(low, high)
    assert caught.value.key == key


@pytest.mark.parametrize("length", [0.0, -1.0, math.nan, math.inf])
def test_impossible_rings(length: float) -> None:
    with pytest.raises(InputError, match="positive finite") as caught:
        Ring(length)
    assert caught.value.key == "domain.length"
