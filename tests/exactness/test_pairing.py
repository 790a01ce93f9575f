"""Which rule a scheme gets, with how many points, what is announced, and the levels of the error split."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from aleafield.ensemble.level import Level
from aleafield.errors import InputError
from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.kernels import CosineKernel, ExponentialKernel, FormulaKernel, GaussianKernel
from aleafield.field.rates import FormulaRate, LinearRate, LogisticRate, RampRate, Rate, StepRate
from aleafield.geometry import Domain, Interval, Ring
from aleafield.projection.discretisation import Discretisation
from aleafield.projection.pairing import Pairing, resolve
from aleafield.projection.path import split_path
from aleafield.projection.scheme import Scheme
from aleafield.projection.smoothness import rate_smoothness, smooth_on, typical
from aleafield.randomness.laws import Uniform
from tests.manufactured.problems import lone, term

INTERVAL, RING = Interval(-2.0, 3.0), Ring(5.0)
BASE = FieldEquation(INTERVAL, lone(GaussianKernel(1.0, 0.5)), LogisticRate(5.0, 0.3), Dynamics(1.0, 1.0))
ON_RING = replace(BASE, domain=RING)
STEP = replace(BASE, rate=StepRate(0.3))


def pair(equation: FieldEquation, projector: str, method: str, nodes: int, *rule: object) -> Pairing:
    """The pairing of a scheme."""
    return resolve(Scheme(projector, method, nodes, *rule), equation)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("equation", "scheme", "rule", "points"),
    [
        (BASE, ("piecewise linear", "collocation", 257), "trapezoid", 257),
        (BASE, ("piecewise linear", "galerkin", 257), "composite gauss", 257),
        (BASE, ("chebyshev", "collocation", 33), "clenshaw-curtis", 33),
        (BASE, ("chebyshev", "collocation", 33, "simpson"), "simpson", 33),
        (BASE, ("legendre", "galerkin", 32), "gauss-legendre", 32),
        (BASE, ("legendre", "galerkin", 32, "trapezoid"), "trapezoid", 33),
        (BASE, ("legendre", "galerkin", 32, "trapezoid", 100), "trapezoid", 101),
        (ON_RING, ("fourier", "collocation", 256), "trapezoid", 256),
        (ON_RING, ("piecewise linear", "galerkin", 256), "composite gauss", 256),
        (STEP, ("piecewise linear", "galerkin", 257), "trapezoid", 257),
        (STEP, ("chebyshev", "collocation", 33), "trapezoid", 133),
        (STEP, ("legendre", "galerkin", 32), "trapezoid", 129),
        (replace(ON_RING, rate=StepRate(0.3)), ("fourier", "galerkin", 64), "trapezoid", 256),
    ],
)
def test_rule_and_number_of_points(
    equation: FieldEquation, scheme: tuple[str, str, int], rule: str, points: int
) -> None:
    """The defaults of the study file, by hand."""
    found = pair(equation, *scheme)
    assert (found.rule, found.quadrature_points) == (rule, points)


def test_even_counts_become_odd_where_a_coarser_level_needs_it_and_it_is_said() -> None:
    found = pair(BASE, "piecewise linear", "collocation", 256)
    assert (found.nodes, found.quadrature_points) == (257, 257)
    assert any("256" in note and "257" in note for note in found.notes)
    assert pair(ON_RING, "piecewise linear", "collocation", 256).notes == ()


@pytest.mark.parametrize("method", ["collocation", "galerkin"])
@pytest.mark.parametrize("rate", [LogisticRate(5.0), StepRate(0.3)])
def test_odd_counts_of_a_piecewise_linear_field_on_a_ring_become_even(method: str, rate: Rate) -> None:
    """So that at every level of the path each element is a whole number of panels."""
    equation = replace(ON_RING, rate=rate)
    found = pair(equation, "piecewise linear", method, 63)
    assert (found.nodes, found.quadrature_points) == (64, 64)
    assert any("63" in note and "64" in note for note in found.notes)
    found = pair(equation, "piecewise linear", method, 63, "matched", 127)
    assert (found.nodes, found.quadrature_points) == (64, 128)
    for part in split_path(found, Level(64, 128)):
        assert all(level.quadrature_points % level.nodes == 0 for level in part.levels)
    assert pair(ON_RING, "fourier", "collocation", 63).nodes == 63


@pytest.mark.parametrize(
    ("text", "smoothness"),
    [
        ("u > 0.3", "jump"),
        ("sign(u - h)", "jump"),
        ("where(u < 20*h, 0, u)", "jump"),
        ("1/(1 + exp(-5*u)) + 0.001*(u > -7.3)", "jump"),
        ("maximum(u - h, 0)", "kinked"),
        ("u*(u > 0)", "kinked"),
        ("sqrt(maximum(u - h, 0))", "kinked"),
        ("where(u > h, u - h, 0)", "kinked"),
        ("minimum(1, exp(3*u))", "kinked"),
        ("abs(u)**1.5", "kinked"),
        ("1/(1 + exp(-50000*(u - h)))", "smooth"),
    ],
)
def test_a_formula_of_the_rate_that_jumps_is_told_from_one_with_a_kink(text: str, smoothness: str) -> None:
    rate = FormulaRate(term(text, {"h": Uniform(0.2, 0.4)}))
    equation = replace(BASE, rate=rate)
    assert rate_smoothness(typical(equation).rate) == smoothness
    found = pair(equation, "piecewise linear", "collocation", 65)
    jump = smoothness == "jump"
    assert any('form = "step"' in warning for warning in found.warnings) == jump
    orders = [(part.order, part.observed_only) for part in (found.space, found.quadrature, found.time)]
    assert (orders == [(1.0, True)] * 3) == jump


@pytest.mark.parametrize(("domain", "points"), [(INTERVAL, 65), (INTERVAL, 100), (RING, 96)])
def test_piecewise_linear_galerkin_needs_whole_panels(domain: Domain, points: int) -> None:
    """65 panel ends under 129 nodes leave hats without points; others cut elements."""
    nodes = 64 if domain.periodic else 129
    with pytest.raises(InputError) as caught:
        pair(replace(BASE, domain=domain), "piecewise linear", "galerkin", nodes, "matched", points)
    assert caught.value.key == "scheme.quadrature_points"
    assert str(nodes) in caught.value.needed


@pytest.mark.parametrize(
    ("kernel", "use"),
    [
        (GaussianKernel(1.0, 0.5), "exact symbol"),
        (ExponentialKernel(1.0, 0.5), "exact symbol"),
        (CosineKernel((0.1, 0.2)), "exact symbol"),
        (FormulaKernel(term("exp(cos(x - y))")), "sampled"),
    ],
)
def test_fourier_takes_the_exact_symbol_where_there_is_one(
    kernel: GaussianKernel | ExponentialKernel | CosineKernel | FormulaKernel, use: str
) -> None:
    equation = replace(ON_RING, kernel=lone(kernel))
    assert pair(equation, "fourier", "collocation", 64).kernel_use == use
    assert pair(equation, "fourier", "collocation", 64, "trapezoid").kernel_use == "sampled"
    assert pair(equation, "piecewise linear", "collocation", 64).kernel_use == "sampled"


def test_a_step_rate_under_cosine_kernels_is_integrated_in_closed_form() -> None:
    equation = replace(ON_RING, kernel=lone(CosineKernel((0.1, 0.2))), rate=StepRate(0.1))
    found = pair(equation, "fourier", "collocation", 64)
    assert found.kernel_use == "closed"
    choice = Discretisation(equation, Level(64, 256), found).operator_choice
    assert (choice.name, choice.operations) == ("closed between crossings", 2 * 4 * (256 + 64))
    assert pair(replace(equation, kernel=BASE.kernel), "fourier", "collocation", 64).kernel_use == "sampled"


@pytest.mark.parametrize(
    ("change", "scheme", "words"),
    [
        ({}, ("chebyshev", "collocation", 33, "trapezoid"), "order 2, is of lower order than the chebyshev"),
        ({}, ("legendre", "galerkin", 32, "simpson"), "order 4, is of lower order than the legendre"),
        ({}, ("piecewise linear", "collocation", 65, "gauss-legendre"), "wasted"),
        (
            {"kernel": lone(ExponentialKernel(1.0, 0.5))},
            ("chebyshev", "collocation", 33),
            "order 2 and sets the error",
        ),
        ({"rate": LinearRate()}, ("piecewise linear", "collocation", 65), "bounded"),
        ({"rate": RampRate(2.0)}, ("piecewise linear", "collocation", 65), "kink"),
        ({"rate": StepRate(0.1)}, ("piecewise linear", "collocation", 65), "only observed orders"),
        (
            {"drive": term("t < off", {"off": Uniform(0.2, 0.7)})},
            ("chebyshev", "collocation", 33),
            "order 1 across",
        ),
        ({"drive": term("x < t")}, ("piecewise linear", "collocation", 65), "order 1 across"),
        ({"initial": term("abs(x)")}, ("chebyshev", "collocation", 33), "algebraically"),
        ({"initial": term("x > 0")}, ("piecewise linear", "collocation", 65), "lies on a node"),
        ({}, ("piecewise linear", "collocation", 65, "trapezoid", 41), "whole numbers of panels"),
    ],
)
def test_what_an_expert_would_say(
    change: dict[str, object], scheme: tuple[str, str, int], words: str
) -> None:
    found = pair(replace(BASE, **change), *scheme)  # type: ignore[arg-type]
    assert any(words in warning for warning in found.warnings), found.warnings


def test_a_sound_scheme_gets_no_warning() -> None:
    for scheme in (("piecewise linear", "collocation", 65), ("chebyshev", "collocation", 33)):
        assert pair(BASE, *scheme).warnings == ()
    kinked = replace(ON_RING, kernel=lone(ExponentialKernel(1.0, 0.5)))
    assert pair(kinked, "fourier", "collocation", 64).warnings == ()


@pytest.mark.parametrize(
    ("domain", "text", "smooth"),
    [
        (INTERVAL, "exp(-x**2)", True),
        (INTERVAL, "cos(20*x)", True),
        (INTERVAL, "exp(-(x/0.02)**2)", True),
        (INTERVAL, "abs(x - 0.3)", False),
        (INTERVAL, "0.001*abs(x - 0.3) + cos(x)", False),
        (INTERVAL, "x > 0.1", False),
        (INTERVAL, "sqrt(x + 2)", False),
        (RING, "exp(cos(2*pi*x/5))", True),
        (RING, "exp(-x**2/0.02)", True),
        (RING, "exp(-x**2/2)", False),  # smooth on the line, a kink where the ring closes
        (RING, "x", False),
    ],
)
def test_kinks_are_seen_in_the_coefficients(domain: Domain, text: str, smooth: bool) -> None:
    assert smooth_on(domain, lambda x: term(text).evaluate({"x": x}, axes=1)) is smooth


@pytest.mark.parametrize(
    ("rate", "order", "observed_only"),
    [(LogisticRate(5.0), 4.0, False), (LinearRate(), 4.0, False), (RampRate(2.0), 2.0, True)],
)
def test_order_in_time(rate: Rate, order: float, observed_only: bool) -> None:
    found = pair(replace(BASE, rate=rate), "piecewise linear", "collocation", 65).time
    assert (found.order, found.observed_only) == (order, observed_only)


@pytest.mark.parametrize(
    ("equation", "scheme", "levels"),
    [
        # run, quadrature, space; coarser run, coarser space
        (BASE, ("piecewise linear", "galerkin", 33), ((33, 33), (33, 65), (65, 65), (17, 17), (17, 33))),
        (
            BASE,
            ("chebyshev", "collocation", 17, "trapezoid", 41),
            ((17, 41), (17, 81), (33, 81), (9, 21), (9, 41)),
        ),
        (BASE, ("legendre", "galerkin", 16), ((16, 16), (16, 32), (32, 32), (8, 8), (8, 16))),
        (ON_RING, ("fourier", "collocation", 25), ((25, 25), (25, 50), (50, 50), (12, 12), (12, 25))),
        (STEP, ("chebyshev", "collocation", 9), ((9, 37), (9, 73), (17, 73), (5, 19), (5, 37))),
    ],
)
def test_path_of_levels(
    equation: FieldEquation, scheme: tuple[str, str, int], levels: tuple[tuple[int, int], ...]
) -> None:
    """Quadrature first, then space on the same points, with the true ratios of mesh widths; then the step."""
    found = pair(equation, *scheme)
    run, more, finer, coarser, coarser_space = (Level(n, q, 0) for n, q in levels)
    assert (found.nodes, found.quadrature_points) == (run.nodes, run.quadrature_points)
    quadrature, space, time = split_path(found, run)
    assert quadrature.pair == (run, more)
    assert quadrature.coarse_pair == (coarser, coarser_space)
    assert space.pair == (more, finer)
    assert space.coarse_pair == (coarser_space, run)
    assert time.pair == (run, replace(run, halvings=1))
    assert time.coarse_pair == (replace(run, halvings=-1), run)
    one, other = Discretisation(equation, more, found), Discretisation(equation, finer, found)
    np.testing.assert_array_equal(one.rule.points, other.rule.points)
    np.testing.assert_array_equal(one.rule.weights, other.rule.weights)
    for part, ends in (
        (quadrature, found.point_refinement.both_ends),
        (space, found.node_refinement.both_ends),
    ):
        counts = [
            [
                getattr(level, "nodes" if part.name == "space" else "quadrature_points") - ends
                for level in levels_
            ]
            for levels_ in (part.pair, part.coarse_pair)
        ]
        assert part.ratio == counts[0][1] / counts[0][0]
        assert part.coarse_ratio == counts[1][1] / counts[1][0]
    assert (quadrature.expected_order, space.expected_order) == (found.quadrature.order, found.space.order)
    assert time.expected_order == found.time.order


def test_gain_bounds_the_linearised_field() -> None:
    """Logistic slope 5/4, gaussian of integral 1; from the rows next to the middle 1e-5 of it is cut off."""
    found = pair(BASE, "piecewise linear", "collocation", 257)
    gain = Discretisation(BASE, Level(257, 257), found).gain(BASE)
    assert gain is not None
    assert float(gain) == pytest.approx(1.25, rel=1e-5)
    step = pair(STEP, "piecewise linear", "collocation", 257)
    assert Discretisation(STEP, Level(257, 257), step).gain(STEP) is None
