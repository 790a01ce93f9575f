"""Faults in rules, spaces, kernels, operators, formulas and steps that the exactness tests must see."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import partial
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray, batch_product
from aleafield.field.kernels import CosineKernel, ExponentialKernel, GaussianKernel
from aleafield.field.parameter import per_sample
from aleafield.field.rates import LogisticRate, RampRate, StepRate
from aleafield.geometry import Interval, Ring
from aleafield.operators import SharedDenseOperator, ToeplitzOperator
from aleafield.projection.restriction import MassRestriction
from aleafield.quadrature import (
    Rule,
    clenshaw_curtis,
    composite_gauss,
    crossing_weights,
    gauss_legendre,
    periodic_trapezoid,
    simpson,
    trapezoid,
)
from aleafield.spaces import Chebyshev, Legendre, PiecewiseLinear
from tests.exactness import (
    test_batch_product,
    test_crossings,
    test_kernels,
    test_operators,
    test_rates,
    test_restriction,
    test_rules,
    test_spaces,
)
from tests.teeth.biting import Check, Tooth, assert_bites, everywhere, member, teeth
from tests.teeth.faults import doubled_symbol, nodal_sampling, not_periodised, place_decides, width_decides

RuleMaker = Callable[..., Rule]


def halved_weight(weights: FloatArray) -> FloatArray:
    """One weight halved."""
    changed = weights.copy()
    changed[len(changed) // 2] *= 0.5
    return changed


def shuffled_weights(weights: FloatArray) -> FloatArray:
    """All weights there, in other places: the length is still right."""
    return np.roll(weights, 1)


def half_the_volume(weights: FloatArray) -> FloatArray:
    """Every weight halved: orders of convergence to a wrong limit stay right."""
    return 0.5 * weights


def with_weights(make: RuleMaker, change: Callable[[FloatArray], FloatArray]) -> RuleMaker:
    """The rule with other weights."""

    def faulty(*arguments: Any) -> Rule:
        rule = make(*arguments)
        return replace(rule, weights=change(rule.weights))

    return faulty


def polynomials(name: str, count: int, degree: int, miss: float) -> Check:
    """The exactness of a rule on an interval, made when the check runs."""

    def check() -> None:
        rule = getattr(test_rules, name)(test_rules.INTERVAL, count)
        test_rules.test_polynomials_up_to_the_claimed_degree_and_no_further(rule, degree, miss)

    return check


def waves(name: str, at_n: float) -> Check:
    """The exactness of a rule on a ring."""
    return lambda: test_rules.test_waves_below_the_number_of_panels_and_not_that_number(
        getattr(test_rules, name), at_n, 8
    )


MISS = test_rules.first_miss_of_composite
RULES: list[tuple[RuleMaker, Check]] = [
    (trapezoid, polynomials("trapezoid", 7, 1, MISS("trapezoid", 7))),
    (simpson, polynomials("simpson", 7, 3, MISS("simpson", 7))),
    (composite_gauss, polynomials("composite_gauss", 5, 3, MISS("gauss", 5))),
    (gauss_legendre, polynomials("gauss_legendre", 6, 11, test_rules.missed_by_gauss(6))),
    (
        clenshaw_curtis,
        lambda: test_rules.test_clenshaw_curtis_integrates_its_polynomials_and_aliases_the_next(9),
    ),
    (periodic_trapezoid, waves("periodic_trapezoid", 1.0)),
]
EQUAL_WEIGHTS = (composite_gauss, periodic_trapezoid)
"""Rules that no shuffling changes."""


@teeth(
    *[
        Tooth(f"{make.__name__}: {change.__name__}", everywhere(make, with_weights(make, change)), check)
        for make, check in RULES
        for change in (halved_weight, shuffled_weights, half_the_volume)
        if not (change is shuffled_weights and make in EQUAL_WEIGHTS)
    ]
)
def test_rules_of_quadrature(tooth: Tooth) -> None:
    assert_bites(tooth)


def without_the_half(self: CosineKernel, k: Any, length: float) -> FloatArray:
    """a_k times the length for every k: the factor 2 of cos^2 = 1/2 is forgotten."""
    waves = [
        np.reshape(np.asarray(a), (-1, 1)) * length * (k == order)
        for order, a in enumerate(self.coefficients)
    ]
    return np.asarray(sum(waves))


@teeth(
    *[
        Tooth(
            f"a {name} kernel that is not periodised",
            member(kernel, "matrix", not_periodised(kernel)),
            partial(test_kernels.test_on_a_ring_it_is_the_sum_over_all_images, name),
        )
        for name, kernel in (("gaussian", GaussianKernel), ("exponential", ExponentialKernel))
    ],
    *[
        Tooth(
            f"a factor 2 in the symbol of a {name} kernel",
            member(kernel, "symbol", doubled_symbol(kernel.symbol)),
            partial(test_kernels.test_the_symbol_is_the_cosine_transform_over_the_line, name),
        )
        for name, kernel in (("gaussian", GaussianKernel), ("exponential", ExponentialKernel))
    ],
    Tooth(
        "the factor 1/2 forgotten in the symbol of a cosine kernel",
        member(CosineKernel, "symbol", without_the_half),
        test_kernels.test_the_symbol_of_a_cosine_kernel_is_that_of_its_matrix,
    ),
    Tooth(
        "widths and strengths exchanged",
        member(
            GaussianKernel,
            "matrix",
            lambda self, x, y, domain, real=GaussianKernel.matrix: real(
                GaussianKernel(self.width, np.abs(self.strength)), x, y, domain
            ),
        ),
        lambda: test_kernels.test_on_an_interval_the_kernel_is_the_density_times_its_strength("gaussian"),
    ),
)
def test_kernels_and_symbols(tooth: Tooth) -> None:
    assert_bites(tooth)


@teeth(
    Tooth(
        "a plain matrix product, bits by the width of the batch",
        everywhere(batch_product, width_decides),
        lambda: test_batch_product.test_every_width_gives_the_same_bits(257, 257),
    ),
    Tooth(
        "a plain matrix product, bits by the place in the batch",
        everywhere(batch_product, place_decides),
        lambda: test_batch_product.test_every_order_of_the_rows_gives_the_same_bits(257, 257),
    ),
    Tooth(
        "a product in single precision",
        everywhere(batch_product, lambda a, b: (a.astype(np.float32) @ b.astype(np.float32)).astype(float)),
        lambda: test_batch_product.test_values(64, 253, 8),
    ),
    Tooth(
        "a kernel operator with its source reversed",
        member(
            SharedDenseOperator,
            "apply",
            lambda self, source: batch_product(source[:, ::-1], self._transposed),
        ),
        lambda: test_operators.test_choice_by_operations(test_operators.INTERVAL, 65, False, "shared dense"),
    ),
    Tooth(
        "a circular product where a linear one is needed",
        member(
            ToeplitzOperator,
            "apply",
            lambda self, source, real=ToeplitzOperator.apply: np.roll(real(self, source), 1, axis=-1),
        ),
        lambda: test_operators.test_choice_by_operations(test_operators.INTERVAL, 1025, False, "toeplitz"),
    ),
)
def test_products_and_operators(tooth: Tooth) -> None:
    assert_bites(tooth)


def space_check(projector: str, domain: Interval | Ring, n: int, check: Callable[..., None]) -> Check:
    """A test of the spaces on one of their cases, made when the check runs."""
    found = next(case for case in test_spaces.CASES if case[:3] == (projector, domain, n))
    return lambda: check(test_spaces.make_case(*found))


def sum_of_squares(self: Any, u: FloatArray) -> FloatArray:
    """The trapezoid rule at the nodes in place of the exact integral."""
    return np.asarray((u**2 * self.integral_weights).sum(axis=-1))


@teeth(
    Tooth(
        "the integral of a square by the nodes alone",
        member(PiecewiseLinear, "square_integral", sum_of_squares),
        space_check("piecewise linear", test_spaces.INTERVAL, 33, test_spaces.test_integral_of_the_square),
    ),
    Tooth(
        "the spectrum of the nodes in place of the interpolant's",
        member(
            PiecewiseLinear,
            "fourier_coefficient",
            lambda self, u, k: (u * np.exp(-2j * np.pi * k * self.nodes / self.domain.length)).mean(axis=-1),
        ),
        space_check(
            "piecewise linear", test_spaces.RING, 33, test_spaces.test_fourier_coefficients_of_the_interpolant
        ),
    ),
    Tooth(
        "a derivative per node in place of per length",
        member(
            Chebyshev,
            "derivative_matrix",
            lambda self, x, order=1, real=Chebyshev.derivative_matrix: (
                real(self, x, order) * (self.domain.length / 2.0) ** order
            ),
        ),
        space_check(
            "chebyshev", test_spaces.INTERVAL, 17, lambda case: test_spaces.test_derivatives(case, 1, "slope")
        ),
    ),
    Tooth(
        "coefficients in the reverse order",
        member(
            Legendre,
            "nodal",
            lambda self, u, real=Legendre.nodal: real(self, np.ascontiguousarray(u[:, ::-1])),
        ),
        space_check(
            "legendre", test_spaces.INTERVAL, 8, test_spaces.test_nodal_values_and_unknowns_are_one_element
        ),
    ),
    Tooth(
        "a mass matrix that is lumped",
        member(MassRestriction, "_solve", lambda self, load: load / self._weight.sum(axis=0)),
        lambda: test_restriction.test_mass_restriction(test_restriction.DOMAINS[0], "simpson", 1, 9),
    ),
)
def test_spaces_of_functions(tooth: Tooth) -> None:
    assert_bites(tooth)


def exchanged_sides(values: FloatArray, threshold: Any, spacing: float, periodic: bool) -> FloatArray:
    """The weights of the field turned round: left and right parts of a segment are taken for one another."""
    return crossing_weights(values[:, ::-1], threshold, spacing, periodic)


@teeth(
    Tooth(
        "a step rate sampled at the nodes",
        everywhere(crossing_weights, nodal_sampling),
        lambda: test_crossings.test_exact_for_a_linear_function_under_a_linear_kernel(1.0, 33),
    ),
    Tooth(
        "a step rate sampled at the nodes, seen by its order",
        everywhere(crossing_weights, nodal_sampling),
        test_crossings.test_order_two_for_a_smooth_function_on_a_ring,
    ),
    Tooth(
        "left and right of a crossing exchanged",
        everywhere(crossing_weights, exchanged_sides),
        test_crossings.test_weights_of_single_segments_as_published_in_the_study_file,
    ),
    Tooth(
        "a field at its threshold that is active",
        member(
            StepRate,
            "__call__",
            lambda self, u: np.where(u >= per_sample(self.threshold, 1), per_sample(self.maximum, 1), 0.0),
        ),
        test_rates.test_step_linear_and_formula,
    ),
    Tooth(
        "a gain that is dropped",
        member(
            LogisticRate,
            "__call__",
            lambda self, u, real=LogisticRate.__call__: real(replace(self, gain=1.0), u),
        ),
        lambda: test_rates.test_a_bounded_rate_is_a_distribution_function("logistic"),
    ),
    Tooth(
        "a slope of the half of the gain",
        member(RampRate, "slope", lambda self: abs(self.maximum * self.gain) / 2),
        lambda: test_rates.test_the_largest_slope("ramp"),
    ),
)
def test_rates_and_crossings(tooth: Tooth) -> None:
    assert_bites(tooth)
