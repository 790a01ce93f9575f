"""Euler-Maruyama: its own moments, strong order 1, switches, failing samples, and what observers see."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy.stats import chi2

from aleafield.arrays import FloatArray
from aleafield.randomness.wiener import WienerPaths
from aleafield.stepping.euler_maruyama import integrate, stability_bound
from aleafield.stepping.schedule import Schedule
from aleafield.stepping.view import NoisyStep
from tests.convergence.rates import observed_orders
from tests.manufactured.solving import root_mean_square

Rate = Callable[[float, FloatArray, float], FloatArray]
"""F(t, u, inside) with values of the shape of u."""


class Scalars:
    """S samples of one unknown: du = F dt + strength dW with one Wiener process."""

    restarts = False

    def __init__(self, start: FloatArray, rate: Rate, strength: float) -> None:
        self._start, self._rate, self._strength = start, rate, strength

    def initial(self) -> FloatArray:
        return self._start[:, None].copy()

    def rate_of_change(self, t: float, u: FloatArray, inside: float | None = None) -> FloatArray:
        assert inside is not None
        return np.array(self._rate(t, u, inside))

    def noise(self, increments: FloatArray) -> FloatArray:
        return self._strength * increments


class Steps:
    """Observer that keeps the start and every step."""

    def __init__(self) -> None:
        self.steps: list[NoisyStep] = []

    def start(self, t: float, u: FloatArray) -> None:
        assert t == 0.0
        self.first = u

    def step(self, view: NoisyStep) -> None:
        self.steps.append(view)

    @property
    def end(self) -> FloatArray:
        return self.steps[-1].u1[:, 0]


class Impulses:
    """Increments that are 1 in one sub-step of the whole path, another for each of the S = K P realizations."""

    def __init__(self, base_steps: int, parts: int) -> None:
        self._all = np.eye(base_steps * parts).reshape(base_steps, parts, base_steps * parts, 1)

    def base_step(self, k: int) -> FloatArray:
        return np.array(self._all[k])


def wiener(samples: int, schedule: Schedule, depth: int, seed: int = 11) -> WienerPaths:
    """Paths of one process over the base steps of a schedule."""
    numbers = np.arange(samples)
    return WienerPaths(seed, numbers, np.zeros_like(numbers), 1, schedule.base_lengths, depth)


def decay(rate: float) -> Rate:
    """F = -rate u."""
    return lambda t, u, inside: -rate * u


# kappa, q, and the variance after n = 4 steps of 1/4 of mode k of a linear ring field with tau = 1: kernel modes
# 0.7 * 0.5^k, noise modes 0.3 * 0.6^k
MODES = [(0.3, 0.3, 0.2410587892273), (0.65, 0.18, 0.1142301744293), (0.95625, 0.03888, 0.02049391446917)]


@pytest.mark.parametrize(("kappa", "q", "published"), MODES)
def test_variance_of_an_ornstein_uhlenbeck_process(kappa: float, q: float, published: float) -> None:
    """q dt (1 - m^(2n)) / (1 - m^2), m = 1 - kappa dt (Kloeden and Platen 1992, from memory), to rounding.

    The end of a linear path is a sum over independent increments: its variance is the sum of the squared
    responses to one impulse each, times dt.
    """
    schedule = Schedule.through([], 0.25, 1.0)
    watcher = Steps()
    integrate(
        Scalars(np.zeros(4), decay(kappa), np.sqrt(q)), schedule, Impulses(2, 2), [watcher], steps_per_base=2
    )
    variance = 0.25 * (watcher.end**2).sum()
    m = 1 - 0.25 * kappa
    assert variance == pytest.approx(q * 0.25 * (1 - m**8) / (1 - m**2), rel=1e-14)
    assert variance == pytest.approx(published, rel=1e-12)


@pytest.mark.parametrize(("kappa", "q", "published"), MODES)
def test_variance_over_many_paths(kappa: float, q: float, published: float) -> None:
    """The same with Wiener paths: chi-square bounds, 1e-4 in each tail."""
    schedule, watcher = Schedule.through([], 0.25, 1.0), Steps()
    system = Scalars(np.zeros(4000), decay(kappa), np.sqrt(q))
    integrate(system, schedule, wiener(4000, schedule, 1), [watcher], steps_per_base=2)
    assert chi2.ppf(1e-4, 4000) < (watcher.end**2).sum() / published < chi2.isf(1e-4, 4000)


def amplitude_rate(t: float, u: FloatArray, inside: float) -> FloatArray:
    """-A + 0.6 times the integral of cos y f(A cos y) over a ring, f logistic with gain 6 and threshold 0.4."""
    y = 2 * np.pi * np.arange(48) / 48
    fired = 1 / (1 + np.exp(-6 * (u * np.cos(y) - 0.4)))
    return -u + 0.6 * (2 * np.pi / 48) * (fired @ np.cos(y))[:, None]


def test_strong_order_one_for_additive_noise() -> None:
    """One wave of a nonlinear ring field under noise with one Brownian motion, against 1024 steps on its path.

    The rms errors for 4, 8, .. 64 steps are measured values of an independent program (4000 paths): here with 1000
    paths, whose rms has a relative error of a few per cent.
    """
    base = Schedule.through([], 0.25, 1.0)
    paths = wiener(1000, base, 9)

    def end(halvings: int) -> FloatArray:
        watcher = Steps()
        system = Scalars(np.full(1000, 0.8), amplitude_rate, 0.3)
        integrate(system, base.refined(halvings), paths, [watcher], steps_per_base=2 ** (halvings + 1))
        return watcher.end

    exact = end(8)
    errors = [root_mean_square(end(halvings) - exact) for halvings in range(5)]
    np.testing.assert_allclose(errors, [1.48e-2, 7.21e-3, 3.55e-3, 1.75e-3, 8.6e-4], rtol=0.1)
    for order in observed_orders(errors, [0.25 / 2**halvings for halvings in range(5)]):
        assert 0.9 <= order <= 1.1


def test_a_level_sees_the_same_path_at_any_depth() -> None:
    """Sub-steps that something looks into change the result by rounding only."""
    base = Schedule.through([0.3], 0.125, 1.0)
    ends = []
    for depth in (1, 2, 5):
        watcher = Steps()
        system = Scalars(np.full(8, 0.8), amplitude_rate, 0.3)
        integrate(system, base, wiener(8, base, depth), [watcher], steps_per_base=2)
        assert {len(step.increments) for step in watcher.steps} == {2 ** (depth - 1)}
        ends.append(watcher.end)
    for end in ends[1:]:
        np.testing.assert_allclose(end, ends[0], rtol=0, atol=1e-14)


def test_observers_see_the_noise_between_the_ends() -> None:
    """Without drift the path is the Wiener process itself, whose increments the steps hold."""
    base = Schedule.through([0.3], 0.1, 1.0).refined(1)
    level, watcher = base.refined(1), Steps()
    failed_at = integrate(
        Scalars(np.zeros(3), decay(0.0), 2.0), level, wiener(3, base, 3), [watcher], steps_per_base=4
    )
    assert np.isnan(failed_at).all()
    np.testing.assert_array_equal(watcher.first, np.zeros((3, 1)))
    assert [step.index for step in watcher.steps] == list(range(len(level)))
    np.testing.assert_array_equal([step.t0 for step in watcher.steps], level.times[:-1])
    np.testing.assert_array_equal([step.t1 for step in watcher.steps], level.times[1:])
    everything = np.concatenate([wiener(3, base, 3).base_step(k) for k in range(len(base) // 2)])
    np.testing.assert_array_equal(np.concatenate([step.increments for step in watcher.steps]), everything)
    for step in watcher.steps:
        np.testing.assert_allclose(step.u1 - step.u0, 2.0 * step.increments.sum(axis=0), rtol=0, atol=1e-14)
        np.testing.assert_array_equal(step.state(0.0), step.u0)
        np.testing.assert_array_equal(step.state(1.0), step.u1)
        np.testing.assert_allclose(step.state(0.25), 0.75 * step.u0 + 0.25 * step.u1, rtol=1e-14)
        assert step.length == step.t1 - step.t0


def test_base_lengths_are_those_of_the_doubled_steps() -> None:
    """Spans 0.7, 1.5 and 2.8 with steps of at most 0.3: 2, 3 and 5 doubled steps by hand."""
    schedule = Schedule.through([0.7, 2.2], 0.3, 5.0)
    expected = [0.35] * 2 + [0.5] * 3 + [0.56] * 5
    np.testing.assert_allclose(schedule.base_lengths, expected, rtol=1e-14)
    np.testing.assert_allclose(schedule.base_lengths, np.diff(schedule.refined(-1).times), rtol=1e-14)


@pytest.mark.parametrize("halvings", [-1, 0, 2])
def test_a_drive_that_switches_on_the_schedule_is_exact(halvings: int) -> None:
    """F = 1 before the switch and -2 after: the sides are told apart inside the step, at every level."""
    switch = 0.7
    base = Schedule.through([switch], 0.3, 2.0)
    paths, watcher = wiener(5, base, 3), Steps()

    def rate(t: float, u: FloatArray, inside: float) -> FloatArray:
        assert t < inside
        return np.full_like(u, 1.0 if inside < switch else -2.0)

    system = Scalars(np.zeros(5), rate, 0.5)
    integrate(system, base.refined(halvings), paths, [watcher], steps_per_base=2 ** (halvings + 1))
    ends = sum(paths.base_step(k).sum(axis=0) for k in range(len(base.base_lengths)))
    np.testing.assert_allclose(watcher.end, switch - 2 * (2.0 - switch) + 0.5 * ends[:, 0], atol=1e-14)


def test_a_sample_that_blows_up_is_frozen_and_disturbs_no_other() -> None:
    """u' = u^2 - u: 1e200 overflows in the first step, 1e90 by way of 2.5e179 in the second, 0.5 decays."""
    base = Schedule.through([], 0.25, 2.0)

    def rate(t: float, u: FloatArray, inside: float) -> FloatArray:
        return u**2 - u

    def follow(starts: list[float]) -> tuple[FloatArray, Steps]:
        watcher = Steps()
        system = Scalars(np.array(starts), rate, 0.01)
        found = integrate(system, base, wiener(len(starts), base, 1), [watcher], steps_per_base=2)
        return found, watcher

    failed_at, watcher = follow([0.5, 1e200, 0.5, np.inf, 1e90])
    u = np.stack([step.u1[:, 0] for step in watcher.steps])
    np.testing.assert_array_equal(failed_at, [np.nan, 0.25, np.nan, 0.0, 0.5])
    assert np.isnan(u[:, [1, 3]]).all()
    assert np.isnan(watcher.first[3]).all()
    assert np.isfinite(u[0, 4]).all()
    assert np.isnan(u[1:, 4]).all()
    _, undisturbed = follow([0.5] * 5)
    np.testing.assert_array_equal(u[:, [0, 2]], np.stack([s.u1[:, 0] for s in undisturbed.steps])[:, [0, 2]])


def test_stability_bound_is_where_the_growth_factor_reaches_minus_one() -> None:
    bounds = stability_bound(10.0, np.array([0.0, 1.0]))
    np.testing.assert_allclose(bounds, [20.0, 10.0], rtol=1e-15)
    for gain, bound in zip((0.0, 1.0), bounds, strict=True):
        for factor, grows in ((0.999, False), (1.001, True)):
            step = factor * bound
            schedule, watcher = Schedule.through([], step, 400 * step), Steps()
            system = Scalars(np.ones(400), decay((1 + gain) / 10.0), 0.0)
            integrate(system, schedule, Impulses(200, 2), [watcher], steps_per_base=2)
            assert (np.abs(watcher.end) > 1.0).all() == grows
