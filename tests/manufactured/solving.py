"""Solve a certain equation at a level and look at the end of the run."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.field.equation import FieldEquation
from aleafield.projection.discretisation import Discretisation
from aleafield.projection.pairing import Pairing, resolve
from aleafield.projection.scheme import Scheme
from aleafield.spaces import Space
from aleafield.stepping.runge_kutta import integrate
from aleafield.stepping.schedule import Schedule
from aleafield.stepping.view import StepView


class Final:
    """Observer that keeps the last state (S, n)."""

    u: FloatArray

    def start(self, t: float, u: FloatArray) -> None:
        """The initial state."""
        self.u = u

    def step(self, view: StepView) -> None:
        """The end of the step."""
        self.u = view.u1


@dataclass(frozen=True)
class Solution:
    """The elements of a batch of 8 at the end of a run."""

    space: Space
    u: FloatArray

    def at(self, x: FloatArray) -> FloatArray:
        """Values (P,) of the first sample at points (P,)."""
        return self.each(x)[0]

    def each(self, x: FloatArray) -> FloatArray:
        """Values (8, P) of all samples at points (P,)."""
        return self.space.evaluate(self.u, np.asarray(x, dtype=np.float64))


def solve_level(
    equation: FieldEquation,
    pairing: Pairing,
    level: Level,
    time_step: float,
    times: tuple[float, ...] = (),
    inputs: Mapping[str, FloatArray] | None = None,
) -> Solution:
    """Run an equation at a level for 8 samples, which differ by `inputs`; `times` lie on the schedule."""
    discretisation = Discretisation(equation, level, pairing)
    bound = equation.bind(equation.binding(inputs or {}))
    schedule = Schedule.through(times, time_step, equation.dynamics.duration).refined(level.halvings)
    final = Final()
    failed_at = integrate(discretisation.system(bound, 8), schedule, [final])
    assert np.all(np.isnan(failed_at))
    return Solution(discretisation.space, final.u)


def solve(
    equation: FieldEquation,
    projector: str,
    method: str,
    nodes: int,
    time_step: float,
    quadrature: str = "matched",
    quadrature_points: int | None = None,
    inputs: Mapping[str, FloatArray] | None = None,
) -> Solution:
    """Run an equation under a scheme for 8 samples, which differ by `inputs`."""
    scheme = Scheme(projector, method, nodes, quadrature, quadrature_points)  # type: ignore[arg-type]
    pairing = resolve(scheme, equation)
    assert pairing.nodes == nodes, "the test must ask for an admissible count"
    return solve_level(
        equation, pairing, Level(pairing.nodes, pairing.quadrature_points), time_step, (), inputs
    )


def eight_shifts(panel: float) -> dict[str, FloatArray]:
    """Shifts of the start, spread evenly over a panel."""
    return {"initial.shift": panel * (np.arange(8) + 0.3) / 8}


def root_mean_square(values: FloatArray) -> float:
    """Square root of the mean square."""
    return float(np.sqrt(np.mean(np.square(values))))


def dense_points(low: float, high: float, n: int = 4001) -> FloatArray:
    """Equally spaced points for sup norms, both ends included."""
    return np.linspace(low, high, n)
