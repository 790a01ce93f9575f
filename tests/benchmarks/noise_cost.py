"""What the noise of a step costs beside its integral term: ``python -m tests.benchmarks.noise_cost``

512 unknowns and 65 modes, a batch of 256 realizations, one core.  Drawn and coloured: the increments of the modes
for one step of the run's level (a base step halved once) and their product with the projected modes.  Compared with
one application of the integral term, rate and kernel operator.  Both are measured turn by turn in processor time; the
ratio is that of the medians.  Below 1 is what the noise may cost.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.kernels import GaussianKernel
from aleafield.field.noise import GaussianCorrelation, Noise
from aleafield.field.noise_modes import NoiseModes
from aleafield.field.rates import LogisticRate
from aleafield.geometry import Domain, Interval, Ring
from aleafield.projection.discretisation import Discretisation
from aleafield.projection.pairing import resolve
from aleafield.projection.scheme import Scheme
from aleafield.projection.semidiscrete import SemiDiscreteField
from aleafield.randomness.laws import Uniform
from aleafield.randomness.wiener import WienerPaths
from tests.manufactured.problems import lone, term

UNKNOWNS, MODES, BATCH = 512, 65, 256
BASE_STEPS = 64
ROUNDS = 9
APPLICATIONS = 16


@dataclass(frozen=True)
class Case:
    """A domain, its projector, and the width of a Gaussian kernel: certain, or another in each realization."""

    domain: Domain
    projector: str
    width: float | Uniform


CASES = {
    "ring, exact symbol": Case(Ring(20.0), "fourier", 1.0),
    "ring, a symbol for each realization": Case(Ring(20.0), "fourier", Uniform(0.8, 1.2)),
    "interval, one kernel": Case(Interval(-10.0, 10.0), "piecewise linear", 1.0),
    "interval, a kernel for each realization": Case(
        Interval(-10.0, 10.0), "piecewise linear", Uniform(0.8, 1.2)
    ),
}


def prepared(case: Case) -> tuple[Discretisation, SemiDiscreteField]:
    """The level of a case, and its field with a batch bound."""
    equation = FieldEquation(
        case.domain,
        lone(GaussianKernel(1.5, case.width)),
        LogisticRate(5.0, 0.3),
        Dynamics(10.0, 60.0),
        term("0"),
        term("0"),
        noise=Noise(0.02, GaussianCorrelation(0.5)),
    )
    pairing = resolve(Scheme(case.projector, "collocation", UNKNOWNS), equation)  # type: ignore[arg-type]
    level = Level(pairing.nodes, pairing.quadrature_points, modes=MODES)
    ring = NoiseModes(MODES, case.domain.length * (1 if case.domain.periodic else 2), 1e-4, 0.0)
    discretisation = Discretisation(equation, level, pairing, ring)
    inputs = {one.path: np.linspace(*one.law.support, BATCH) for one in equation.uncertain()}
    return discretisation, discretisation.system(equation.bind(equation.binding(inputs)), BATCH)


def seconds(work: Callable[[], object]) -> float:
    """Processor time of a piece of work."""
    start = time.process_time()
    work()
    return time.process_time() - start


def costs(system: SemiDiscreteField, u: FloatArray) -> tuple[float, float, float]:
    """Medians, in seconds for a step of the batch: drawing, colouring, one application of the integral term."""
    increments = np.random.default_rng(1).standard_normal((BATCH, MODES))

    def draw() -> None:
        numbers = np.arange(BATCH)
        paths = WienerPaths(1, numbers, np.zeros_like(numbers), MODES, np.full(BASE_STEPS, 1.0), 1)
        for k in range(BASE_STEPS):
            paths.base_step(k)

    def colour() -> None:
        for _ in range(APPLICATIONS):
            system.noise(increments)

    def integrate() -> None:
        for _ in range(APPLICATIONS):
            system._integral.of(u)

    rounds = [[seconds(work) for work in (draw, colour, integrate)] for _ in range(ROUNDS)]
    drawn, coloured, integral = np.median(rounds, axis=0)
    return drawn / (2 * BASE_STEPS), coloured / APPLICATIONS, integral / APPLICATIONS


def main() -> None:
    """Print the table: nanoseconds for an unknown of a realization, and for a number drawn."""
    print(f"{UNKNOWNS} unknowns, {MODES} modes, {BATCH} realizations; ns for an unknown and step")
    print(f"{'':42}{'operator':>16}{'draw':>8}{'colour':>8}{'integral':>10}{'ratio':>7}{'ns a number':>13}")
    for name, case in CASES.items():
        discretisation, system = prepared(case)
        u = 0.3 + 0.2 * np.random.default_rng(2).standard_normal((BATCH, discretisation.space.n))
        drawn, coloured, integral = costs(system, u)
        unit = 1e9 / u.size
        print(
            f"{name:42}{discretisation.operator_choice.name:>16}{drawn * unit:8.2f}{coloured * unit:8.2f}"
            f"{integral * unit:10.2f}{(drawn + coloured) / integral:7.2f}{drawn * 1e9 / (BATCH * MODES):13.1f}",
            flush=True,
        )


if __name__ == "__main__":
    main()
