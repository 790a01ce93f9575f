"""First, total and second-order indices: published values, closed forms, other libraries, missing runs."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy.special import ndtr
from scipy.stats import norm, sobol_indices

from aleafield.arrays import FloatArray, IntArray
from aleafield.randomness.laws import Discrete, Exponential, Law, LogNormal, Normal, Uniform
from aleafield.sensitivity.cross_check import salib_indices
from aleafield.sensitivity.exchange import LEAST_ROWS, Exchange
from aleafield.sensitivity.given_data import LEAST_POINTS, first_order, halved_spread
from aleafield.sensitivity.main_effects import main_effect
from aleafield.sensitivity.ratios import NO_SPREAD, Indices
from tests.sensitivity.coverage import UNIT, exchange_sums, given_data_indices, held, run_values
from tests.sensitivity.known_functions import (
    FRONT,
    FUNCTIONS,
    G4,
    ISHIGAMI,
    KnownFunction,
    g_function,
    plain,
    product_indices,
    scrambled,
)

SURE = 0.99999
"""Confidence of intervals in single tests: with some tens of indices a false alarm has a chance below 1e-3."""


def precise(found: Indices, rows: int) -> bool:
    """Whether errors stay below half of 1 / sqrt(rows), what a share is known to by independent rows."""
    return bool((2 * found.standard_error * np.sqrt(rows) < 1).all())


@pytest.mark.parametrize("function", FUNCTIONS, ids=lambda f: f.name)
def test_known_indices_lie_inside(function: KnownFunction) -> None:
    unit, block = scrambled(2 * function.inputs, 128, seed=5)
    sums = exchange_sums(function, unit, block, 16)
    assert held(sums.first().indices(SURE), function.first).all()
    assert held(sums.total().indices(SURE), function.total).all()
    assert held(given_data_indices(function, unit, block, 16, SURE), function.first).all()
    variance = sums.total().whole[:, 0]
    assert np.allclose(variance, function.variance, rtol=0.1)


def test_scrambled_points_are_worth_their_trouble() -> None:
    """Ishigami at 2048 rows: first indices from the sample at least twice as precise as with independent points.

    The trials behind the design gave 3.5e-3 against 1.7e-2 and more.
    """
    errors: dict[str, list[FloatArray]] = {"scrambled": [], "plain": []}
    for design in range(12):
        for kind, (unit, block) in (
            ("scrambled", scrambled(3, 128, 900 + design)),
            ("plain", plain(3, 2048, 900 + design)),
        ):
            found = given_data_indices(ISHIGAMI, unit, block, 16).value[:, 0]
            errors[kind].append(found - ISHIGAMI.first)
    rms = {kind: float(np.sqrt(np.mean(np.square(found)))) for kind, found in errors.items()}
    assert 2 * rms["scrambled"] < rms["plain"]


def test_additive_functions_are_parted_exactly() -> None:
    """Row by row both estimators see the same squares: T = S; and a group of all inputs explains all."""

    def additive(u: FloatArray) -> FloatArray:
        return 3 * u[:, 0] ** 2 - np.cos(5 * u[:, 1])

    function = KnownFunction("additive", additive, 0.0, np.zeros(2), np.zeros(2))
    unit, block = scrambled(4, LEAST_ROWS, 3)
    sums = exchange_sums(function, unit, block, 16, second=True)
    assert np.allclose(sums.first().part, sums.total().part, rtol=1e-12)
    assert np.allclose(sums.closed().indices(0.95).value, 1.0, rtol=1e-12)
    together = Exchange(2, [(0, 1)])
    assert together.n_runs == 4
    all_in_one = together.sums(16, 1)
    all_in_one.add(run_values(function, together, unit), block)
    assert np.allclose(all_in_one.first().indices(0.95).value, 1.0, rtol=1e-12)
    assert np.allclose(all_in_one.total().indices(0.95).value, 1.0, rtol=1e-12)


def test_second_order_of_the_front() -> None:
    """S_ij = r_i r_j / (prod (1 + r) - 1) for a product with relative variances r; sensitivities sum to 1."""
    unit, block = scrambled(6, 64, 11)
    sums = exchange_sums(FRONT, unit, block, 16, second=True)
    assert sums.pairs == ((0, 1), (0, 2), (1, 2))
    expected = np.array([0.011621695424, 0.012007066273, 0.000703829205])
    assert held(sums.second().indices(SURE), expected).all()
    assert precise(sums.second().indices(0.95), len(unit))
    single = FRONT.first
    closed = np.array([single[i] + single[j] + s for (i, j), s in zip(sums.pairs, expected, strict=True)])
    assert held(sums.closed().indices(SURE), closed).all()


@pytest.mark.parametrize(
    ("groups", "closed", "total"),
    [
        ([(0, 1), (2, 3)], (0.955323913144, 0.030929598593), (0.969070401407, 0.044676086856)),
        ([(2, 3)], (0.030929598593,), (0.044676086856,)),
    ],
)
def test_groups_of_the_g_function(
    groups: list[tuple[int, ...]], closed: tuple[float, ...], total: tuple[float, ...]
) -> None:
    """Closed forms: prod over a group of (1 + v_i) - 1 over the same of all."""
    unit, block = scrambled(8, 64, 12)
    exchange = Exchange(4, groups)
    sums = exchange.sums(16, 1)
    sums.add(run_values(G4, exchange, unit), block)
    assert held(sums.first().indices(SURE), np.array(closed)).all()
    assert held(sums.total().indices(SURE), np.array(total)).all()


def test_scipy_and_salib_agree_on_the_same_runs() -> None:
    """Plain points, 4096 rows: all are consistent, so they differ by little more than their errors (0.03)."""
    unit, block = plain(6, 4096, 8)
    exchange = Exchange(3)
    values = run_values(ISHIGAMI, exchange, unit)
    sums = exchange.sums(16, 1)
    sums.add(values, block)
    ours = np.stack([sums.first().indices(0.95).value[:, 0], sums.total().indices(0.95).value[:, 0]])
    widest = max(
        float((found.high - found.low).max())
        for found in (sums.first().indices(SURE), sums.total().indices(SURE))
    )
    theirs = sobol_indices(
        func={"f_A": values[:, 0].T, "f_B": values[:, 1].T, "f_AB": values[:, 2:5].transpose(1, 2, 0)}, n=4096
    )
    salib = np.stack([side[:, 0] for side in salib_indices(values)])
    assert np.abs(ours - np.stack([theirs.first_order.ravel(), theirs.total_order.ravel()])).max() < widest
    assert np.abs(ours - salib).max() < widest
    # both know Saltelli's and Jansen's estimators; SALib divides by the variance of all runs it was given
    assert np.abs(salib[1] - theirs.total_order.ravel()).max() < 0.02


def test_salib_never_sees_a_gap() -> None:
    unit, _ = scrambled(6, 16, 4)
    values = run_values(ISHIGAMI, Exchange(3), unit)
    whole = salib_indices(values[1:])
    values[0, 3] = np.nan
    for found, expected in zip(salib_indices(values), whole, strict=True):
        assert np.array_equal(found, expected)
    assert np.isnan(salib_indices(np.full((32, 8, 1), np.nan))[0]).all()


def test_a_row_is_left_out_only_where_it_is_needed() -> None:
    """AB_1 missing in one row: index 1 is that of the other rows, indices 0 and 2 do not change a bit."""
    unit, block = scrambled(6, 32, 4)
    exchange = Exchange(3)
    values = run_values(ISHIGAMI, exchange, unit)

    def indices(rows: FloatArray, of: IntArray) -> list[FloatArray]:
        sums = exchange.sums(16, 1, second=True)
        sums.add(rows, of)
        return [found.indices(0.95).value for found in (sums.first(), sums.total(), sums.closed())]

    complete = indices(values, block)
    without = indices(np.delete(values, 7, axis=0), np.delete(block, 7))
    values[7, 3] = np.nan
    gap = indices(values, block)
    for order in (0, 1):
        assert np.array_equal(gap[order][[0, 2]], complete[order][[0, 2]])
        assert np.allclose(gap[order][1], without[order][1], rtol=1e-12)
    assert np.array_equal(gap[2][1], complete[2][1])
    assert np.allclose(gap[2][[0, 2]], without[2][[0, 2]], rtol=1e-12)


def test_additions_in_pieces_are_one() -> None:
    unit, block = scrambled(6, 32, 4)
    exchange = Exchange(3)
    values = run_values(ISHIGAMI, exchange, unit)
    once, twice = exchange.sums(16, 1), exchange.sums(16, 1)
    once.add(values, block)
    for part in (slice(0, 100), slice(100, None)):
        twice.add(values[part], block[part])
    assert np.allclose(once.total().indices(0.95).value, twice.total().indices(0.95).value, rtol=1e-12)


def test_random_gaps_do_no_harm() -> None:
    """3 per cent of the runs lost at random: the known indices still lie inside."""
    unit, block = scrambled(6, 128, 6)
    lost = np.random.default_rng(1)
    y = ISHIGAMI.evaluate(unit[:, :3])[:, None]
    y[lost.random(len(y)) < 0.03] = np.nan
    found = first_order(unit[:, :3], y, block, 16, [UNIT] * 3).indices(SURE)
    assert held(found, ISHIGAMI.first).all()
    exchange = Exchange(3)
    values = run_values(ISHIGAMI, exchange, unit)
    values[lost.random(values.shape) < 0.03] = np.nan
    sums = exchange.sums(16, 1)
    sums.add(values, block)
    assert held(sums.first().indices(SURE), ISHIGAMI.first).all()
    assert held(sums.total().indices(SURE), ISHIGAMI.total).all()


def test_reasons_for_silence() -> None:
    """Above 5 per cent of gaps, without spread, with too few points: no number, and why, for that output only."""
    unit, block = scrambled(6, 32, 6)
    y = np.repeat(ISHIGAMI.evaluate(unit[:, :3])[:, None], 3, axis=1)
    y[: len(y) // 16 + 1, 1] = np.nan
    y[:, 2] = 4.0
    ratios = first_order(unit[:, :3], y, block, 16, [UNIT] * 3)
    assert ratios.reason[0] is None
    assert "give no value" in str(ratios.reason[1])
    assert ratios.reason[2] == NO_SPREAD
    found = ratios.indices(0.95)
    assert np.isfinite(found.value[:, 0]).all()
    assert np.isnan(found.value[:, 1:]).all()
    assert np.isnan(found.high[:, 1:]).all()
    few = 16 * (LEAST_POINTS - 1)
    short = first_order(unit[:few, :3], y[:few], block[:few], 16, [UNIT] * 3)
    assert f"needs {LEAST_POINTS} points" in str(short.reason[0])
    exchange = Exchange(3)
    values = run_values(ISHIGAMI, exchange, unit)
    sums = exchange.sums(16, 1)
    sums.add(values[: 16 * (LEAST_ROWS - 1)], block[: 16 * (LEAST_ROWS - 1)])
    assert f"needs {LEAST_ROWS} points" in str(sums.first().reason[0])
    values[: len(values) // 16 + 1] = np.nan
    gaps = exchange.sums(16, 1)
    gaps.add(values, block)
    assert "give no value" in str(gaps.total().reason[0])


def test_one_output_does_not_touch_another() -> None:
    """Many outputs at once, some with gaps: each column is as if alone."""
    unit, block = scrambled(6, 32, 9)
    y = ISHIGAMI.evaluate(unit[:, :3])[:, None] * np.linspace(1, 2, 300) + np.linspace(0, 1e3, 300)
    y[3, 5] = np.nan
    together = first_order(unit[:, :3], y, block, 16, [UNIT] * 3).indices(0.95)
    for column in (0, 5, 299):
        alone = first_order(unit[:, :3], y[:, [column]], block, 16, [UNIT] * 3).indices(0.95)
        assert np.allclose(together.value[:, column], alone.value[:, 0], rtol=1e-9)
        assert np.allclose(together.high[:, column], alone.high[:, 0], rtol=1e-9)
    assert np.allclose(together.value[:, 0], together.value[:, 299], rtol=1e-8)


@pytest.mark.parametrize(
    ("law", "function"),
    [
        (Uniform(-2.0, 3.0), lambda x: np.cos(2 * x)),
        (Normal(1.0, 2.0), lambda x: x),
        (Normal(0.0, 1.0), lambda x: 1 / (1 + np.exp(-4 * x))),
        (LogNormal(0.0, 0.8), lambda x: x),
        (Exponential(3.0), lambda x: x**2),
        (Discrete([3.0, 1.0, 2.0], [1.0, 5.0, 0.5]), lambda x: x**3),
    ],
)
def test_functions_of_one_input_are_spanned(law: Law, function: Callable[[FloatArray], FloatArray]) -> None:
    """On a grid of 2^18 midpoints: mean 0, and all but 1e-3 of the variance explained."""
    u = (np.arange(2**18) + 0.5) / 2**18
    effect = main_effect(law)
    values, y = effect.evaluate(u), function(law.ppf(u))
    centred = y - y.mean()
    explained = np.square(values.T @ centred / len(u)).sum() / np.mean(centred**2)
    assert explained == pytest.approx(1.0, abs=1e-3)
    assert np.abs(values.mean(axis=0)).max() < 1e-3


@pytest.mark.parametrize("law", [Uniform(-2.0, 3.0), Normal(1.0, 2.0)], ids=lambda law: law.name)
def test_functions_of_one_input_are_orthonormal(law: Law) -> None:
    """By Gauss's rule: in u, or in pieces of the normal score where functions of it are involved."""
    node, weight = np.polynomial.legendre.leggauss(40)
    u, weight = (node + 1) / 2, weight / 2
    if not np.isfinite(law.support[0]):
        # forty nodes in each of twenty pieces of the score from -8 to 8, times the normal density
        score = (np.linspace(-8, 8, 20, endpoint=False)[:, None] + 0.8 * u).ravel()
        u, weight = ndtr(score), 0.8 * np.tile(weight, 20) * norm.pdf(score)
    values = main_effect(law).evaluate(u)
    assert np.abs(values.T @ (weight[:, None] * values) - np.eye(values.shape[1])).max() < 1e-6
    assert np.abs(weight @ values).max() < 1e-6


LOGNORMAL_SD = np.array([0.2, 0.3, 0.25])


def lognormal_product(points: int, seed: int) -> tuple[FloatArray, FloatArray, IntArray, list[Law]]:
    """Points, product of three lognormal numbers, scramblings, laws."""
    unit, block = scrambled(6, points, seed)
    laws: list[Law] = [LogNormal(0.0, sd) for sd in LOGNORMAL_SD]
    y: FloatArray = np.prod([law.ppf(unit[:, i]) for i, law in enumerate(laws)], axis=0)[:, None]
    return unit[:, :3], y, block, laws


def test_unbounded_laws() -> None:
    """S_i = expm1(v_i) / expm1(v); half the spread known: expm1(0.75 v_i) / expm1(v) (Mehler's formula)."""
    u, y, block, laws = lognormal_product(256, 21)
    variance = LOGNORMAL_SD**2
    whole = np.expm1(variance.sum())
    known = first_order(u, y, block, 16, laws).indices(SURE)
    halved = halved_spread(u, y, block, 16, laws).indices(SURE)
    assert held(known, np.expm1(variance) / whole).all()
    assert held(halved, np.expm1(0.75 * variance) / whole).all()
    assert precise(known, len(u))
    assert precise(halved, len(u))


def test_halves_of_the_front() -> None:
    """Share removed by learning in which half an input lies, by integration of the factors."""
    unit, block = scrambled(6, 128, 31)
    y = FRONT.evaluate(unit[:, :3])[:, None]
    found = halved_spread(unit[:, :3], y, block, 16, [UNIT] * 3).indices(SURE)
    expected = np.array([0.6186092872, 0.0383197258, 0.0388422034])
    assert held(found, expected).all()
    assert precise(found, len(unit))


def test_few_values_and_a_normal_number() -> None:
    """X of three values, Z normal, Y = X^2 (1 + Z / 2): a product of independent factors in closed form."""
    laws: list[Law] = [Discrete([-1.0, 0.5, 2.0], [1.0, 2.0, 1.0]), Normal(0.0, 1.0)]
    unit, block = scrambled(4, 128, 41)
    x, z = (law.ppf(unit[:, i]) for i, law in enumerate(laws))
    y = (x**2 * (1 + z / 2))[:, None]
    squares, share = np.array([1.0, 0.25, 4.0]), np.array([0.25, 0.5, 0.25])
    mean = float(squares @ share)
    spread = float((squares - mean) ** 2 @ share)
    _, first, _ = product_indices(np.array([mean, 1.0]), np.array([spread, 0.25]))
    found = first_order(unit[:, :2], y, block, 16, laws).indices(SURE)
    assert held(found, first).all()
    assert precise(found, len(unit))


def test_noise_as_a_group_has_a_total_only() -> None:
    """Y = m(x) + s(x) W, W standard normal from the row's stream: T_noise = E s^2 / V, S_x = Var m / V.

    m = 2 u, s = 1 + u: Var m = 1/3, E s^2 = 7/3.
    """
    exchange = Exchange(1, noise=True)
    unit, block = scrambled(2, 128, 51)
    points, streams = exchange.points(unit)[..., 0], exchange.streams(np.arange(len(unit)), len(unit))
    assert exchange.n_runs == 6
    assert np.array_equal(streams[3] - streams[3, 0], len(unit) * np.array([0, 1, 0, 1, 1, 0]))
    path = np.random.default_rng(2).normal(size=2 * len(unit))[streams]
    sums = exchange.sums(16, 1)
    sums.add((2 * points + (1 + points) * path)[..., None], block)
    first, total = sums.first().indices(SURE), sums.total().indices(SURE)
    assert first.value.shape == (1, 1)
    assert total.value.shape == (2, 1)
    assert held(first, np.array([(1 / 3) / (8 / 3)])).all()
    assert held(total, np.array([(1 / 3 + 1 / 12) / (8 / 3), (7 / 3) / (8 / 3)])).all()


def test_the_bias_of_an_index_is_seen_in_pairs() -> None:
    """Two versions of a function on the same rows: their difference is known far better than either.

    The g-function, and the same with a_0 = 0.01 in place of 0: the difference in S_0 is closed.
    """
    unit, block = scrambled(8, 32, 61)
    changed = np.array([0.01, 1.0, 4.5, 9.0])
    _, first, total = product_indices(np.ones(4), 1 / (3 * (1 + changed) ** 2))
    other = KnownFunction("near", g_function(tuple(changed)), 0.0, first, total)
    one, two = (exchange_sums(f, unit, block, 16).total().indices(SURE) for f in (G4, other))
    bias = one.minus(two)
    assert held(bias, G4.total - total).all()
    assert (bias.standard_error < 0.1 * one.standard_error).all()


def test_points_of_a_row() -> None:
    """Columns of A and B as the order of runs says."""
    unit = np.array([[0.1, 0.2, 0.3, 0.6, 0.7, 0.8]])
    points = Exchange(3, [(0, 2), (1,)]).points(unit)[0]
    expected = [
        [0.1, 0.2, 0.3],
        [0.6, 0.7, 0.8],
        [0.6, 0.2, 0.8],
        [0.1, 0.7, 0.3],
        [0.1, 0.7, 0.3],
        [0.6, 0.2, 0.8],
    ]
    assert np.array_equal(points, expected)


def test_unit_of_the_law_of_uniform_numbers() -> None:
    """The functions depend on the law's kind, never on its units."""
    unit, block = scrambled(6, 16, 4)
    y = ISHIGAMI.evaluate(unit[:, :3])[:, None]
    by_unit = first_order(unit[:, :3], y, block, 16, [UNIT] * 3)
    by_angle = first_order(unit[:, :3], y, block, 16, [Uniform(-np.pi, np.pi)] * 3)
    assert np.array_equal(by_unit.part, by_angle.part)
