"""Laws of bridged extremes and first passages, with the paths, the stepper and the uniform numbers of a run.

Closed forms: the reflection principle, P(max of W over [0, t] > c) = 2 (1 - Phi(c / sqrt t)), which is also
the probability of a first passage before t (Levy 1939); with a drift, Borodin and Salminen, "Handbook of Brownian
motion", part II, 2.1.1.4; the mean first passage of an Ornstein-Uhlenbeck process: Siegert 1951, Ricciardi and
Sato 1988 (all from memory).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import ndtr, ndtri

from aleafield.arrays import FloatArray
from aleafield.geometry import Interval
from aleafield.quantities import History, Mean, Over, Quantity, TimeToLevel, Value
from aleafield.quantities.bridge import Bridges
from aleafield.randomness.wiener import PathUniforms, WienerPaths
from aleafield.spaces import make_space
from aleafield.stepping.euler_maruyama import integrate
from aleafield.stepping.schedule import Schedule

SPACE = make_space("piecewise linear", Interval(0.0, 1.0), 3)
FALSE_ALARM = 1e-5
"""Chance that a test of a law fails although the law is right."""


@dataclass(frozen=True)
class Process:
    """du = drift(u) dt + strength dW for fields that are constant in space; W is a sum of two modes.

    It is the system that is stepped, and what bridges know of its noise.

    Attributes
    ----------
    drift : callable
    strength : float or array (S, 1)
    start : float array (S,)
    steps : int
        Of the study, even.
    time_step : float
    seed : int
    halvings, finest : int
        Of the level, and of the finest level whose sub-steps are bridged.
    """

    drift: Callable[[FloatArray], FloatArray]
    strength: float | FloatArray
    start: FloatArray
    steps: int
    time_step: float
    seed: int
    halvings: int = 0
    finest: int = 1
    restarts: bool = False

    @property
    def duration(self) -> float:
        return self.steps * self.time_step

    @property
    def sub_steps(self) -> int:
        return int(2 ** (self.finest + 1))

    @property
    def steps_per_base(self) -> int:
        return int(2 ** (self.halvings + 1))

    def initial(self) -> FloatArray:
        return np.repeat(self.start[:, None], SPACE.n, axis=1)

    def rate_of_change(self, t: float, u: FloatArray, inside: float | None = None) -> FloatArray:
        return np.array(self.drift(u))

    def _of_modes(self) -> FloatArray:
        return np.asarray(self.strength * np.array([0.6, 0.8]))

    def noise(self, increments: FloatArray) -> FloatArray:
        total = (increments * self._of_modes()).sum(axis=-1)
        return np.repeat(total[:, None], SPACE.n, axis=1)

    def along(self, functional: FloatArray) -> FloatArray:
        return np.asarray(self._of_modes() * functional.sum())

    def uniforms(self, name: str) -> PathUniforms:
        return PathUniforms(self.seed, f"bridge of {name}", *self._realizations())

    def _realizations(self) -> tuple[np.ndarray[tuple[int], np.dtype[np.int64]], ...]:
        count = len(self.start)
        return np.arange(count, dtype=np.int64), np.zeros(count, dtype=np.int64)

    def follow(self, *quantities: Quantity) -> list[FloatArray]:
        """Values (S,) of the quantities, and after them the process (S, K + 1) at the ends of the K steps."""
        schedule = Schedule.through([], self.time_step, self.duration)
        assert len(schedule) == self.steps
        samples, repeats = self._realizations()
        paths = WienerPaths(self.seed, samples, repeats, 2, schedule.base_lengths, self.finest + 1)
        steps = schedule.refined(self.halvings)
        observers = [q.observer(SPACE, self.duration, self) for q in quantities]
        ends = History(lambda u, t: u[:, 0], steps.times.tolist())
        integrate(self, steps, paths, [*observers, ends], self.steps_per_base)
        return [*(observer.result()[0] for observer in observers), ends.values]

    def at_level(self, halvings: int) -> Process:
        return replace(self, halvings=halvings)


def farthest(values: FloatArray, law: Callable[[FloatArray], FloatArray], up_to: float) -> float:
    """Largest difference between the share of values <= x and the law P(X <= x), over x <= up_to; NaN is late."""
    below = np.sort(values[values <= up_to])
    shares = np.arange(len(below) + 1) / len(values)
    stated = np.append(law(below), law(np.array([up_to])))
    return float(
        max(np.abs(shares - stated).max(), np.abs(shares[:-1] - stated[:-1] + 1 / len(values)).max())
    )


def dkw(count: int) -> float:
    """Bound of that difference at the false alarm: Dvoretzky, Kiefer and Wolfowitz, with Massart's constant."""
    return float(np.sqrt(np.log(2.0 / FALSE_ALARM) / (2.0 * count)))


COUNT = 20_000
SIZES = np.random.default_rng(2).uniform(0.5, 3.0, (COUNT, 1))


def still(u: FloatArray) -> FloatArray:
    return np.zeros_like(u)


@pytest.mark.parametrize("finest", [-1, 1])
def test_extremes_of_a_wiener_process_over_one_coarse_step(finest: int) -> None:
    """One step of length 0.8, in one part and in four; the strength differs from path to path."""
    process = Process(still, SIZES, np.zeros(COUNT), 2, 0.4, 11, -1, finest)
    most, least, ends = process.follow(
        Value("most", 0.5, Over(0.0, 0.8, "maximum")), Mean("least", Over(0.0, 0.8, "minimum"))
    )

    def reflected(c: FloatArray) -> FloatArray:
        return 2.0 * ndtr(c / np.sqrt(0.8)) - 1.0

    scaled = most / SIZES[:, 0], -least / SIZES[:, 0]
    assert ends.shape == (COUNT, 2)
    for extreme in scaled:
        assert farthest(extreme, reflected, np.inf) <= dkw(COUNT)
    assert farthest(ends.max(axis=1) / SIZES[:, 0], reflected, np.inf) >= 0.4, (
        "half the paths end below the start"
    )


@pytest.mark.parametrize("finest", [-1, 1])
@pytest.mark.parametrize("drift", [0.0, 0.9, -0.6])
def test_first_passages_of_a_wiener_process_with_a_drift(drift: float, finest: int) -> None:
    """Two coarse steps of length 1/2; a constant drift is exact under Euler-Maruyama."""
    process = Process(lambda u: np.full_like(u, drift), 1.3, np.full(COUNT, -0.2), 4, 0.25, 12, -1, finest)
    c, mu = 0.9 / 1.3, drift / 1.3

    def passed(t: FloatArray) -> FloatArray:
        root = np.sqrt(t)
        return ndtr((mu * t - c) / root) + np.exp(2 * mu * c) * ndtr(-(c + mu * t) / root)

    found, _ = process.follow(TimeToLevel("passage", 0.7, 0.5))
    assert farthest(found, passed, 1.0) <= dkw(COUNT)


@pytest.mark.parametrize("end", [0.4, 1.0, 1.7])
def test_the_time_of_a_passage_between_known_ends(end: float) -> None:
    """From 0 to the end within d = 1, over the level 1, v = 1.2: the density of the first passage is, up to a
    constant, t^(-3/2) (1 - t)^(-1/2) exp(-1 / (2 v t) - (1 - end)^2 / (2 v (1 - t))), integrated numerically."""
    draws = np.random.default_rng(13).random((2, COUNT))
    ends = np.array([[0.0], [end]]) * np.ones(COUNT)
    certain = Bridges(ends, np.asarray(1.2), np.full((1, COUNT), 1e-9), draws)
    found = certain.first_reach(np.ones(COUNT))

    def density(s: float) -> float:
        """By s with t = 1 - s^2, which takes the root away."""
        t = 1.0 - s * s
        if t <= 0.0:
            return 0.0
        return float(2 * t**-1.5 * np.exp(-1 / (2.4 * t) - (1 - end) ** 2 / (2.4 * max(s * s, 1e-300))))

    whole = quad(density, 0.0, 1.0)[0]
    at = np.linspace(0.02, 0.98, 49)
    stated = np.array([quad(density, np.sqrt(1 - t), 1.0)[0] for t in at]) / whole
    shares = (found[:, None] <= at).mean(axis=0)
    assert np.abs(shares - stated).max() <= dkw(COUNT)


def mean_passage(start: float, level: float) -> float:
    """Of du = -u dt + sqrt(2) dW from start to level: Siegert's double integral, the inner one by Phi."""
    return float(quad(lambda z: np.sqrt(2 * np.pi) * np.exp(z * z / 2) * ndtr(z), start, level)[0])


START, TOP, PATHS = -0.5, 0.0, 12_000
OVERSHOOT = 0.5826
"""-zeta(1/2) / sqrt(2 pi): how far a walk jumps over a level, in standard deviations of a step."""


@pytest.mark.parametrize("halvings", [-1, 0, 1])
def test_the_mean_first_passage_of_an_ornstein_uhlenbeck_process(halvings: int) -> None:
    """With bridges the bias is of order h, and seen at the ends of steps it is of order sqrt(h).

    The values of Euler-Maruyama at the ends of steps are exactly an Ornstein-Uhlenbeck process, of rate
    k = -ln(1 - h) / h and variance v = 1 / (1 - h / 2): its mean first passage is that of start and level over
    sqrt(v), divided by k.  Inside its steps the local variance is 2 k v and not 2, which is an overshoot wrong by
    that share of itself.  Seen at ends, a level is passed as a level higher by the overshoot is without steps
    (Siegmund 1979; Broadie, Glasserman and Kou 1997, Mathematical Finance 7; from memory), up to order h.
    Of 12,000 paths one or none is still below after 14 units of time (the slowest rate is 1).
    """
    process = Process(lambda u: -u, np.sqrt(2.0), np.full(PATHS, START), 224, 1 / 16, 14).at_level(halvings)
    h = process.duration / process.steps / 2.0**halvings
    bridged, ends = process.follow(TimeToLevel("passage", TOP, 0.5))
    late = np.isnan(bridged).sum()
    assert late <= 1
    exact = mean_passage(START, TOP)
    k, v = -np.log1p(-h) / h, 1.0 / (1.0 - h / 2.0)
    jump = OVERSHOOT * np.sqrt(2.0 * h)
    inside = mean_passage(TOP, TOP + jump * (np.sqrt(k * v) - 1.0))
    of_order_h = abs(mean_passage(START / np.sqrt(v), TOP) / k - exact) + inside
    sampling = -ndtri(FALSE_ALARM / 2) * np.nanstd(bridged) / np.sqrt(PATHS)
    assert abs(np.nanmean(bridged) - exact) <= sampling + of_order_h
    above = ends >= TOP
    seen = h * above.argmax(axis=1)[above.any(axis=1)]
    expected = mean_passage(START, TOP + jump) - exact
    assert expected > 2 * (sampling + of_order_h), "the two can be told apart"
    assert abs(seen.mean() - exact - expected) <= sampling + of_order_h + h / 2


def test_coarse_and_fine_see_the_same_maximum() -> None:
    """Strong order 1 in the step, and none where the levels do not share the uniform numbers of the bridges.

    The field is constant in space: its values at two points are equal, but not the uniform numbers of their
    bridges.  An rms of 4,000 has a relative error of about 3 %, the order an error of 0.06.
    """
    process = Process(lambda u: -u - np.sin(3 * u), 1.0, np.zeros(4000), 32, 1 / 32, 15)
    window = Over(0.0, 1.0, "maximum")
    shared, other = Value("most", 0.5, window), Value("most", 0.25, window)

    def rms(coarse: int, of_fine: Quantity) -> float:
        differences = (
            process.at_level(coarse).follow(shared)[0] - process.at_level(coarse + 1).follow(of_fine)[0]
        )
        return float(np.sqrt(np.mean(differences**2)))

    assert np.log2(rms(-1, shared) / rms(0, shared)) >= 0.8
    assert np.log2(rms(-1, other) / rms(0, other)) <= 0.5
