"""Noise paths: their addresses in the Philox counter, their law, and what they do not depend on."""

from __future__ import annotations

import hashlib
from collections.abc import Callable

import numpy as np
import pytest
from scipy.stats import chi2, kstest, norm

from aleafield.arrays import FloatArray, IntArray
from aleafield.randomness.wiener import PathUniforms, WienerPaths

SEED = 20261201
FALSE_ALARM = 1e-3
"""Of each statistical check here, shared by all comparisons in it; the seeds are fixed."""
STRETCH = 32
"""Numbers of a mode in one stream."""


def realizations(samples: int, repeats: int = 1) -> tuple[IntArray, IntArray]:
    """Parameter sample and repeat of all realizations of the first samples."""
    numbers = np.arange(samples * repeats)
    return numbers // repeats, numbers % repeats


def whole(
    samples: IntArray, repeats: IntArray, modes: int, lengths: FloatArray, depth: int, seed: int = SEED
) -> FloatArray:
    """All increments, (K, 2^depth, S, m)."""
    paths = WienerPaths(seed, samples, repeats, modes, lengths, depth)
    return np.stack([paths.base_step(k) for k in range(len(lengths))])


def address(seed: int, purpose: str, lane: int, block: int, repeat: int, sample: int) -> np.random.Generator:
    """numpy's generator at the place that the documentation of the counter promises."""
    digest = hashlib.blake2b(f"{seed}\x1f{purpose}".encode(), digest_size=16).digest()
    counter = sum(word << 64 * i for i, word in enumerate((0, lane << 48 | block, repeat, sample)))
    return np.random.Generator(np.random.Philox(key=int.from_bytes(digest, "little"), counter=counter))


def largest_correlation(rows: FloatArray) -> float:
    """Largest correlation of two of V rows of N standard normal numbers, over what chance allows.

    sqrt(N) times the inner product over N is standard normal for large N; V (V - 1) / 2 of them.
    """
    count, numbers = rows.shape
    products = (rows @ rows.T / np.sqrt(numbers))[np.triu_indices(count, 1)]
    return float(np.abs(products).max() / norm.isf(FALSE_ALARM / 2 / len(products)))


def sizes(normal: FloatArray) -> FloatArray:
    """Standard normal numbers that tell the size only: they see dependence that signs hide."""
    return np.asarray(-norm.ppf(2 * norm.sf(np.abs(normal))))


def test_the_generator_is_the_published_one() -> None:
    """Philox4x64-10, key 0, counter 0: known answer of Salmon et al. 2011 (from memory).

    numpy increments the counter before it draws, hence the start at the last one.
    """
    words = np.random.Philox(key=0, counter=2**256 - 1).random_raw(4)
    expected = [0x16554D9ECA36314C, 0xDB20FE9D672D0FDC, 0xD7E772CEE186176B, 0x7E68B68AEC7BA23B]
    assert [int(word) for word in words] == expected


@pytest.mark.parametrize(("sample", "repeat"), [(0, 0), (7, 0), (7, 3), (2**40, 2**33)])
def test_numbers_stand_where_the_counter_says(sample: int, repeat: int) -> None:
    """Base increments and two generations of halvings, rebuilt from generators made for one address each."""
    modes, lengths = 5, np.full(70, 0.25)
    found = whole(np.array([3, sample]), np.array([1, repeat]), modes, lengths, 2)[:, :, 1]
    for k in (0, 31, 32, 63, 64, 69):
        normals = []
        for generation in range(3):
            per_step = max(1, 2 ** (generation - 1))
            steps = STRETCH // per_step
            block = k // steps
            count = min(steps, 70 - block * steps) * per_step
            source = address(SEED, "wiener paths", generation, block, repeat, sample)
            drawn = source.standard_normal((modes, count))
            first = (k - block * steps) * per_step
            normals.append(drawn[:, first : first + per_step])
        base, halves, quarters = (
            0.5 * normals[0][:, 0],
            0.25 * normals[1][:, 0],
            np.sqrt(0.125) / 2 * normals[2],
        )
        left, right = base / 2 + halves, base / 2 - halves
        expected = [
            left / 2 + quarters[:, 0],
            left / 2 - quarters[:, 0],
            right / 2 + quarters[:, 1],
            right / 2 - quarters[:, 1],
        ]
        np.testing.assert_allclose(found[k], expected, rtol=0, atol=1e-15)


def test_any_order_of_steps() -> None:
    samples, repeats = realizations(3, 2)
    lengths = np.linspace(0.1, 0.3, 75)
    expected = whole(samples, repeats, 5, lengths, 3)
    paths = WienerPaths(SEED, samples, repeats, 5, lengths, 3)
    for k in np.random.default_rng(1).permutation(75)[:40]:
        np.testing.assert_array_equal(paths.base_step(int(k)), expected[k])
    for k in (74, 0, 74, 33):
        np.testing.assert_array_equal(
            WienerPaths(SEED, samples, repeats, 5, lengths, 3).base_step(k), expected[k]
        )


def test_an_increment_is_left_to_the_caller() -> None:
    """Writing into what was handed out changes nothing that is handed out later."""
    paths = WienerPaths(SEED, *realizations(2), 3, np.ones(4), 0)
    first = paths.base_step(1).copy()
    paths.base_step(1)[:] = np.nan
    np.testing.assert_array_equal(paths.base_step(1), first)


def test_a_path_does_not_depend_on_its_batch() -> None:
    """Reversed, some of them, one alone, some of them twice: equal to the bit."""
    samples, repeats = realizations(9, 2)
    lengths = np.full(40, 0.5)
    expected = whole(samples, repeats, 7, lengths, 2)
    for rows in ([*range(17, -1, -1)], [5], [0, 3, 4, 11], [2, 2, 17, 2]):
        np.testing.assert_array_equal(
            whole(samples[rows], repeats[rows], 7, lengths, 2), expected[:, :, rows], strict=True
        )


@pytest.mark.parametrize("depth", [0, 1, 2, 4])
def test_the_first_modes_do_not_depend_on_the_number_of_modes(depth: int) -> None:
    lengths = np.full(37, 0.5)
    more = whole(*realizations(4), 33, lengths, depth)
    for modes in (1, 3, 16):
        np.testing.assert_array_equal(whole(*realizations(4), modes, lengths, depth), more[..., :modes])


def test_long_increments_are_the_sums_of_short_ones() -> None:
    lengths = np.linspace(0.2, 2.0, 70)
    finest = whole(*realizations(3), 5, lengths, 8)
    largest = np.abs(finest).max()
    for depth in range(8):
        summed = finest.reshape(70, 2**depth, -1, 3, 5).sum(axis=2)
        np.testing.assert_allclose(
            whole(*realizations(3), 5, lengths, depth), summed, rtol=0, atol=2**8 * 1e-16 * largest
        )


@pytest.fixture(scope="module")
def standardised() -> FloatArray:
    """Increments over their standard deviations, (steps and places, S, m) = (96 x 4, 6 x 2, 5)."""
    lengths = np.linspace(0.05, 4.0, 96)
    scale = np.sqrt(lengths / 4)[:, None, None, None]
    return (whole(*realizations(6, 2), 5, lengths, 2) / scale).reshape(-1, 12, 5)


def test_increments_are_normal(standardised: FloatArray) -> None:
    assert kstest(standardised.ravel(), "norm").pvalue > FALSE_ALARM
    for mode in range(5):
        assert kstest(standardised[..., mode].ravel(), "norm").pvalue > FALSE_ALARM / 5
    tails = np.abs(standardised.ravel())
    # a ziggurat of 256 layers has its tail beyond 3.654 (Marsaglia and Tsang 2000)
    for level in (2.0, 3.0, 3.7):
        expected = 2 * norm.sf(level) * tails.size
        assert abs((tails > level).sum() - expected) < norm.isf(FALSE_ALARM / 6) * np.sqrt(expected) + 1


def test_variances_are_lengths_of_sub_steps(standardised: FloatArray) -> None:
    """Sums of N squares: chi-square bounds for each mode, each realization, each place in a base step."""
    by_place = standardised.reshape(96, 4, 12, 5)
    for axes in ((0, 1, 2), (0, 1, 3), (0, 2, 3)):
        sums = (by_place**2).sum(axis=axes)
        count = by_place.size // len(sums)
        tail = FALSE_ALARM / 2 / len(sums)
        assert ((chi2.ppf(tail, count) < sums) & (sums < chi2.isf(tail, count))).all()


@pytest.mark.parametrize("view", [np.asarray, sizes], ids=["numbers", "sizes"])
def test_everything_is_independent(
    standardised: FloatArray, view: Callable[[FloatArray], FloatArray]
) -> None:
    """Of modes, realizations (samples and repeats), sub-steps of a base step, and neighbouring base steps."""
    numbers = view(standardised)
    by_place = numbers.reshape(96, 4, 12, 5)
    for axis in range(4):
        rows = np.moveaxis(by_place, axis, 0).reshape(by_place.shape[axis], -1)
        assert largest_correlation(rows) < 1.0
    for lag in (1, 2, 32, 64):  # 32 base steps: the same place in the next stretch
        pairs = np.stack([by_place[:-lag].ravel(), by_place[lag:].ravel()])
        assert largest_correlation(pairs) < 1.0


def test_seeds_have_nothing_in_common() -> None:
    rows = [whole(*realizations(8), 5, np.ones(64), 0, seed).ravel() for seed in range(12)]
    assert largest_correlation(np.stack(rows)) < 1.0


def uniform_numbers(purpose: str, steps: int, count: int) -> FloatArray:
    """(steps, count, S) for 24 realizations."""
    source = PathUniforms(SEED, purpose, *realizations(12, 2))
    return np.stack([source.base_step(k, count) for k in range(steps)])


def test_uniform_numbers_stand_where_the_counter_says() -> None:
    """The middle of the cell of 2^-52 in which numpy's own uniform number lies, at the documented place."""
    source = PathUniforms(SEED, "peak", np.array([4, 9]), np.array([0, 2]))
    for lane, found in (
        (0, [source.base_step(k, 3)[:, 1] for k in range(32, 64)]),
        (1, [source.once(96)[:, 1]]),
    ):
        drawn = address(SEED, "beside the paths: peak", lane, 1 - lane, 2, 9).random(96)
        expected = drawn.reshape(3, 32).T if lane == 0 else drawn[None]
        np.testing.assert_allclose(found, expected, rtol=0, atol=2.0**-52)


def test_uniform_numbers_are_uniform_and_never_0_or_1() -> None:
    steps, once = uniform_numbers("peak", 70, 4), PathUniforms(SEED, "peak", *realizations(12, 2)).once(50)
    for numbers in (steps, once):
        assert kstest(numbers.ravel(), "uniform").pvalue > FALSE_ALARM
        assert numbers.min() > 0.0
        assert numbers.max() < 1.0


def test_uniform_numbers_are_independent() -> None:
    """Of places, steps, realizations, purposes, of those drawn once, and of the paths beside which they stand."""
    steps = norm.ppf(uniform_numbers("peak", 64, 4))
    for axis in range(3):
        assert largest_correlation(np.moveaxis(steps, axis, 0).reshape(steps.shape[axis], -1)) < 1.0
    once = norm.ppf(PathUniforms(SEED, "peak", *realizations(12, 2)).once(256)).reshape(steps.shape)
    other = norm.ppf(uniform_numbers("other", 64, 4))
    path = whole(*realizations(12, 2), 1, np.full(64, 4.0), 2)[..., 0]
    assert largest_correlation(np.stack([a.ravel() for a in (steps, once, other, path)])) < 1.0


def test_uniform_numbers_do_not_depend_on_what_else_is_asked_for() -> None:
    samples, repeats = realizations(12, 2)
    expected = uniform_numbers("peak", 70, 8)
    np.testing.assert_array_equal(uniform_numbers("peak", 70, 2), expected[:, :2])
    rows = [20, 3, 3]
    source = PathUniforms(SEED, "peak", samples[rows], repeats[rows])
    for k in (69, 0, 33, 31, 69):
        np.testing.assert_array_equal(source.base_step(k, 8), expected[k][:, rows])
        np.testing.assert_array_equal(source.base_step(k, 4), expected[k][:4, rows])
    once = PathUniforms(SEED, "peak", samples, repeats).once(5)
    np.testing.assert_array_equal(source.once(3), once[:3, rows])
