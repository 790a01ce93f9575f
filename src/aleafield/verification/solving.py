"""Solve a known problem at a sequence of levels and observe the order."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.runs.model import Choices, field_model, noise_modes
from aleafield.sampling.allocation import Allocation
from aleafield.stepping import euler_maruyama, runge_kutta
from aleafield.stepping.view import AnyStep
from aleafield.study.reading import read_text
from aleafield.verification.problem import KnownProblem, Series

ROUNDING = 1e-12
"""Errors below this are rounding; no order is read off them."""


@dataclass(frozen=True)
class Verdict:
    """What one series showed.

    Attributes
    ----------
    problem : KnownProblem
    series : Series
    errors : tuple of float
        Largest error at each count, under noise of the root mean squares.
    observed_order : float or None
        Between the last two levels; faster than any power: the highest between two neighbours, since the
        error of the time step is soon what is left.  None where errors are rounding.
    passed : bool
    """

    problem: KnownProblem
    series: Series
    errors: tuple[float, ...]
    observed_order: float | None
    passed: bool

    def as_json(self) -> dict[str, Any]:
        """Plain values for the ``--json`` output."""
        return {
            "problem": self.problem.name,
            "projector": self.series.projector,
            "method": self.series.method,
            "quadrature": self.series.quadrature,
            "refined": self.series.refined,
            "counts": list(self.series.counts),
            "errors": list(self.errors),
            "expected_order": self.series.expected_order,
            "observed_order": self.observed_order,
            "passed": self.passed,
        }


class _LastState:
    """An observer that keeps the state at the end of the run."""

    def start(self, t: float, u: FloatArray) -> None:
        self.state = u.copy()

    def step(self, view: AnyStep) -> None:
        self.state = view.u1.copy()

    def result(self) -> tuple[FloatArray, FloatArray | None]:
        return np.zeros(0), None


@dataclass(frozen=True)
class _WholeRun:
    """A source of increments whose one base step is the whole run."""

    increments: FloatArray

    def base_step(self, k: int) -> FloatArray:
        return self.increments.copy()


def solve(problem: KnownProblem, series: Series, count: int) -> float:
    """Largest error at the end of the run, with `count` nodes, points or steps."""
    nodes = count if series.refined == "nodes" else series.nodes
    steps = count if series.refined == "steps" else series.steps
    text = (
        f'title = "{problem.name}"\n{problem.study}\n'
        f'[scheme]\nprojector = "{series.projector}"\nmethod = "{series.method}"\nnodes = {nodes}\n'
        f'quadrature = "{series.quadrature}"\n'
        + (f"quadrature_points = {count}\n" if series.refined == "quadrature points" else "")
        + '[[quantity]]\nname = "mean"\nmeasure = "mean"\n'
    )
    study = read_text(text)
    duration = study.equation.dynamics.duration
    allocation = Allocation("monte carlo", 1, 1)
    choices = Choices(duration / steps, {}, noise_modes(study, allocation))
    model = field_model(study, allocation, choices)
    discretisation, schedule = model.discretisation(model.level), model.schedule()
    equation = study.equation.bind(study.equation.binding({}))
    last = _LastState()
    if problem.noise is None:
        runge_kutta.integrate(discretisation.system(equation, 1), schedule, [last])
        observed = discretisation.space.evaluate(last.state, problem.points)
    else:
        paths = _WholeRun(problem.noise.increments(len(schedule), model.level.modes, duration))
        system = discretisation.system(equation, paths.increments.shape[1])
        euler_maruyama.integrate(system, schedule, paths, [last], steps_per_base=len(schedule))
        fields = discretisation.space.evaluate(last.state, problem.points)
        observed = problem.noise.observed(fields, schedule.longest)
    difference = observed - problem.exact(problem.points)
    return float(np.sqrt(np.mean(difference**2, axis=0)).max())


def _orders(series: Series, errors: tuple[float, ...]) -> list[float]:
    """Order between each level and the next, by their true ratio, as long as neither error is rounding."""
    offset = 1 if series.refined == "nodes" and series.projector == "piecewise linear" else 0
    orders = []
    for (count, error), (finer, smaller) in pairwise(zip(series.counts, errors, strict=True)):
        if min(error, smaller) <= ROUNDING:
            break
        orders.append(float(np.log(error / smaller) / np.log((finer - offset) / (count - offset))))
    return orders


def verdict(problem: KnownProblem, series: Series) -> Verdict:
    """Solve at every count and judge order and last error."""
    errors = tuple(solve(problem, series, count) for count in series.counts)
    orders = _orders(series, errors)
    order = None
    if orders:
        order = orders[-1] if series.expected_order is not None else max(orders)
    passed = errors[-1] <= series.last_error
    if series.expected_order is not None:
        passed = passed and order is not None and abs(order - series.expected_order) <= series.order_tolerance
    return Verdict(problem, series, errors, order, passed)


def verify(problems: tuple[KnownProblem, ...]) -> Iterator[Verdict]:
    """Verdicts of all series of all problems, one after the other."""
    for problem in problems:
        for series in problem.series:
            yield verdict(problem, series)


def table(verdicts: list[Verdict]) -> str:
    """The verdicts as aligned text."""
    header = ("problem", "scheme", "refined", "expected", "observed", "last error", "accepted", "")
    rows = [header]
    for v in verdicts:
        s = v.series
        scheme = f"{s.projector}, {s.method}" + ("" if s.quadrature == "matched" else f", {s.quadrature}")
        expected = "spectral" if s.expected_order is None else f"{s.expected_order:.0f}"
        observed = "rounding" if v.observed_order is None else f"{v.observed_order:.2f}"
        rows.append(
            (
                v.problem.name,
                scheme,
                f"{s.refined} {s.counts[0]}..{s.counts[-1]}",
                expected,
                observed,
                f"{v.errors[-1]:.2e}",
                f"{s.last_error:.2e}",
                "ok" if v.passed else "OFF",
            )
        )
    widths = [max(len(row[i]) for row in rows) for i in range(len(header))]
    return "\n".join(
        "  ".join(cell.ljust(w) for cell, w in zip(row, widths, strict=True)).rstrip() for row in rows
    )
