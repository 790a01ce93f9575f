"""Faults in the field's equation that the manufactured problems, and `verify`, must see."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.field.kernels import ExponentialKernel, FormulaKernel, GaussianKernel
from aleafield.projection.integral import RateSources
from aleafield.projection.restriction import MassRestriction
from aleafield.projection.semidiscrete import ProjectedTerm, SemiDiscreteField
from aleafield.quadrature import Rule, active_moments, clenshaw_curtis, crossing_weights
from aleafield.stepping import runge_kutta
from aleafield.verification.problems import PROBLEMS
from aleafield.verification.solving import verdict
from tests.manufactured import problems, test_interval, test_line, test_ring
from tests.teeth.biting import Check, Tooth, assert_bites, everywhere, member, teeth
from tests.teeth.faults import doubled_symbol, nodal_sampling, not_periodised, wrong_weight


def swapped_axis(self: FormulaKernel, x: FloatArray, y: FloatArray, domain: Any) -> FloatArray:
    """w(y, x) in the place of w(x, y): targets and sources exchanged."""
    return REAL_MATRIX(self, y, x, domain)


REAL_MATRIX = FormulaKernel.matrix


def without_time_constant(real: Callable[..., None]) -> Callable[..., None]:
    """tau = 1 whatever the study says."""

    def constructed(
        self: Any, space: Any, integral: Any, drive: Any, initial: Any, _: Any, *rest: Any
    ) -> None:
        real(self, space, integral, drive, initial, 1.0, *rest)

    return constructed


def shuffled_rule(*arguments: Any) -> Rule:
    """Clenshaw-Curtis weights in other places."""
    rule = clenshaw_curtis(*arguments)
    return replace(rule, weights=np.roll(rule.weights, 2))


def nodal_moments(
    values: FloatArray,
    points: FloatArray,
    threshold: Any,
    spacing: float,
    domain: Any,
    wavenumbers: FloatArray,
) -> tuple[FloatArray, FloatArray]:
    """Moments of the active set with its points counted whole."""
    weights = nodal_sampling(values, threshold, spacing, domain.periodic)
    phases = np.outer(points, wavenumbers)
    return weights @ np.cos(phases), weights @ np.sin(phases)


def growing(self: Any, t: float, u: FloatArray, inside: float | None = None) -> FloatArray:
    """The decay of the field is left out."""
    return np.asarray(REAL_RATE(self, t, u, inside) + u * self._speed)


REAL_RATE = SemiDiscreteField.rate_of_change


def solved(projector: str, method: str) -> Check:
    """The analytic problem under a spectral projector."""
    nodes = 15 if projector == "chebyshev" else 14
    return lambda: test_interval.test_spectral_projectors_solve_the_analytic_problem(projector, method, nodes)


def verified(name: str, projector: str, refined: str) -> Check:
    """One line of the table of `verify`."""
    known = next(problem for problem in PROBLEMS if problem.name == name)
    series = next(s for s in known.series if (s.projector, s.refined) == (projector, refined))

    def check() -> None:
        assert verdict(known, series).passed

    return check


ORDER_TWO: Check = lambda: test_interval.test_piecewise_linear_matched_is_of_order_two(  # noqa: E731
    problems.analytic, "collocation"
)
FRONT: Check = lambda: test_line.test_front_moves_at_its_speed("collocation")  # noqa: E731
BUMP: Check = lambda: test_ring.test_bump_under_a_step_rate("piecewise linear", "galerkin")  # noqa: E731


@teeth(
    Tooth("a swapped axis of the kernel matrix", member(FormulaKernel, "matrix", swapped_axis), ORDER_TWO),
    Tooth(
        "a swapped axis, under a spectral projector",
        member(FormulaKernel, "matrix", swapped_axis),
        solved("legendre", "galerkin"),
    ),
    Tooth(
        "a dropped time constant",
        member(SemiDiscreteField, "__init__", without_time_constant(SemiDiscreteField.__init__)),
        FRONT,
    ),
    Tooth(
        "a dropped time constant, seen by verify",
        member(SemiDiscreteField, "__init__", without_time_constant(SemiDiscreteField.__init__)),
        verified("travelling front, exponential kernel, step rate", "piecewise linear", "nodes"),
    ),
    Tooth("shuffled weights", everywhere(clenshaw_curtis, shuffled_rule), solved("chebyshev", "collocation")),
    Tooth(
        "shuffled weights, seen by verify",
        everywhere(clenshaw_curtis, shuffled_rule),
        verified("smooth manufactured field", "chebyshev", "nodes"),
    ),
    Tooth(
        "a weight of the integral that is halved",
        member(
            RateSources,
            "of",
            lambda self, values, real=RateSources.of: (
                real(self, values) * np.where(np.arange(values.shape[-1]) == 3, 0.5, 1.0)
            ),
        ),
        ORDER_TWO,
    ),
    Tooth("a decay that is left out", member(SemiDiscreteField, "rate_of_change", growing), ORDER_TWO),
    Tooth(
        "a drive taken at the start of the run",
        member(
            ProjectedTerm, "at", lambda self, t, inside=None, real=ProjectedTerm.at: real(self, 0.0, inside)
        ),
        ORDER_TWO,
    ),
    Tooth(
        "a projection that is not applied",
        member(MassRestriction, "_solve", lambda self, load: load),
        lambda: test_interval.test_piecewise_linear_matched_is_of_order_two(problems.analytic, "galerkin"),
    ),
    Tooth("a step rate sampled at the nodes", everywhere(crossing_weights, nodal_sampling), FRONT),
    Tooth("a step rate sampled at the nodes, on a ring", everywhere(active_moments, nodal_moments), BUMP),
    Tooth(
        "a kernel that is not periodised",
        member(ExponentialKernel, "matrix", not_periodised(ExponentialKernel)),
        test_ring.test_sampling_a_kinked_kernel_is_of_order_two,
    ),
    Tooth(
        "a factor 2 in the symbol",
        member(GaussianKernel, "symbol", doubled_symbol(GaussianKernel.symbol)),
        test_ring.test_exact_symbol_needs_no_smooth_kernel,
    ),
    Tooth(
        "a stage weight, seen by the growth of modes",
        everywhere(runge_kutta._step, wrong_weight),
        lambda: test_interval.test_legendre_modes_decay("legendre", "galerkin", 6),
    ),
    Tooth(
        "a stage weight, seen by verify",
        everywhere(runge_kutta._step, wrong_weight),
        verified("smooth manufactured field", "chebyshev", "steps"),
    ),
)
def test_solutions(tooth: Tooth) -> None:
    assert_bites(tooth)
