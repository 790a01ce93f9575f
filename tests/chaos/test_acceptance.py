"""Which surrogates are accepted, and the reasons of those that are not."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy.stats import binom

from aleafield.arrays import FloatArray
from aleafield.chaos.acceptance import Verdict, judge, largest_gap
from aleafield.chaos.search import search
from aleafield.randomness.laws import Uniform
from tests.chaos.ring_fields import BISTABLE, SMOOTH, centre_value, laws
from tests.sensitivity.known_functions import FRONT, G4, ISHIGAMI, JUMP, scrambled


def verdict(
    response: Callable[[FloatArray], FloatArray], d: int, runs: int, seed: int, held: int = 64
) -> Verdict:
    """Of one design with uniform inputs."""
    u = scrambled(d, runs // 16, seed)[0]
    h = np.random.default_rng(seed).random((held, d))
    y = response(u)[:, None]
    return judge(search(u, y, [Uniform(0, 1)] * d), u, y, h, response(h)[:, None])[0]


def test_the_smooth_field_is_accepted_and_the_bistable_one_is_not() -> None:
    """60 designs of 64 + 32 runs of each; shares of 93 % and 98 % fail here with a chance of at most 0.1 %.

    tests/benchmarks/chaos.py does the same with 400.
    """
    designs, runs, held = 60, 64, 32
    good = {}
    for name, equation in (("smooth", SMOOTH), ("bistable", BISTABLE)):
        of = laws(equation)
        u = np.concatenate([scrambled(len(of), runs // 16, seed)[0] for seed in range(designs)])
        h = np.random.default_rng(1).random((designs * held, len(of)))
        y, y_held = centre_value(equation, u)[:, None], centre_value(equation, h)[:, None]
        verdicts: list[Verdict] = []
        for seed in range(designs):
            fitted, kept = slice(seed * runs, (seed + 1) * runs), slice(seed * held, (seed + 1) * held)
            found = search(u[fitted], y[fitted], of)
            verdicts += judge(found, u[fitted], y[fitted], h[kept], y_held[kept])
        good[name] = sum(v.accepted for v in verdicts)
    assert good["smooth"] >= binom.ppf(1e-3, designs, 0.93)
    assert good["bistable"] <= binom.ppf(1 - 1e-3, designs, 0.02)
    assert all("two groups" in v.reason for v in verdicts)


def test_reasons() -> None:
    """A field without a gap that kinks, one that more runs resolve, and two groups."""
    jump = verdict(lambda u: JUMP.evaluate(u) + 0.3 * u[:, 1], 3, 256, 1)
    assert "two groups" in jump.reason
    wave = verdict(ISHIGAMI.evaluate, 3, 192, 2)
    assert "too few runs" in wave.reason
    rough = verdict(lambda u: np.abs(np.sin(25 * u[:, 0]) + np.sin(31 * u[:, 1])), 2, 128, 3)
    assert "too rough" in rough.reason
    for refused in (jump, wave, rough):
        assert not refused.accepted
        assert refused.error == max(refused.loo, refused.held_out) > 0.05


def test_quantiles_ask_for_more() -> None:
    good, middling = verdict(FRONT.evaluate, 3, 64, 4), verdict(G4.evaluate, 4, 1024, 4)
    assert good.accepted_for_quantiles
    assert not good.reason
    assert middling.accepted
    assert not middling.accepted_for_quantiles


def test_too_few_held_out_runs_and_too_many_failures() -> None:
    few = verdict(FRONT.evaluate, 3, 64, 5, held=31)
    assert "31 held out, 32 are needed" in few.reason
    assert not few.accepted
    none = verdict(FRONT.evaluate, 3, 64, 5, held=0)
    assert none.held_out == np.inf

    def failing(share: float) -> Callable[[FloatArray], FloatArray]:
        return lambda u: np.where(u[:, 0] < share, np.nan, FRONT.evaluate(u))

    assert verdict(failing(0.02), 3, 128, 6).accepted
    refused = verdict(failing(0.09), 3, 128, 6)
    assert not refused.accepted
    assert "gave no value" in refused.reason


def test_each_output_has_its_own_verdict() -> None:
    u = scrambled(3, 8, 7)[0]
    h = np.random.default_rng(7).random((64, 3))
    of = [Uniform(0, 1)] * 3

    def both(points: FloatArray) -> FloatArray:
        return np.column_stack(
            (FRONT.evaluate(points) / 0.04, JUMP.evaluate(points) / 0.6, np.ones(len(points)))
        )

    smooth, jump, certain = judge(search(u, both(u), of), u, both(u), h, both(h))
    assert (smooth.accepted, jump.accepted, certain.accepted) == (True, False, True)
    assert certain.error == 0.0


@pytest.mark.parametrize(
    ("values", "gap"),
    [(np.arange(101.0), 1 / 90), (np.r_[np.zeros(50), np.ones(50)], 1.0), (np.ones(40), 0.0)],
)
def test_largest_gap(values: FloatArray, gap: float) -> None:
    """By hand, inside the middle 90 %."""
    assert largest_gap(values) == pytest.approx(gap, abs=1e-12)


def test_the_bound_is_the_log_normal_one() -> None:
    """The formula, written out for residuals of a constant surrogate."""
    u = scrambled(1, 2, 8)[0]
    y = np.random.default_rng(8).normal(size=(32, 1))
    found = search(u, y, [Uniform(0, 1)])
    h, y_held = np.random.default_rng(9).random((40, 1)), np.random.default_rng(10).normal(size=(40, 1))
    squares = (y_held - found.evaluate(h))[:, 0] ** 2
    m, s = squares.mean(), squares.std(ddof=1)
    bound = m * np.exp(1.6448536269514722 * np.sqrt(np.log(1 + s**2 / (40 * m**2)))) / y.var(ddof=1)
    assert judge(found, u, y, h, y_held)[0].held_out == pytest.approx(bound, rel=1e-12)
