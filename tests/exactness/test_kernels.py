"""Kernels and their exact symbols, on the line and periodised.

Oracles: densities of scipy.stats, sums over hundreds of images written out here, adaptive quadrature.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import laplace, norm

from aleafield.arrays import FloatArray
from aleafield.field.kernels import (
    Connectivity,
    CosineKernel,
    ExponentialKernel,
    FormulaKernel,
    GaussianKernel,
    Kernel,
)
from aleafield.geometry import Interval, Ring
from tests.manufactured.problems import term

LINE = Interval(-30.0, 30.0)
RING = Ring(3.0)
STRENGTH: Any = np.array([1.4, -0.7, 2.0, 1.0])
WIDTHS: Any = np.array([0.1, 0.9, 3.0, 12.0])
"""From far below the length of the ring to four times that."""
LAWS: dict[str, tuple[Any, Any]] = {
    "gaussian": (GaussianKernel, norm),
    "exponential": (ExponentialKernel, laplace),
}
X = np.linspace(-1.5, 1.4, 30)[:, None]
Y = np.linspace(-1.3, 1.5, 7)[None, :]


def density(name: str, z: FloatArray) -> FloatArray:
    """strength times the density of scale width, shape (4, ..)."""
    shape = (-1,) + (1,) * np.ndim(z)
    return np.asarray(STRENGTH.reshape(shape) * LAWS[name][1].pdf(z, scale=WIDTHS.reshape(shape)))


@pytest.mark.parametrize("name", LAWS)
def test_on_an_interval_the_kernel_is_the_density_times_its_strength(name: str) -> None:
    kernel = LAWS[name][0](STRENGTH, WIDTHS)
    assert not kernel.certain
    assert kernel.shift_invariant
    np.testing.assert_allclose(kernel.matrix(X, Y, LINE), density(name, X - Y), rtol=1e-12, atol=1e-300)
    one = LAWS[name][0](1.4, 0.1)
    assert one.certain
    np.testing.assert_allclose(one.matrix(X, Y, LINE), density(name, X - Y)[0], rtol=1e-12, atol=1e-300)


@pytest.mark.parametrize("name", LAWS)
def test_on_a_ring_it_is_the_sum_over_all_images(name: str) -> None:
    """601 images: what is left out of the widest exponential is exp(-900 / 12) of it."""
    images = RING.length * np.arange(-300, 301)[:, None, None]
    summed = density(name, X - Y + images).sum(axis=1)
    found = LAWS[name][0](STRENGTH, WIDTHS).matrix(X, Y, RING)
    np.testing.assert_allclose(found, summed, rtol=1e-11, atol=1e-15)
    assert np.all(np.abs(found[1:]) > np.abs(density(name, RING.distance(X, Y)))[1:])


@pytest.mark.parametrize("name", LAWS)
def test_the_symbol_is_the_cosine_transform_over_the_line(name: str) -> None:
    k = np.arange(6)
    found = LAWS[name][0](STRENGTH, WIDTHS).symbol(k, RING.length)
    assert found is not None
    for row, strength, width in zip(found, STRENGTH, WIDTHS, strict=True):
        for order, value in zip(k, row, strict=True):

            def half(z: float, width: float = width) -> float:
                return float(LAWS[name][1].pdf(z, scale=width))

            frequency = 2 * np.pi * order / RING.length
            if order == 0:
                integral = quad(half, 0, np.inf)[0]
            else:
                integral = quad(half, 0, 50 * width, weight="cos", wvar=frequency, limit=500)[0]
            assert value == pytest.approx(2 * strength * integral, abs=1e-8)


def test_the_symbol_of_a_cosine_kernel_is_that_of_its_matrix() -> None:
    """16 points of the periodic trapezoid rule are exact for waves below 8; a_k gives a_k length / 2."""
    uncertain: Any = np.array([0.5, -1.0])
    kernel = CosineKernel((0.3, uncertain, 0.0, 0.25))
    y = RING.length * np.arange(16) / 16
    values = kernel.matrix(np.zeros((1, 1)), y[None, :], RING)[:, 0]
    k = np.arange(8)
    waves = np.cos(2 * np.pi * np.outer(k, y) / RING.length)
    transformed = values @ waves.T * RING.length / 16
    symbol = kernel.symbol(k, RING.length)
    assert symbol is not None
    np.testing.assert_allclose(symbol, transformed, rtol=0, atol=1e-14)
    np.testing.assert_allclose(symbol[0, :4], [0.9, 0.75, 0.0, 0.375], rtol=1e-15)


@pytest.mark.parametrize("domain", [LINE, RING])
def test_a_cosine_kernel_has_the_length_of_the_domain(domain: Interval | Ring) -> None:
    matrix = CosineKernel((0.0, 2.0)).matrix(X, Y, domain)
    np.testing.assert_allclose(matrix, 2 * np.cos(2 * np.pi * (X - Y) / domain.length), rtol=0, atol=1e-14)


@pytest.mark.parametrize(
    ("text", "shift_invariant", "values"),
    [
        ("exp(-r) * 2", True, lambda x, y, r: 2 * np.exp(-r)),
        ("x - 3*y", False, lambda x, y, r: x - 3 * y),
        ("1 + 0*r", True, lambda x, y, r: np.ones(np.broadcast_shapes(x.shape, y.shape))),
    ],
)
def test_a_formula_sees_target_source_and_the_shortest_distance(
    text: str, shift_invariant: bool, values: Any
) -> None:
    """x is the target (rows), y the source (columns); nothing is periodised."""
    kernel = FormulaKernel(term(text))
    shortest = np.abs(X - Y)
    shortest = np.minimum(shortest, RING.length - shortest)
    np.testing.assert_allclose(kernel.matrix(X, Y, RING), values(X, Y, shortest), rtol=1e-13)
    assert kernel.shift_invariant is shift_invariant
    assert kernel.symbol(np.arange(3), RING.length) is None


def test_parts_are_added() -> None:
    parts: dict[str, Kernel] = {"a": GaussianKernel(1.4, WIDTHS), "b": ExponentialKernel(-0.5, 0.7)}
    both = Connectivity(parts)
    expected = sum(part.matrix(X, Y, RING) for part in parts.values())
    np.testing.assert_array_equal(both.matrix(X, Y, RING), np.asarray(expected))
    k = np.arange(5)
    symbols = [part.symbol(k, RING.length) for part in parts.values()]
    np.testing.assert_array_equal(both.symbol(k, RING.length), symbols[0] + symbols[1])  # type: ignore[operator]
    assert not both.certain
    with_formula = Connectivity({**parts, "c": FormulaKernel(term("r"))})
    assert with_formula.symbol(k, RING.length) is None
