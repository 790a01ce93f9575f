"""Trajectories known in closed form, shown to observers without any solver."""

from __future__ import annotations

import inspect
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.geometry import Domain, Interval, Ring
from aleafield.quantities import History, Observer, Quantity
from aleafield.spaces import Space, make_space
from aleafield.stepping.view import AnyStep, NoisyStep, StepView

INTERVAL = Interval(-3.0, 4.0)
RING = Ring(7.0)
PAIRS: list[tuple[str, Domain]] = [
    ("piecewise linear", INTERVAL),
    ("piecewise linear", RING),
    ("chebyshev", INTERVAL),
    ("legendre", INTERVAL),
    ("fourier", RING),
]
SMOOTH_PAIRS = [pair for pair in PAIRS if pair[0] != "piecewise linear"]
EPS = float(np.finfo(np.float64).eps)

Result = tuple[FloatArray, FloatArray | None]
Field = Callable[[FloatArray, float], FloatArray]
"""(points (P,), time) -> values (S, P)."""


@dataclass(frozen=True)
class Trajectory:
    """u(x, t) and its derivative by t, as functions of points (P,) and time with values (S, P)."""

    field: Field
    rate: Field


def separable(profile: Callable[[FloatArray], FloatArray], course: np.polynomial.Polynomial) -> Trajectory:
    """course(t) times profile(x) (S, P), with a course that is a polynomial."""
    slope = course.deriv()
    return Trajectory(lambda x, t: course(t) * profile(x), lambda x, t: slope(t) * profile(x))


def smooth_steps(space: Space, trajectory: Trajectory, times: Sequence[float]) -> list[AnyStep]:
    """The steps of a trajectory, interpolated at the nodes."""

    def at(field: Field, t: float) -> FloatArray:
        return space.coefficients(field(space.nodes, t))

    of, rate = trajectory.field, trajectory.rate
    return [StepView(t, at(of, t), at(rate, t), s, at(of, s), at(rate, s)) for t, s in pairwise(times)]


def noisy_steps(space: Space, field: Field, times: Sequence[float]) -> list[AnyStep]:
    """The steps of a path that is known at their ends alone; nobody looks at its noise, and there is none."""
    states = [space.coefficients(field(space.nodes, t)) for t in times]
    still = np.zeros((1, len(states[0]), 1))
    ends = zip(pairwise(times), pairwise(states), strict=True)
    return [NoisyStep(t, u, s, v, index, still) for index, ((t, s), (u, v)) in enumerate(ends)]


def show(observers: Iterable[Observer | History], steps: Sequence[AnyStep]) -> None:
    """The initial state and all steps."""
    for observer in observers:
        observer.start(steps[0].t0, steps[0].u0)
        for step in steps:
            observer.step(step)


def result_of(quantity: Quantity, space: Space, steps: Sequence[AnyStep]) -> Result:
    """The result of a quantity that no noise is told of, shown the steps of a whole run."""
    observer = quantity.observer(space, steps[-1].t1)
    show([observer], steps)
    return observer.result()


def follow(quantity: Quantity, space: Space, trajectory: Trajectory, times: Sequence[float]) -> Result:
    """The result of a quantity's observer that is shown the trajectory, interpolated at the nodes, step by step."""
    return result_of(quantity, space, smooth_steps(space, trajectory, times))


def of_state(quantity: Quantity, space: Space, u: FloatArray) -> Result:
    """The result of a quantity at the end of a run that ends with the unknowns u (S, n)."""
    observer = quantity.observer(space, 1.0)
    observer.start(1.0, u)
    return observer.result()


def of_function(quantity: Quantity, space: Space, values: Callable[[FloatArray], FloatArray]) -> Result:
    """The result of a quantity of the interpolant of a function of points (P,) with values (S, P)."""
    return of_state(quantity, space, space.coefficients(values(space.nodes)))


def random_elements(space: Space, rng: np.random.Generator, samples: int) -> FloatArray:
    """Unknowns (S, n) of random smooth functions: eight waves of random size and phase."""
    waves = np.arange(1, 9)
    size, phase = rng.standard_normal((2, samples, 8, 1))
    angle = 2 * np.pi * waves[:, None] * space.nodes / space.domain.length
    values = (size / waves[:, None] * np.cos(angle + 3 * phase)).sum(axis=1)
    return space.coefficients(values)


def space_of(pair: tuple[str, Domain], n: int) -> Space:
    """The space of dimension n for a pair of projector and domain."""
    return make_space(*pair, n)


def measures() -> dict[str, type[Quantity]]:
    """Every concrete measure by its name."""
    found: dict[str, type[Quantity]] = {}
    waiting: list[type[Quantity]] = [Quantity]
    while waiting:
        one = waiting.pop()
        waiting.extend(one.__subclasses__())
        if not inspect.isabstract(one):
            found[one.measure] = one
    return found
