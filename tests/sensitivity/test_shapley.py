"""Shapley effects against closed forms of linear and lognormal functions of correlated normal numbers."""

from __future__ import annotations

from collections.abc import Callable
from itertools import combinations

import numpy as np
import pytest
from scipy.special import ndtri

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.randomness.copula import Copula
from aleafield.sensitivity.ratios import Indices
from aleafield.sensitivity.shapley import (
    correlated_blocks,
    in_latent_normals,
    shapley_effects,
    shapley_weights,
)
from tests.sensitivity.coverage import held
from tests.sensitivity.known_functions import scrambled

SURE = 0.99999


def correlation(d: int, *pairs: tuple[int, int, float]) -> FloatArray:
    """A correlation matrix from its entries."""
    matrix = np.eye(d)
    for i, j, r in pairs:
        matrix[i, j] = matrix[j, i] = r
    return matrix


def explained(slopes: FloatArray, latent: FloatArray, subset: tuple[int, ...]) -> float:
    """Var E[b'G | G_u] = k_u' C_uu^-1 k_u with k = C b."""
    at = list(subset)
    k = (latent @ slopes)[at]
    return float(k @ np.linalg.solve(latent[np.ix_(at, at)], k)) if at else 0.0


def by_definition(d: int, closed: Callable[[tuple[int, ...]], float]) -> FloatArray:
    """Mean over all orders of the inputs of what each adds to those before it."""
    from math import factorial

    effects = np.zeros(d)
    for i in range(d):
        others = [j for j in range(d) if j != i]
        for size in range(d):
            share = factorial(size) * factorial(d - 1 - size) / factorial(d)
            for subset in combinations(others, size):
                effects[i] += share * (closed(tuple(sorted((*subset, i)))) - closed(subset))
    return effects / closed(tuple(range(d)))


def effects(
    function: Callable[[FloatArray], FloatArray], latent: FloatArray, points: int, **more: object
) -> Indices:
    """Effects from 16 scramblings with so many points each."""
    unit, block = scrambled(2 * len(latent), points, 17)
    return shapley_effects(function, latent, unit, block, 16, SURE, **more)  # type: ignore[arg-type]


THREE = correlation(3, (0, 1, 0.5), (1, 2, -0.3))
EIGHT = correlation(8, (0, 1, 0.5), (1, 2, 0.3), (2, 3, -0.4), (4, 5, 0.6))
SLOPES_8 = np.array([0.5, -0.3, 0.3, 0.2, 0.2, 0.1, 0.1, 0.0])

LINEAR = [
    # two inputs, sd 1 and 2, r = 0.6: b1^2 s1^2 (1 - r^2 / 2) + r b1 b2 s1 s2 + b2^2 s2^2 r^2 / 2 by hand
    (np.array([1.0, 2.0]), correlation(2, (0, 1, 0.6)), np.array([0.3702702702703, 0.6297297297297])),
    (np.array([1.0, 2.0, -2.0]), THREE, np.array([0.170653600131, 0.451426931278, 0.377919468591])),
]


@pytest.mark.parametrize(("slopes", "latent", "expected"), LINEAR)
def test_linear_functions(slopes: FloatArray, latent: FloatArray, expected: FloatArray) -> None:
    closed = by_definition(len(slopes), lambda u: explained(slopes, latent, u))
    assert np.allclose(closed, expected, atol=1e-11)
    found = effects(lambda z: (z @ slopes)[:, None], latent, 128)
    assert held(found, expected).all()
    assert (found.standard_error < 2e-3).all()
    assert found.value.sum() == pytest.approx(1.0, abs=1e-12)


def test_weights_on_exact_variances() -> None:
    """The matrix of weights against the definition, without any sampling."""
    d, slopes = 3, np.array([1.0, 2.0, -2.0])
    closed = [explained(slopes, THREE, tuple(i for i in range(d) if u >> i & 1)) for u in range(1 << d)]
    expected = by_definition(d, lambda u: explained(slopes, THREE, u))
    assert np.allclose(shapley_weights(d) @ closed / closed[-1], expected, rtol=1e-12)


def test_lognormal_product_of_eight() -> None:
    """c(u) = expm1(v_u) / expm1(v), v_u that of the logarithm; one input does nothing."""

    def closed(subset: tuple[int, ...]) -> float:
        return float(np.expm1(explained(SLOPES_8, EIGHT, subset)))

    expected = by_definition(8, closed)
    known = [0.474668554238, 0.082386975125, 0.116468842882, 0.057180818509]
    known += [0.150176098686, 0.086216808908, 0.032901901650, 0.0]
    assert np.allclose(expected, known, atol=1e-11)
    found = effects(lambda z: np.exp(z @ SLOPES_8)[:, None], EIGHT, 32)
    assert held(found, expected).all()
    # an input that nothing depends on adds nothing to any set, row by row
    assert abs(found.value[7, 0]) < 1e-12


def test_groups_play_as_one() -> None:
    """exp((1, -1, 1) . (.2, .3, .25) G), players {0, 1} and {2}."""
    slopes = np.array([0.2, -0.3, 0.25])
    found = effects(lambda z: np.exp(z @ slopes)[:, None], THREE, 128, groups=[(0, 1), (2,)])
    assert held(found, np.array([0.52000832564, 0.47999167436])).all()
    assert correlated_blocks(EIGHT) == ((0, 1, 2, 3), (4, 5), (6,), (7,))


def test_a_surrogate_of_independent_coordinates() -> None:
    """What is a function of u, as a surrogate fitted through the copula is, gives the effects of its inputs."""
    slopes = np.array([1.0, 2.0, -2.0])
    copula = Copula(["a", "b", "c"], [("a", "b", 0.4), ("b", "c", -0.2)])
    latent = copula.latent
    function = in_latent_normals(lambda u: (ndtri(copula.correlate(u)) @ slopes)[:, None], latent)
    found = effects(function, latent, 128)
    assert held(found, by_definition(3, lambda u: explained(slopes, latent, u))).all()


def test_many_outputs_and_one_that_is_constant() -> None:
    slopes = np.array([1.0, 2.0, -2.0])

    def outputs(z: FloatArray) -> FloatArray:
        linear = z @ slopes
        return np.stack([linear, 5 - 3 * linear, np.full(len(z), 2.0)], axis=1)

    found = effects(outputs, THREE, 16)
    assert np.allclose(found.value[:, 0], found.value[:, 1], rtol=1e-10)
    assert found.reason[:2] == (None, None)
    assert found.reason[2] is not None
    assert np.isnan(found.value[:, 2]).all()


def test_refits_widen_the_interval_by_their_largest_change() -> None:
    slopes, other = np.array([1.0, 2.0, -2.0]), np.array([1.0, 2.2, -2.0])
    plainly = effects(lambda z: (z @ slopes)[:, None], THREE, 64)
    changed = effects(lambda z: (z @ other)[:, None], THREE, 64)
    refits = [lambda z: (z @ other)[:, None], lambda z: (z @ slopes)[:, None]]
    widened = effects(lambda z: (z @ slopes)[:, None], THREE, 64, refits=refits)
    wider = (widened.high - plainly.high)[:, 0]
    assert np.allclose(wider, np.abs(changed.value - plainly.value)[:, 0], rtol=1e-9)
    assert np.array_equal(widened.value, plainly.value)


def test_too_many_players_are_refused() -> None:
    with pytest.raises(InputError, match="at most 10"):
        effects(lambda z: z[:, :1], np.eye(11), 2)
