"""Expected and observed orders of every pair of projector and quadrature: the rows of docs/orders.md."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.errors import InputError
from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.kernels import ExponentialKernel, GaussianKernel
from aleafield.field.rates import StepRate
from aleafield.geometry import Domain, Refinement
from aleafield.projection.expectation import Expected
from aleafield.projection.pairing import Pairing, resolve
from aleafield.projection.path import width_ratio
from aleafield.projection.scheme import METHODS, PROJECTORS, QUADRATURES, Scheme
from tests.manufactured.problems import (
    CIRCLE,
    SHIFTED,
    SYMMETRIC,
    Problem,
    analytic,
    exponential_wave,
    gaussian_wave,
    kinked_kernel,
    lone,
    term,
)
from tests.manufactured.solving import root_mean_square, solve_level

STEPS = {True: 1 / 64, False: 1 / 16}
"""Time step under spectral and other projectors; its error, below 1e-9 and 1e-7, is in "all" only."""
FLOOR = 1e-12
"""Differences below are rounding."""
FLOOR_ALL = 1e-9
FAST = 6.0
"""Observed orders above are shown as "> 6"."""


@dataclass(frozen=True)
class Case:
    """A kernel and a rate on a domain, with the solution where it is known."""

    name: str
    equation: FieldEquation
    problem: Problem | None
    smooth: bool


def _known(name: str, problem: Problem, smooth: bool) -> Case:
    return Case(name, problem.equation, problem, smooth)


def _step(name: str, domain: Domain, kernel: GaussianKernel | ExponentialKernel, smooth: bool) -> Case:
    """A patch of activity whose edges move; eight samples spread the edges over a panel and more.

    Two edges on the ring, near 1.2 and -1.2; on the interval near 0.6 and -0.6.
    """
    start = "cos(x - shift)" if domain.periodic else "cos(2*(x - shift))"
    equation = FieldEquation(
        domain,
        lone(kernel),
        StepRate(0.4),
        Dynamics(1.0, 1.0),
        term("0.3*sin(shift + t)", {"shift": SHIFTED}),
        term(start, {"shift": SHIFTED}),
    )
    return Case(name, equation, None, smooth)


CASES: dict[str, tuple[Case, ...]] = {
    "interval": (
        _known("smooth kernel", analytic(), True),
        _known("kinked kernel", kinked_kernel(), False),
        _step("smooth kernel, step rate", SYMMETRIC, GaussianKernel(1.0, 0.5), True),
    ),
    "ring": (
        _known("smooth kernel", gaussian_wave(), True),
        _known("kinked kernel", exponential_wave(), False),
        _step("smooth kernel, step rate", CIRCLE, GaussianKernel(1.0, 0.5), True),
    ),
}
DOMAINS: dict[str, Domain] = {"interval": SYMMETRIC, "ring": CIRCLE}


@dataclass(frozen=True)
class Refused:
    """A pair that makes no sense."""

    domain: str
    projector: str
    method: str
    quadrature: str
    error: InputError


@dataclass(frozen=True)
class Observed:
    """An observed order; None where nothing is left to observe."""

    order: float | None

    @property
    def text(self) -> str:
        """For the table, with one decimal."""
        if self.order is None:
            return "rounding"
        return "> 6" if self.order > FAST else f"{self.order:.1f}"


@dataclass(frozen=True)
class Row:
    """One pair under one kernel and rate."""

    domain: str
    projector: str
    method: str
    quadrature: str
    case: str
    expected_space: Expected
    space: Observed
    expected_quadrature: Expected
    integral: Observed
    whole: Observed | None
    error: float | None


def _first_counts(pairing: Pairing, case: Case) -> tuple[int, int]:
    """Nodes of the coarsest level and number of levels."""
    if pairing.projector == "piecewise linear":
        return (17 if not pairing.domain.periodic else 16), 3
    if not case.smooth or pairing.quadrature.order is not None:
        return {"chebyshev": 17, "legendre": 16, "fourier": 16}[pairing.projector], 4
    return {"chebyshev": 5, "legendre": 4, "fourier": 12}[pairing.projector], 3


def _slope(sizes: Sequence[float], widths: Sequence[float], floor: float) -> Observed:
    """Order from the first level to the last one that is not lost in rounding (at least to the second)."""
    seen = next((i for i, size in enumerate(sizes) if size <= floor), len(sizes))
    if seen == 0:
        return Observed(None)
    last = max(seen - 1, 1)
    ratio = sizes[0] / max(sizes[last], floor)
    return Observed(float(np.log(ratio) / np.log(widths[0] / widths[last])))


def _widths(refinement: Refinement, counts: Sequence[int]) -> list[float]:
    """Mesh widths relative to the first."""
    return [1.0 / width_ratio(refinement, counts[0], count) for count in counts]


def measure(domain: str, scheme: Scheme, case: Case) -> Row:
    """Observed orders along the path of levels: points doubled, the space held; then the space refined."""
    pairing = resolve(scheme, case.equation)
    nodes, levels = _first_counts(pairing, case)
    pairing = resolve(Scheme(scheme.projector, scheme.method, nodes, scheme.quadrature), case.equation)
    low, length = pairing.domain.low, pairing.domain.length
    # multiples of the golden section: every place within an element is met equally often, at every level
    x = low + length * ((np.arange(512) * 0.6180339887498949 + 0.1) % 1.0)
    inputs = {"initial.shift": np.arange(8) / 64, "drive.shift": np.arange(8) / 8}

    step = STEPS[scheme.projector != "piecewise linear"]

    def field(n: int, q: int) -> FloatArray:
        used = inputs if case.problem is None else None
        return solve_level(case.equation, pairing, Level(n, q), step, (), used).each(x)

    counts = [(pairing.nodes, pairing.quadrature_points)]
    while len(counts) <= levels:
        counts.append(pairing.refined(*counts[-1]))
    space, quadrature, errors = [], [], []
    for (n, q), (finer_n, finer_q) in itertools.pairwise(counts):
        run, more_points, finer = field(n, q), field(n, finer_q), field(finer_n, finer_q)
        quadrature.append(root_mean_square(run - more_points))
        space.append(root_mean_square(more_points - finer))
        if case.problem is not None:
            errors.append(root_mean_square(run[0] - case.problem.exact(x, case.equation.dynamics.duration)))
    n_widths = _widths(pairing.node_refinement, [n for n, _ in counts])
    q_widths = _widths(pairing.point_refinement, [q for _, q in counts])
    known = case.problem is not None
    return Row(
        domain,
        scheme.projector,
        scheme.method,
        scheme.quadrature,
        case.name,
        pairing.space,
        _slope(space, n_widths, FLOOR),
        pairing.quadrature,
        _slope(quadrature, q_widths, FLOOR),
        _slope(errors, n_widths, FLOOR_ALL) if known else None,
        errors[-1] if known else None,
    )


def all_pairs() -> list[tuple[str, Scheme]]:
    """Every domain, projector, method and quadrature that a study file can name."""
    return [
        (domain, Scheme(projector, method, 65, quadrature))
        for domain, projector, method, quadrature in itertools.product(
            DOMAINS, PROJECTORS, METHODS, QUADRATURES
        )
    ]


def sort_pairs() -> tuple[list[tuple[str, Scheme, Case]], list[Refused]]:
    """Pairs that are allowed, with their cases, and pairs that are refused for every kernel and rate."""
    allowed: list[tuple[str, Scheme, Case]] = []
    refused: list[Refused] = []
    for domain, scheme in all_pairs():
        errors = []
        for case in CASES[domain]:
            try:
                resolve(scheme, case.equation)
            except InputError as error:
                errors.append(error)
            else:
                allowed.append((domain, scheme, case))
        if len(errors) == len(CASES[domain]):
            refused.append(Refused(domain, scheme.projector, scheme.method, scheme.quadrature, errors[0]))
    return allowed, refused
