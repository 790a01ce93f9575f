"""Points of the families, against their definitions; seeds are fixed."""

from __future__ import annotations

import pickle

import numpy as np
import pytest
from scipy import stats

from aleafield.randomness.design import Design, Method
from aleafield.randomness.families import Family, exchange_runs
from aleafield.randomness.inputs import Dependence, Input
from aleafield.randomness.laws import Uniform
from aleafield.randomness.streams import generator
from aleafield.randomness.trajectories import STEP
from tests.statistical.test_design import FALSE_ALARM, cube

METHODS: tuple[Method, ...] = ("monte carlo", "quasi-monte carlo")
FAMILIES: tuple[Family, ...] = ("main", "held out", "exchange", "screening")


def grouped(groups: list[list[int]], dimension: int = 4) -> Design:
    """A design of uniform inputs on (0, 1) of which some are exchanged together."""
    inputs = [Input(f"p{k}", Uniform(0, 1)) for k in range(dimension)]
    return Design(inputs, Dependence(), "quasi-monte carlo", 3, groups)


@pytest.mark.parametrize("method", METHODS)
def test_the_main_family_is_the_first_half_of_the_samples(method: Method) -> None:
    design = cube(method, 3)
    indices = np.arange(40, 80)
    np.testing.assert_array_equal(design.points("main", indices), design.unit_points(indices)[:, :4])
    values = design.values(indices)
    np.testing.assert_array_equal(np.column_stack(list(values.values())), design.points("main", indices))


@pytest.mark.parametrize("method", METHODS)
def test_exchange_of_two_inputs_by_hand(method: Method) -> None:
    """Row (a1, a2; b1, b2): B, then A with one coordinate of B, then B with one coordinate of A."""
    design = cube(method, 3, 2)
    for row, (a1, a2, b1, b2) in enumerate(design.unit_points(np.arange(20))):
        expected = [[b1, b2], [b1, a2], [a1, b2], [a1, b2], [b1, a2]]
        np.testing.assert_array_equal(design.points("exchange", 5 * row + np.arange(5)), expected)


def test_exchange_of_groups_by_hand() -> None:
    """Columns 0 and 2 together, 3 alone, 1 never by itself: B, AB_1, AB_2, BA_1, BA_2."""
    design = grouped([[0, 2], [3]])
    assert exchange_runs(len(design.groups)) == 5
    for row, point in enumerate(design.unit_points(np.arange(20))):
        a, b = point[:4], point[4:]
        expected = [
            b,
            [b[0], a[1], b[2], a[3]],
            [a[0], a[1], a[2], b[3]],
            [a[0], b[1], a[2], b[3]],
            [b[0], b[1], b[2], a[3]],
        ]
        np.testing.assert_array_equal(design.points("exchange", 5 * row + np.arange(5)), expected)


def test_groups_are_single_inputs_unless_said() -> None:
    assert cube("monte carlo", 1, 3).groups == ((0,), (1,), (2,))
    assert grouped([[0, 2], [3]]).groups == ((0, 2), (3,))


@pytest.mark.parametrize("method", METHODS)
def test_held_out_points_are_uniform_and_no_part_of_the_sample(method: Method) -> None:
    design = cube(method, 3)
    held_out = design.points("held out", np.arange(4096))
    samples = design.unit_points(np.arange(4096))
    assert not np.isin(held_out, samples).any()
    for column in held_out.T:
        assert stats.kstest(column, "uniform").pvalue > 1e-6
    # the largest of 4 x 8 + 6 correlations of columns
    correlation = np.corrcoef(held_out.T, samples.T)[:4] - np.eye(4, 12)
    assert np.abs(correlation).max() < 5.5 / np.sqrt(4096)


def test_held_out_points_are_plain_whatever_the_method() -> None:
    """Independent points: sums of N in one dimension have variance N / 12, not that of a net."""
    design = cube("quasi-monte carlo", 3, 1)
    means = design.points("held out", np.arange(64_000)).reshape(1000, 64).mean(axis=1)
    spread = np.mean((means - 0.5) ** 2) * 12 * 64
    assert spread == pytest.approx(1, rel=FALSE_ALARM * np.sqrt(2 / 1000))
    np.testing.assert_array_equal(
        design.points("held out", np.arange(99)), cube("monte carlo", 3, 1).points("held out", np.arange(99))
    )


def test_trajectories_change_each_coordinate_once() -> None:
    """Morris 1991: d + 1 points, one coordinate at a time, each once, by one step; all is inside."""
    d, count = 5, 400
    indices = np.arange(count * (d + 1))
    paths = cube("quasi-monte carlo", 3, d).points("screening", indices).reshape(count, d + 1, d)
    assert ((paths > 0) & (paths < 1)).all()
    steps = np.diff(paths, axis=1)
    moved = np.abs(steps) > 1e-12
    assert (moved.sum(axis=2) == 1).all(), "one coordinate at a time"
    assert (moved.sum(axis=1) == 1).all(), "each coordinate once"
    np.testing.assert_allclose(np.abs(steps[moved]), STEP, rtol=0, atol=1e-15)


def test_trajectories_are_drawn_evenly() -> None:
    """Directions and the place of each coordinate in the order: chi-square over 8,000 trajectories."""
    d, count = 4, 8000
    paths = cube("monte carlo", 5, d).points("screening", np.arange(count * (d + 1))).reshape(count, d + 1, d)
    steps = np.diff(paths, axis=1)
    for coordinate in range(d):
        place = np.bincount(np.abs(steps[:, :, coordinate]).argmax(axis=1), minlength=d)
        upward = int((steps[:, :, coordinate].sum(axis=1) > 0).sum())
        assert stats.chisquare(place).pvalue > 1e-6
        assert stats.chisquare([upward, count - upward]).pvalue > 1e-6
    first = np.abs(steps[:, 0]).argmax(axis=1)
    second = np.abs(steps[:, 1]).argmax(axis=1)
    _, of_pair = np.unique(np.column_stack([first, second]), axis=0, return_counts=True)
    assert len(of_pair) == 12
    assert stats.chisquare(of_pair).pvalue > 1e-6


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("family", FAMILIES)
class TestEveryFamily:
    def test_a_point_depends_on_its_index_alone(self, method: Method, family: Family) -> None:
        whole = cube(method, 3).points(family, np.arange(1024))
        design = cube(method, 3)
        shuffled = generator(1, "test").permutation(1024)
        np.testing.assert_array_equal(design.points(family, shuffled), whole[shuffled])
        for start, stop in ((1000, 1024), (0, 8), (8, 24), (511, 513)):
            np.testing.assert_array_equal(design.points(family, np.arange(start, stop)), whole[start:stop])
        scattered = np.array([1023, 0, 17, 17, 256])
        again = pickle.loads(pickle.dumps(design)).points(family, scattered)
        np.testing.assert_array_equal(again, whole[scattered])

    def test_the_seed_decides(self, method: Method, family: Family) -> None:
        indices = np.arange(200)
        first = cube(method, 7).points(family, indices)
        np.testing.assert_array_equal(first, cube(method, 7).points(family, indices))
        assert (first != cube(method, 8).points(family, indices)).any(axis=1).mean() > 0.9

    @pytest.mark.parametrize("dimension", [0, 1, 3])
    def test_shapes(self, method: Method, family: Family, dimension: int) -> None:
        design = cube(method, 2, dimension)
        points = design.points(family, np.arange(40))
        assert points.shape == (40, dimension)
        assert ((points > 0) & (points < 1)).all()
        assert design.points(family, np.arange(0)).shape == (0, dimension)

    @pytest.mark.parametrize("indices", [[-1], [[1, 2]]])
    def test_other_indices_are_refused(self, method: Method, family: Family, indices: list[int]) -> None:
        with pytest.raises(ValueError, match="not negative"):
            cube(method, 2).points(family, np.array(indices))
