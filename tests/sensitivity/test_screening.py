"""Thirty inputs, few of which matter: elementary effects find them within 93 to 155 runs."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy.stats import binom

from aleafield.arrays import FloatArray
from aleafield.randomness.trajectories import STEP, trajectories
from aleafield.sensitivity.exchange import Exchange
from aleafield.sensitivity.screening import GROUP_TOTAL, Screening
from tests.sensitivity.known_functions import ISHIGAMI, g_function, scrambled

D = 30


def monotone(u: FloatArray) -> FloatArray:
    """Five inputs matter, all upward: exp of one, powers, a saturating one."""
    x = u[..., :5]
    upward = np.exp(x[..., 0]) + 1.5 * x[..., 1] + x[..., 2] ** 2
    y: FloatArray = upward + np.tanh(3 * x[..., 3]) + x[..., 4] ** 3
    return y


def interacting(u: FloatArray) -> FloatArray:
    """No input of these matters alone in the mean, or only evenly, or only in waves."""
    x = 2 * u - 1
    pairs = 3 * x[..., 0] * x[..., 1] + 3 * x[..., 2] * x[..., 3]
    even_and_wave = 2.5 * x[..., 4] ** 2 + np.cos(3 * np.pi * u[..., 5])
    y: FloatArray = pairs + even_and_wave + 0.001 * x[..., 6:].sum(axis=-1)
    return y


def products(u: FloatArray) -> FloatArray:
    """The g-function with a = 0, 0.5, 1, 3, 4.5 and 25 times 99: kinks, even in every input."""
    return g_function((0.0, 0.5, 1.0, 3.0, 4.5, *(99.0,) * 25))(u.reshape(-1, D)).reshape(u.shape[:-1])


CASES = [(monotone, 5), (interacting, 6), (products, 5)]


def screened(function: Callable[[FloatArray], FloatArray], count: int, seed: int) -> Screening:
    """The screening of a function after so many trajectories."""
    walks = trajectories(D, 0, count, seed)
    screening = Screening(D, 1)
    screening.add(walks, function(walks)[..., None])
    return screening


@pytest.mark.parametrize(("function", "active"), CASES)
def test_what_matters_is_kept(function: Callable[[FloatArray], FloatArray], active: int) -> None:
    """All that matter are kept in 99 of 100 designs, the rest dropped (exact binomial floor at 1e-4)."""
    designs = 200
    complete = 0
    for seed in range(designs):
        screening = screened(function, 4, seed)
        complete += bool(screening.kept[:active].all())
        assert not screening.kept[active:].any()
    assert complete >= binom.ppf(1e-4, designs, 0.99)


def test_the_largest_effects_of_93_runs() -> None:
    """As in the trials: all that matter are among the k + 3 with the largest effects in 99 of 100 designs."""
    for function, active in CASES:
        found = 0
        for seed in range(200):
            effect = screened(function, 3, 1000 + seed).mean_effect[:, 0]
            found += set(range(active)) <= set(np.argsort(-effect)[: active + 3].tolist())
        assert found >= binom.ppf(1e-4, 200, 0.99)


def test_walks_change_every_input_once() -> None:
    walks = trajectories(D, 0, 5, 1)
    steps = np.diff(walks, axis=1)
    assert np.allclose(np.sort(np.abs(steps), axis=2)[..., -1], STEP)
    assert (np.count_nonzero(steps, axis=2) == 1).all()
    assert (np.count_nonzero(steps, axis=1) == 1).all()
    assert walks.min() > 0.0
    assert walks.max() < 1.0
    later = trajectories(D, 3, 2, 1)
    assert np.array_equal(later, walks[3:])
    assert (np.abs((steps > 0).mean() * D - (steps < 0).mean() * D)) < 0.5


def test_effects_of_a_linear_function_are_its_slopes() -> None:
    slopes = np.linspace(-3, 3, D)
    found = screened(lambda u: u @ slopes, 2, 3).mean_effect[:, 0]
    assert np.allclose(found, np.abs(slopes), atol=1e-12)


def test_periods_do_not_hide_an_effect() -> None:
    """sin^2 of half the period of the interval: the second input of the Ishigami function."""
    walks = trajectories(3, 0, 3, 2)
    screening = Screening(3, 1)
    screening.add(walks, ISHIGAMI.evaluate(walks.reshape(-1, 3)).reshape(3, 4, 1))
    assert screening.mean_effect[1, 0] > 1.0


def test_stopping() -> None:
    """Nothing is dropped before the kept set came out three times alike, counted from the third trajectory."""
    walks = trajectories(D, 0, 5, 7)
    screening = Screening(D, 1)
    for count in range(5):
        one = walks[count : count + 1]
        screening.add(one, monotone(one)[..., None])
        assert screening.kept.all() == (count < 3)
        assert screening.settled == (count == 4)


def test_lost_runs_drop_no_input() -> None:
    """An input whose effects are all lost is kept: nothing is known of it."""
    walks = trajectories(D, 0, 4, 7)
    values = monotone(walks)[..., None]
    for walk, outputs in zip(walks, values, strict=True):
        at = int(np.flatnonzero(np.diff(walk, axis=0)[:, 20])[0])
        outputs[at] = np.nan
    screening = Screening(D, 1)
    screening.add(walks, values)
    assert screening.kept[20]
    assert np.isnan(screening.mean_effect[20, 0])


def test_an_input_that_matters_to_one_output_is_kept() -> None:
    walks = trajectories(D, 0, 4, 7)
    values = np.stack([monotone(walks), walks[..., 29]], axis=-1)
    screening = Screening(D, 2)
    screening.add(walks, values)
    assert screening.kept[[0, 1, 2, 3, 4, 29]].all()
    assert screening.kept.sum() == 6


def test_the_dropped_are_confirmed_as_one_group() -> None:
    """Four runs a row: their total index lies surely below the threshold."""
    kept = screened(interacting, 4, 5).kept
    exchange = Exchange(D, [np.flatnonzero(~kept).tolist()])
    unit, block = scrambled(2 * D, 16, 3)
    sums = exchange.sums(16, 1)
    sums.add(interacting(exchange.points(unit))[..., None], block)
    assert exchange.n_runs == 4
    assert sums.total().indices(0.95).at_most(0.95)[0, 0] < GROUP_TOTAL
