"""Quadrature rules: what each claims to integrate exactly, and that it claims no more.

Oracles: integrals of monomials, of Chebyshev polynomials and of trigonometric functions in closed form; the
error of a Gauss rule for the first monomial it misses, which is the integral of the squared monic Legendre
polynomial; tables of Abramowitz and Stegun 25.4 and of DLMF 3.5 (from memory).
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.geometry import Domain, Interval, Ring
from aleafield.quadrature import (
    RULE_NAMES,
    Rule,
    clenshaw_curtis,
    composite_gauss,
    count_refinement,
    gauss_legendre,
    make_rule,
    periodic_trapezoid,
    simpson,
    trapezoid,
)

INTERVAL = Interval(-1.5, 2.0)
RING = Ring(3.0)
REFERENCE = Interval(-1.0, 1.0)
EPS = float(np.finfo(np.float64).eps)
ON_DOMAINS = [(name, INTERVAL) for name in RULE_NAMES] + [
    (name, RING) for name in ("trapezoid", "simpson", "composite gauss")
]


def missed_by_gauss(n: int) -> float:
    """Integral of t^(2n) over [-1, 1] less its n-point Gauss value: that of the squared monic P_n."""
    return 2.0 ** (2 * n + 1) * math.factorial(n) ** 4 / ((2 * n + 1) * math.factorial(2 * n) ** 2)


def monomial_error(rule: Rule, degree: int) -> float:
    """Exact integral of t^degree less the rule's value, t the coordinate on [-1, 1], measured in t."""
    half = 0.5 * INTERVAL.length
    t = (rule.points - 0.5 * (INTERVAL.low + INTERVAL.high)) / half
    exact = 0.0 if degree % 2 else 2.0 / (degree + 1)
    return exact - float(np.sum(rule.weights * t**degree)) / half


def rounding(rule: Rule) -> float:
    """Each of Q terms, of size weight, carries a few roundings; the weights of t sum to 2."""
    return 2.0 * EPS * (8 + len(rule.points))


def first_miss_of_composite(rule: str, panels: int, per_panel: int = 2) -> float:
    """Exact less rule for the first missed monomial: the derivative in its error term is constant."""
    h = 2.0 / panels
    if rule == "trapezoid":
        return -2.0 * h**2 / 12.0 * 2.0
    if rule == "simpson":
        return -2.0 * (h / 2.0) ** 4 / 180.0 * 24.0
    return panels * (h / 2.0) ** (2 * per_panel + 1) * missed_by_gauss(per_panel)


POLYNOMIAL_CLAIMS = [
    *[(trapezoid(INTERVAL, m), 1, first_miss_of_composite("trapezoid", m)) for m in (1, 2, 7, 32)],
    *[(simpson(INTERVAL, m), 3, first_miss_of_composite("simpson", m)) for m in (1, 2, 7, 32)],
    *[
        (composite_gauss(INTERVAL, m, p), 2 * p - 1, first_miss_of_composite("gauss", m, p))
        for m in (1, 5)
        for p in (1, 2, 3, 4)
    ],
    *[(gauss_legendre(INTERVAL, n), 2 * n - 1, missed_by_gauss(n)) for n in range(1, 17)],
]


@pytest.mark.parametrize(
    ("rule", "degree", "miss"), POLYNOMIAL_CLAIMS, ids=lambda v: v.name if isinstance(v, Rule) else None
)
def test_polynomials_up_to_the_claimed_degree_and_no_further(rule: Rule, degree: int, miss: float) -> None:
    for d in range(degree + 1):
        assert abs(monomial_error(rule, d)) <= rounding(rule), d
    assert abs(miss) > 1e3 * rounding(rule)
    assert monomial_error(rule, degree + 1) == pytest.approx(miss, rel=1e-4, abs=rounding(rule))


def chebyshev_integral(k: int) -> float:
    """Integral of T_k over [-1, 1]."""
    return 0.0 if k % 2 else 2.0 / (1.0 - k * k)


@pytest.mark.parametrize("n", [2, 3, 4, 5, 8, 9, 16, 33, 64, 257])
def test_clenshaw_curtis_integrates_its_polynomials_and_aliases_the_next(n: int) -> None:
    """On n points T_k looks like T_(2(n - 1) - k); degree n - 1 is exact, n too where n is odd."""
    rule = clenshaw_curtis(REFERENCE, n)
    tolerance = 8 * EPS * n
    claimed = n if n % 2 else n - 1
    for k in range(claimed + 1):
        value = float(np.sum(rule.weights * np.cos(k * np.arccos(rule.points))))
        assert value == pytest.approx(chebyshev_integral(k), abs=tolerance), k
    k = claimed + 1
    aliased = chebyshev_integral(abs(2 * (n - 1) - k))
    value = float(np.sum(rule.weights * np.cos(k * np.arccos(rule.points))))
    assert value == pytest.approx(aliased, abs=tolerance)
    assert abs(aliased - chebyshev_integral(k)) > 10 * tolerance


def ring_value(rule: Rule, wave: Callable[[FloatArray], FloatArray], k: int) -> float:
    """The rule's mean of a wave of number k over the ring."""
    return float(np.sum(rule.weights * wave(2 * np.pi * k * rule.points / RING.length))) / RING.length


@pytest.mark.parametrize("n", [1, 2, 5, 8, 33])
@pytest.mark.parametrize(
    ("make", "at_n"),
    [
        (periodic_trapezoid, 1.0),
        # simpson = (4 trapezoid(2n) - trapezoid(n)) / 3, of which the first is exact for k = n
        (simpson, -1.0 / 3.0),
        # each panel is one period: the mean of cos at the Gauss points (1 -+ 1/sqrt(3)) / 2 of a period
        (composite_gauss, -math.cos(math.pi / math.sqrt(3.0))),
    ],
)
def test_waves_below_the_number_of_panels_and_not_that_number(
    make: Callable[[Ring, int], Rule], at_n: float, n: int
) -> None:
    rule = make(RING, n)
    tolerance = 16 * EPS * (n + 1)
    for k in range(n):
        assert ring_value(rule, np.cos, k) == pytest.approx(float(k == 0), abs=tolerance), k
        assert ring_value(rule, np.sin, k) == pytest.approx(0.0, abs=tolerance), k
    assert ring_value(rule, np.cos, n) == pytest.approx(at_n, abs=tolerance)


@pytest.mark.parametrize(("k", "aliased"), [(0, 0.7054901960784), (1, 0.356862745098), (3, 0.1098039215686)])
def test_aliasing_of_the_periodic_trapezoid(k: int, aliased: float) -> None:
    """Poisson kernel with symbol g r^k, g = 0.7, r = 0.5, on N = 8 points: g (r^k + r^(N - k)) / (1 - r^N).

    Source: Trefethen and Weideman 2014 (from memory); values confirmed by matrices outside this package.
    """
    g, r, n = 0.7, 0.5, 8
    rule = periodic_trapezoid(Ring(2 * math.pi), n)
    x = rule.points
    kernel = g / (2 * np.pi) * (1 - r * r) / (1 - 2 * r * np.cos(x) + r * r)
    value = float(np.sum(rule.weights * kernel * np.cos(k * x)))
    assert value == pytest.approx(g * (r**k + r ** (n - k)) / (1 - r**n), rel=16 * EPS)
    assert value == pytest.approx(aliased, abs=1e-13)


@pytest.mark.parametrize(("name", "domain"), ON_DOMAINS)
@pytest.mark.parametrize("count", [2, 3, 9, 64, 257])
def test_weights_are_positive_and_sum_to_the_length_points_lie_inside(
    name: str, domain: Domain, count: int
) -> None:
    rule = make_rule(name, domain, count)
    assert rule.name == name
    assert rule.points.shape == rule.weights.shape
    assert np.all(rule.weights > 0.0)
    assert float(rule.weights.sum()) == pytest.approx(domain.length, rel=8 * EPS * count)
    assert np.all((rule.points >= domain.low) & (rule.points <= domain.high))
    if domain.periodic:
        assert np.all(rule.points < domain.high)
        going_round = np.mod(rule.points, domain.length)
    else:
        going_round = rule.points
    assert np.all(np.diff(going_round) > 0.0)
    ends_are_points = not domain.periodic and rule.points[0] == domain.low and rule.points[-1] == domain.high
    assert ends_are_points == (not domain.periodic and "gauss" not in name)


@pytest.mark.parametrize(("name", "domain"), ON_DOMAINS)
def test_the_lattice_describes_the_points(name: str, domain: Domain) -> None:
    rule = make_rule(name, domain, 9)
    if name in ("gauss-legendre", "clenshaw-curtis"):
        assert rule.lattice is None
        assert rule.spacing is None
        return
    assert rule.lattice is not None
    interleaved = len(rule.lattice.offsets)
    assert interleaved == (2 if name == "composite gauss" else 1)
    assert (rule.spacing is None) == (name == "composite gauss")
    for k, offset in enumerate(rule.lattice.offsets):
        points = rule.points[k::interleaved]
        steps = np.arange(len(points), dtype=np.float64)
        expected = rule.lattice.origin + offset + rule.lattice.spacing * steps
        np.testing.assert_allclose(points, domain.wrap(expected), rtol=0.0, atol=8 * EPS * domain.length)


def test_number_of_points_of_each_rule() -> None:
    counts: dict[tuple[str, Domain], int] = {
        ("trapezoid", INTERVAL): 9,
        ("simpson", INTERVAL): 17,
        ("composite gauss", INTERVAL): 16,
        ("gauss-legendre", INTERVAL): 9,
        ("clenshaw-curtis", INTERVAL): 9,
        ("trapezoid", RING): 9,
        ("simpson", RING): 18,
        ("composite gauss", RING): 18,
    }
    for (name, domain), points in counts.items():
        assert len(make_rule(name, domain, 9).points) == points, (name, domain)


@pytest.mark.parametrize(("name", "domain"), ON_DOMAINS)
def test_doubling_and_halving(name: str, domain: Domain) -> None:
    both_ends = not domain.periodic and name != "gauss-legendre"
    counts = count_refinement(name, domain)
    doubled = counts.refined(33)
    assert doubled == (65 if both_ends else 66)
    assert counts.coarsened(doubled)[0] == 33
    assert counts.coarsened(33)[0] == (17 if both_ends else 16)
    used, note = counts.admissible(32)
    assert used == (33 if both_ends else 32)
    assert (note is not None) == both_ends
    if note is not None:
        assert "32" in note
        assert "33 is used" in note
    assert counts.coarsened(32)[0] == (17 if both_ends else 16)
    if name not in ("gauss-legendre", "composite gauss"):
        coarse, fine = (make_rule(name, domain, c).points for c in (33, doubled))
        assert np.array_equal(coarse, fine[::2])


ABRAMOWITZ_STEGUN_25_4 = {
    5: (
        [-0.9061798459387, -0.5384693101057, 0.0, 0.5384693101057, 0.9061798459387],
        [0.236926885056189, 0.478628670499366, 0.568888888888889, 0.478628670499366, 0.236926885056189],
    ),
    10: (
        [0.148874338981631, 0.433395394129247, 0.679409568299024, 0.865063366688985, 0.973906528517172],
        [0.295524224714753, 0.269266719309996, 0.219086362515982, 0.149451349150581, 0.066671344308688],
    ),
}


@pytest.mark.parametrize("n", [5, 10])
def test_gauss_legendre_against_the_handbook(n: int) -> None:
    rule = gauss_legendre(REFERENCE, n)
    points, weights = ABRAMOWITZ_STEGUN_25_4[n]
    last_digit_of_points = 1e-13 if n == 5 else 1e-15
    of_points, of_weights = 0.5 * last_digit_of_points + 4 * EPS, 0.5e-15 + 4 * EPS
    np.testing.assert_allclose(rule.points[-len(points) :], points, rtol=0.0, atol=of_points)
    np.testing.assert_allclose(rule.weights[-len(points) :], weights, rtol=0.0, atol=of_weights)


@pytest.mark.parametrize(
    ("intervals", "weights"),
    [
        (4, [1 / 15, 8 / 15, 12 / 15, 8 / 15, 1 / 15]),
        (
            8,
            [
                *[0.015873015873016, 0.146218649216018, 0.279365079365079, 0.361717858720490],
                0.393650793650794,
                *[0.361717858720490, 0.279365079365079, 0.146218649216018, 0.015873015873016],
            ],
        ),
    ],
)
def test_clenshaw_curtis_against_the_handbook(intervals: int, weights: list[float]) -> None:
    rule = clenshaw_curtis(REFERENCE, intervals + 1)
    expected_points = -np.cos(np.pi * np.arange(intervals + 1) / intervals)
    np.testing.assert_allclose(rule.points, expected_points, rtol=0.0, atol=2 * EPS)
    np.testing.assert_allclose(rule.weights, weights, rtol=0.0, atol=0.5e-15 + 4 * EPS)


@pytest.mark.parametrize("name", ["gauss-legendre", "clenshaw-curtis"])
def test_rules_of_an_interval_are_refused_on_a_ring(name: str) -> None:
    with pytest.raises(InputError, match="trapezoid") as caught:
        make_rule(name, RING, 8)
    assert caught.value.key == "scheme.quadrature"


def test_unknown_name_and_too_few_points_are_refused() -> None:
    with pytest.raises(InputError, match=r"scheme\.quadrature: 'midpoint'; one of trapezoid"):
        make_rule("midpoint", INTERVAL, 8)
    with pytest.raises(InputError, match=r"scheme\.quadrature_points: 1; at least 2"):
        make_rule("trapezoid", INTERVAL, 1)
    with pytest.raises(InputError, match="at least 3 is needed, so that a coarser level exists"):
        count_refinement("clenshaw-curtis", INTERVAL).coarsened(2)
