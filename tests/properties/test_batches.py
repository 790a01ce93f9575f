"""A sample's result depends on the sample alone: not on batch width, order, or a neighbour that fails."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.kernels import (
    Connectivity,
    CosineKernel,
    ExponentialKernel,
    FormulaKernel,
    GaussianKernel,
)
from aleafield.field.rates import FormulaRate, LogisticRate, StepRate
from aleafield.geometry import Interval, Ring
from aleafield.projection.discretisation import Discretisation
from aleafield.projection.pairing import resolve
from aleafield.projection.scheme import Scheme
from aleafield.randomness.laws import Uniform
from aleafield.stepping.runge_kutta import integrate
from aleafield.stepping.schedule import Schedule
from tests.manufactured.problems import lone, term
from tests.manufactured.solving import Final

INTERVAL, RING = Interval(-5.0, 5.0), Ring(10.0)
CERTAIN = Connectivity({"up": GaussianKernel(1.4, 1.0), "down": ExponentialKernel(-0.9, 2.0)})
UNCERTAIN = Connectivity({"up": GaussianKernel(1.4, Uniform(0.5, 1.5)), "down": GaussianKernel(-0.9, 2.0)})
SMOOTH, STEP = LogisticRate(Uniform(4.0, 9.0), 0.3), StepRate(Uniform(0.1, 0.4))


CLOSED = "closed between crossings"


@dataclass(frozen=True)
class Case:
    """One path through projector, rule and operator."""

    kernel: Connectivity
    rate: LogisticRate | StepRate
    projector: str
    method: str
    nodes: int
    operator: str
    ring: bool = False
    quadrature: str = "matched"
    doubled: bool = False

    def equation(self) -> FieldEquation:
        """With uncertain rate, drive, start and time constant."""
        return FieldEquation(
            RING if self.ring else INTERVAL,
            self.kernel,
            self.rate,
            Dynamics(Uniform(5.0, 15.0), 8.0),
            term("a*exp(-x**2/2)*(t < 5) + 0.1*cos(t)", {"a": Uniform(0.0, 1.0)}),
            term("0.4*exp(-x**2/s)", {"s": Uniform(0.5, 3.0)}),
        )


CASES = [
    Case(CERTAIN, SMOOTH, "piecewise linear", "collocation", 129, "shared dense"),
    Case(CERTAIN, SMOOTH, "piecewise linear", "collocation", 513, "toeplitz"),
    Case(UNCERTAIN, SMOOTH, "piecewise linear", "collocation", 257, "toeplitz"),
    Case(UNCERTAIN, SMOOTH, "piecewise linear", "galerkin", 129, "toeplitz"),
    Case(UNCERTAIN, SMOOTH, "piecewise linear", "galerkin", 66, "circulant", ring=True, doubled=True),
    Case(CERTAIN, SMOOTH, "piecewise linear", "galerkin", 65, "shared dense", quadrature="simpson"),
    Case(UNCERTAIN, SMOOTH, "chebyshev", "collocation", 33, "dense per sample"),
    Case(UNCERTAIN, SMOOTH, "legendre", "galerkin", 32, "dense per sample", doubled=True),
    Case(CERTAIN, SMOOTH, "legendre", "galerkin", 32, "shared dense", quadrature="trapezoid"),
    Case(UNCERTAIN, SMOOTH, "fourier", "collocation", 128, "exact symbol", ring=True),
    Case(UNCERTAIN, SMOOTH, "fourier", "galerkin", 63, "exact symbol", ring=True, doubled=True),
    Case(UNCERTAIN, SMOOTH, "fourier", "collocation", 64, "circulant", ring=True, quadrature="trapezoid"),
    Case(CERTAIN, STEP, "piecewise linear", "collocation", 257, "shared dense"),
    Case(UNCERTAIN, STEP, "fourier", "collocation", 64, "circulant", ring=True),
    Case(lone(FormulaKernel(term("exp(-abs(x - y))"))), STEP, "chebyshev", "collocation", 33, "shared dense"),
    Case(lone(CosineKernel((0.0, Uniform(0.1, 0.3)))), STEP, "fourier", "galerkin", 32, CLOSED, ring=True),
]


def draw(equation: FieldEquation, samples: int = 64) -> dict[str, FloatArray]:
    """Uniform inputs by path, fixed."""
    random = np.random.default_rng(3)
    return {
        one.path: one.law.support[0] + (one.law.support[1] - one.law.support[0]) * random.random(samples)
        for one in equation.uncertain()
    }


def run(
    equation: FieldEquation,
    discretisation: Discretisation,
    inputs: Mapping[str, FloatArray],
    step: float = 1.0,
) -> tuple[FloatArray, FloatArray]:
    """Final unknowns (S, n) and times of failure (S,)."""
    size = len(next(iter(inputs.values())))
    bound = equation.bind(equation.binding(inputs))
    final = Final()
    schedule = Schedule.through([5.0], step, equation.dynamics.duration)
    failed_at = integrate(discretisation.system(bound, size), schedule, [final])
    return final.u, failed_at


def prepared(case: Case) -> tuple[FieldEquation, Discretisation]:
    """The equation and its discretisation at the case's level."""
    equation = case.equation()
    scheme = Scheme(case.projector, case.method, case.nodes, case.quadrature)  # type: ignore[arg-type]
    pairing = resolve(scheme, equation)
    counts = pairing.nodes, pairing.quadrature_points
    points = pairing.refined(*counts)[1] if case.doubled else counts[1]
    return equation, Discretisation(equation, Level(pairing.nodes, points), pairing)


@pytest.mark.parametrize("case", CASES, ids=lambda c: f"{c.projector}-{c.method}-{c.operator}-{c.nodes}")
def test_rows_do_not_depend_on_the_batch(case: Case) -> None:
    equation, discretisation = prepared(case)
    assert discretisation.operator_choice.name == case.operator
    inputs = draw(equation)
    whole, failed_at = run(equation, discretisation, inputs)
    assert np.all(np.isfinite(whole))
    assert np.all(np.isnan(failed_at))
    assert len(np.unique(whole[:, 0])) == 64, "the samples must differ for the test to mean anything"
    for width in (8, 16):
        parts = [
            run(equation, discretisation, {k: v[i : i + width] for k, v in inputs.items()})[0]
            for i in range(0, 64, width)
        ]
        np.testing.assert_array_equal(np.concatenate(parts), whole)
    order = np.random.default_rng(5).permutation(64)
    shuffled, _ = run(equation, discretisation, {k: v[order] for k, v in inputs.items()})
    np.testing.assert_array_equal(shuffled, whole[order])


@pytest.mark.parametrize("projector", ["piecewise linear", "chebyshev"])
def test_a_sample_that_blows_up_disturbs_no_other(projector: str) -> None:
    """u' = -u + 2 u^3 from a: 1/u^2 = 2 + (1/a^2 - 2) exp(2 t), infinite in finite time for a > 0.71.

    The batch goes on, the failure has its time, and nothing is printed (warnings are errors here).
    """
    equation = FieldEquation(
        Interval(0.0, 2.0),
        lone(FormulaKernel(term("1"))),
        FormulaRate(term("u**3")),
        Dynamics(1.0, 6.0),
        initial=term("a", {"a": Uniform(0.0, 2.0)}),
    )
    pairing = resolve(Scheme(projector, "collocation", 17), equation)  # type: ignore[arg-type]
    discretisation = Discretisation(equation, Level(pairing.nodes, pairing.quadrature_points), pairing)
    start = np.array([0.1, 0.9, 0.2, 0.3, 1.5, 0.5, 0.6, 0.65])
    exploding = start > np.sqrt(0.5)
    u, failed_at = run(equation, discretisation, {"initial.a": start}, step=0.05)
    np.testing.assert_array_equal(np.isfinite(failed_at), exploding)
    assert np.all(np.isnan(u[exploding]))
    blow_up = -0.5 * np.log(1 - 0.5 / start[exploding] ** 2)
    # an explicit method passes the singularity before its numbers overflow: no earlier, and within 20 steps
    assert np.all((failed_at[exploding] > blow_up - 0.05) & (failed_at[exploding] < blow_up + 1.0))
    exact = 1 / np.sqrt(2 + (1 / start[~exploding] ** 2 - 2) * np.exp(12.0))
    np.testing.assert_allclose(u[~exploding], np.tile(exact[:, None], 17), rtol=1e-4)
    calm = np.where(exploding, 0.1, start)
    undisturbed, _ = run(equation, discretisation, {"initial.a": calm}, step=0.05)
    np.testing.assert_array_equal(u[~exploding], undisturbed[~exploding])


def test_a_prepared_level_pickles() -> None:
    import pickle

    equation, discretisation = prepared(CASES[0])
    inputs = draw(equation, 8)
    again = pickle.loads(pickle.dumps(discretisation))
    np.testing.assert_array_equal(run(equation, again, inputs)[0], run(equation, discretisation, inputs)[0])
