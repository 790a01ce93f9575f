"""Every kernel operator agrees with the sum over the kernel matrix, to the rounding it states."""

from __future__ import annotations

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.kernels import (
    Connectivity,
    CosineKernel,
    ExponentialKernel,
    FormulaKernel,
    GaussianKernel,
)
from aleafield.field.parameter import Binding
from aleafield.field.rates import LogisticRate
from aleafield.geometry import Domain, Interval, Ring
from aleafield.operators import (
    CirculantOperator,
    KernelOperator,
    LatticePair,
    SampleDenseOperator,
    SharedDenseOperator,
    SymbolOperator,
    ToeplitzOperator,
    choose_operator,
)
from aleafield.quadrature import Rule, clenshaw_curtis, make_rule, periodic_trapezoid
from aleafield.randomness.laws import Uniform
from tests.manufactured.problems import lone, term

INTERVAL = Interval(-2.0, 3.0)
RING = Ring(5.0)
WIDTHS = np.array([0.1, 0.3, 0.5, 0.7, 0.9, 1.1, 1.3, 3.0])


def kernels(uncertain: bool) -> Connectivity:
    """A gaussian part, its width uncertain or not, an exponential, a cosine and a formula of the distance."""
    width = Uniform(0.05, 4.0) if uncertain else 0.4
    unbound = Connectivity(
        {
            "wide": GaussianKernel(1.3, width),
            "kinked": ExponentialKernel(-0.6, 0.5),
            "wave": CosineKernel((0.1, -0.2, 0.05)),
            "formula": FormulaKernel(term("0.2/(1 + r**2)")),
        }
    )
    return unbound.bind(Binding({"kernel.wide.width": WIDTHS}, {}))


def sources(rule: Rule) -> FloatArray:
    """Random sources (8, Q), fixed."""
    return np.random.default_rng(20261201).standard_normal((8, len(rule.points)))


def assert_agrees(
    operator: KernelOperator, kernel: Connectivity, domain: Domain, test: Rule, source: Rule, length: int
) -> None:
    """Against the sum, within the stated rounding of the operator and of the sum itself."""
    matrix = kernel.matrix(test.points[:, None], source.points[None, :], domain)
    s = sources(source)
    exact = np.einsum("...tq,...q->...t", np.broadcast_to(matrix, (8, *matrix.shape[-2:])), s)
    scale = np.abs(matrix).sum(axis=-1).max() * np.linalg.norm(s, axis=-1)
    allowed = (operator.rounding(length) + SharedDenseOperator.rounding(len(source.points))) * scale
    assert np.all(np.abs(operator.apply(s) - exact) <= allowed[:, None])


INTERVAL_PAIRS = [
    ("trapezoid", 33, "trapezoid", 33),
    ("trapezoid", 33, "trapezoid", 65),  # twice the quadrature points
    ("trapezoid", 65, "trapezoid", 33),  # a finer space on the same points
    ("trapezoid", 33, "simpson", 33),
    ("trapezoid", 33, "composite gauss", 65),
    ("composite gauss", 33, "composite gauss", 33),
    ("composite gauss", 33, "trapezoid", 65),
]


@pytest.mark.parametrize("uncertain", [False, True])
@pytest.mark.parametrize("names", INTERVAL_PAIRS)
def test_toeplitz(names: tuple[str, int, str, int], uncertain: bool) -> None:
    test, source = make_rule(names[0], INTERVAL, names[1]), make_rule(names[2], INTERVAL, names[3])
    kernel = kernels(uncertain)
    pair = LatticePair.of(test, source)
    assert pair is not None
    operator = ToeplitzOperator(kernel, INTERVAL, pair)
    assert_agrees(operator, kernel, INTERVAL, test, source, ToeplitzOperator.transform_length(pair))


RING_PAIRS = [
    ("trapezoid", 32, "trapezoid", 32),
    ("trapezoid", 27, "trapezoid", 27),
    ("trapezoid", 16, "trapezoid", 64),
    ("trapezoid", 64, "trapezoid", 32),
    ("trapezoid", 32, "simpson", 32),
    ("trapezoid", 32, "composite gauss", 32),
    ("composite gauss", 27, "composite gauss", 27),
]


@pytest.mark.parametrize("uncertain", [False, True])
@pytest.mark.parametrize("names", RING_PAIRS)
def test_circulant(names: tuple[str, int, str, int], uncertain: bool) -> None:
    test, source = make_rule(names[0], RING, names[1]), make_rule(names[2], RING, names[3])
    kernel = kernels(uncertain)
    pair = LatticePair.of(test, source)
    assert pair is not None
    operator = CirculantOperator(kernel, RING, pair)
    assert_agrees(operator, kernel, RING, test, source, CirculantOperator.transform_length(pair))


def test_points_without_a_common_grid_have_no_pair() -> None:
    assert LatticePair.of(make_rule("trapezoid", RING, 7), make_rule("trapezoid", RING, 17)) is None
    assert LatticePair.of(clenshaw_curtis(INTERVAL, 9), make_rule("trapezoid", INTERVAL, 9)) is None


@pytest.mark.parametrize("uncertain", [False, True])
def test_dense(uncertain: bool) -> None:
    test, source = clenshaw_curtis(INTERVAL, 9), make_rule("trapezoid", INTERVAL, 33)
    kernel = kernels(uncertain)
    matrix = kernel.matrix(test.points[:, None], source.points[None, :], INTERVAL)
    operator = SampleDenseOperator(matrix) if uncertain else SharedDenseOperator(matrix)
    assert_agrees(operator, kernel, INTERVAL, test, source, len(source.points))


def band_limited(points: FloatArray, modes: int, length: float) -> tuple[FloatArray, FloatArray, FloatArray]:
    """A random trigonometric sum: its values, and the amplitudes of cosines and sines for k = 0 .. modes."""
    random = np.random.default_rng(7)
    cosine, sine = random.standard_normal((2, 8, modes + 1))
    angle = 2 * np.pi / length * np.outer(np.arange(modes + 1), points)
    return cosine @ np.cos(angle) + sine @ np.sin(angle), cosine, sine


@pytest.mark.parametrize(
    ("q", "n", "modes"), [(32, 32, 12), (31, 31, 15), (64, 32, 12), (33, 16, 7), (16, 48, 7)]
)
@pytest.mark.parametrize("truncated", [False, True])
def test_exact_symbol(q: int, n: int, modes: int, truncated: bool) -> None:
    """A band-limited source is taken to the sum of symbol times modes, exactly."""
    kernel = Connectivity(
        {
            "": GaussianKernel(1.3, WIDTHS),
            "kinked": ExponentialKernel(-0.6, 0.5),
            "wave": CosineKernel((0.1, -0.2)),
        }
    )
    points = periodic_trapezoid(RING, q).points
    values, cosine, sine = band_limited(points, modes, RING.length)
    symbol = kernel.symbol(np.arange(q // 2 + 1), RING.length)
    assert symbol is not None
    operator = SymbolOperator(symbol, RING.length, q, n, truncated)
    x = periodic_trapezoid(RING, n).points
    angle = 2 * np.pi / RING.length * np.outer(np.arange(modes + 1), x)
    exact = (symbol[:, : modes + 1] * cosine) @ np.cos(angle) + (symbol[:, : modes + 1] * sine) @ np.sin(
        angle
    )
    found = operator.apply(values * (RING.length / q))
    np.testing.assert_allclose(found, exact, rtol=0, atol=1e-13 * np.abs(values).max())


def test_collocation_samples_high_modes_and_galerkin_drops_them() -> None:
    """cos(2 pi 5 x / L) on 16 source points and 8 test points: collocation sees its alias, Galerkin nothing.

    The mode n/2 = 4 of the even space is a cosine: Galerkin keeps a cosine of that mode and drops a sine.
    """
    fine, coarse = periodic_trapezoid(RING, 16).points, periodic_trapezoid(RING, 8).points
    wave = 2 * np.pi / RING.length
    symbol = 1.0 / (1.0 + np.arange(9.0))
    rows = np.array([np.cos(5 * wave * fine), np.cos(4 * wave * fine), np.sin(4 * wave * fine)])
    source = np.concatenate((rows, np.zeros((5, 16)))) * RING.length / 16
    collocation = SymbolOperator(symbol, RING.length, 16, 8, truncated=False).apply(source)[:3]
    galerkin = SymbolOperator(symbol, RING.length, 16, 8, truncated=True).apply(source)[:3]
    nothing = np.zeros(8)
    sampled = [np.cos(5 * wave * coarse) / 6, np.cos(4 * wave * coarse) / 5, nothing]
    kept = [nothing, np.cos(4 * wave * coarse) / 5, nothing]
    np.testing.assert_allclose(collocation, sampled, atol=1e-15)
    np.testing.assert_allclose(galerkin, kept, atol=1e-15)


@pytest.mark.parametrize(
    ("domain", "n", "uncertain", "expected"),
    [
        (INTERVAL, 65, False, "shared dense"),
        (INTERVAL, 1025, False, "toeplitz"),
        (INTERVAL, 17, True, "dense per sample"),
        (INTERVAL, 257, True, "toeplitz"),
        (RING, 64, False, "shared dense"),
        (RING, 512, False, "circulant"),
        (RING, 16, True, "dense per sample"),
        (RING, 256, True, "circulant"),
    ],
)
def test_choice_by_operations(domain: Domain, n: int, uncertain: bool, expected: str) -> None:
    """Small problems are dense, large ones go by transforms; and the reason says with what numbers."""
    rule = make_rule("trapezoid", domain, n)
    choice = choose_operator(kernels(uncertain), domain, rule, rule, n, 0.0, use="sampled", truncated=False)
    assert choice.name == expected
    assert "weighted operations" in choice.reason
    operator = choice.build(kernels(uncertain), lambda matrix: matrix)
    assert operator.name == expected
    assert_agrees(operator, kernels(uncertain), domain, rule, rule, 4 * n)


def test_kernel_of_x_and_y_is_dense() -> None:
    rule = make_rule("trapezoid", INTERVAL, 1025)
    kernel = lone(FormulaKernel(term("x*y")))
    choice = choose_operator(kernel, INTERVAL, rule, rule, 1025, 0.0, use="sampled", truncated=False)
    assert (choice.name, choice.folded) == ("shared dense", True)


def test_an_expression_of_certain_numbers_is_certain() -> None:
    """A width written as an expression without inputs must not cost a matrix for every sample."""
    from aleafield.formula import Formula
    from aleafield.projection.smoothness import typical

    equation = FieldEquation(
        INTERVAL,
        lone(GaussianKernel(1.0, Formula("2*w"))),
        LogisticRate(3.0),
        Dynamics(1.0),
        parameters={"w": 0.2, "s": Uniform(0.0, 1.0)},
    )
    assert typical(equation).kernel.certain
