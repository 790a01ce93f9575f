"""[scheme]: how the field is projected, integrated over space and stepped through time."""

from __future__ import annotations

import dataclasses
from typing import cast

from aleafield.errors import InputError
from aleafield.field.equation import FieldEquation
from aleafield.field.kernels import Connectivity
from aleafield.geometry import Domain
from aleafield.operators import LatticePair
from aleafield.projection.pairing import Pairing, resolve
from aleafield.projection.scheme import METHODS, PROJECTORS, QUADRATURES, Method, Projector, Scheme
from aleafield.projection.smoothness import typical
from aleafield.quadrature import make_rule
from aleafield.study.reading.table import Table, not_built_yet

MOST_NODES = 1_000_000
MOST_STEPS = 100_000_000
MOST_MATRIX = 1 << 26
"""Numbers in the kernel matrices of the smallest batch at the finest level of the error split: half a GiB,
and about four times as much while they are made."""
BATCH = 8
"""Samples of the smallest batch."""
POINTS_PER_PANEL = {"simpson": 2, "composite gauss": 2}
"""Quadrature points to a panel end, of the rules that do not have one."""


def _default_nodes(projector: str, domain: Domain) -> int:
    if projector == "piecewise linear":
        return 256 if domain.periodic else 257
    return {"chebyshev": 33, "legendre": 32, "fourier": 256}[projector]


def read_scheme(table: Table, domain: Domain, duration: float) -> Scheme:
    """The scheme, with the defaults of the domain and the projector for what is left out.

    Whether projector, method and quadrature go together is for `projection.pairing` to say.

    Raises
    ------
    InputError
        For unknown words, counts that are no whole numbers, and a time step that is not positive.
    """
    table.only(("projector", "method", "nodes", "quadrature", "quadrature_points", "time_step"), "[scheme]")
    usual = "fourier" if domain.periodic else "piecewise linear"
    projector = cast(Projector, table.choice("projector", PROJECTORS, usual))
    method = cast(
        Method, table.choice("method", METHODS, "galerkin" if projector == "legendre" else "collocation")
    )
    if table.value("nodes", None) == "auto":
        raise not_built_yet(table.key("nodes"), "'auto'", "give a number of nodes for now")
    nodes = table.integer("nodes", _default_nodes(projector, domain), least=1, most=MOST_NODES)
    quadrature = table.choice("quadrature", QUADRATURES, "matched")
    points = None
    if "quadrature_points" in table:
        points = table.integer("quadrature_points", least=1, most=4 * MOST_NODES)
    return Scheme(projector, method, nodes, quadrature, points, _time_step(table, duration))


def _time_step(table: Table, duration: float) -> float | None:
    if table.value("time_step", "auto") == "auto":
        return None
    step = table.constant("time_step")
    if not step > 0:
        raise InputError(table.key("time_step"), f"{step!r} given", 'a positive number or "auto" is needed')
    if duration / step > MOST_STEPS:
        found = f"{step!r} cuts the duration {duration!r} into {duration / step:.3g} steps"
        raise InputError(table.key("time_step"), found, f"at most {MOST_STEPS:,} steps are possible")
    return step


def _refuse_large_matrices(pairing: Pairing, equation: FieldEquation) -> None:
    """Where no transform can serve, the kernel is a matrix, for uncertain kernels one for every sample."""
    nodes, points = pairing.refined(pairing.nodes, pairing.quadrature_points)
    sources = POINTS_PER_PANEL.get(pairing.rule, 1) * points
    targets = nodes
    if pairing.inner_rule is not None:
        targets = POINTS_PER_PANEL.get(pairing.inner_rule, 1) * points
    kernel = typical(equation).kernel
    numbers = targets * sources * (1 if kernel.certain else BATCH)
    if numbers > MOST_MATRIX and _needs_a_matrix(pairing, kernel):
        raise InputError(
            "scheme.nodes",
            f"{pairing.nodes} nodes and {pairing.quadrature_points} quadrature points",
            f"at the finest level of the error split its matrices need {numbers:.3g} numbers, at most "
            f"{MOST_MATRIX:.3g} are possible: use fewer, or a kernel of the distance alone under piecewise "
            "linear or fourier",
        )


def _needs_a_matrix(pairing: Pairing, kernel: Connectivity) -> bool:
    """Whether the operator of many points will be a matrix.

    Polynomials have nodes on no grid; where those of the others share one a transform serves.
    """
    if pairing.kernel_use != "sampled":
        return False
    if pairing.projector in ("chebyshev", "legendre") or not kernel.shift_invariant:
        return True
    source = pairing.source_rule(pairing.quadrature_points)
    if pairing.inner_rule is None:
        target = make_rule("trapezoid", pairing.domain, pairing.nodes)
    else:
        target = make_rule(pairing.inner_rule, pairing.domain, pairing.quadrature_points)
    return LatticePair.of(target, source) is None


def settled(scheme: Scheme, equation: FieldEquation) -> tuple[Scheme, Pairing]:
    """The scheme with the counts that its levels need, and the pairing that it makes.

    Raises
    ------
    InputError
        Where projector, method, quadrature, rate and domain do not go together, or a count is too small.
    """
    time_constant, duration = equation.dynamics.time_constant, equation.dynamics.duration
    if isinstance(time_constant, float) and duration / time_constant > MOST_STEPS:
        found = f"{time_constant!r} for a duration of {duration!r}"
        needed = f"explicit steps follow the time constant, and at most {MOST_STEPS:,} are possible"
        raise InputError("dynamics.time_constant", found, needed)
    pairing = resolve(scheme, equation)
    _refuse_large_matrices(pairing, equation)
    points = None if scheme.quadrature_points is None else pairing.quadrature_points
    used = dataclasses.replace(scheme, nodes=pairing.nodes, quadrature_points=points)
    return used, pairing
