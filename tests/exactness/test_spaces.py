"""Approximation spaces: each reproduces its own elements, and says the truth about them.

Oracles: elements written down without the package (numpy's interp, its polynomial classes, sums of cosines
and sines), Gauss rules of numpy on the pieces between nodes, and scipy's adaptive quadrature.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pytest
from numpy.polynomial import Chebyshev as ChebyshevSeries
from numpy.polynomial.legendre import leggauss
from scipy.integrate import quad

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.geometry import Domain, Interval, Ring, interval_grid, ring_grid
from aleafield.projection.scheme import PROJECTORS
from aleafield.quadrature import extremal_points
from aleafield.spaces import Space, SpectralSpace, make_space, nodes_refinement

EPS = float(np.finfo(np.float64).eps)
INTERVAL = Interval(-1.5, 2.0)
RING = Ring(3.0)
N_SAMPLES = 8

Function = Callable[[FloatArray], FloatArray]


@dataclass(frozen=True)
class Element:
    """A function of a space, and its first two derivatives, written down without the package."""

    value: Function
    slope: Function
    curvature: Function


def linear_element(space: Space, rng: np.random.Generator) -> Element:
    """Interpolation of random values by numpy."""
    x = space.nodes[space.display_order]
    values = rng.normal(size=space.n)
    period = space.domain.length if space.domain.periodic else None
    if period is not None:
        x, values = np.append(x, x[0] + period), np.append(values, values[0])

    def slope(at: FloatArray) -> FloatArray:
        place = at if period is None else x[0] + np.mod(at - x[0], period)
        element = np.clip(np.searchsorted(x, place, side="right") - 1, 0, len(x) - 2)
        return (np.diff(values) / np.diff(x))[element]

    return Element(lambda at: np.interp(at, x, values, period=period), slope, np.zeros_like)


def polynomial_element(space: Space, rng: np.random.Generator) -> Element:
    """A random Chebyshev series whose top coefficient is one of the larger ones."""
    coefficients = rng.normal(size=space.n) / (1.0 + np.arange(space.n)) ** 2
    coefficients[-1] = 0.5
    series = ChebyshevSeries(coefficients, domain=[space.domain.low, space.domain.high])
    return Element(series, series.deriv(1), series.deriv(2))


def trigonometric_element(space: Space, rng: np.random.Generator) -> Element:
    """A random sum of the modes of the space; of the last mode of an even n the cosine alone."""
    n, wave = space.n, 2 * np.pi / space.domain.length
    k = np.arange(n // 2 + 1)
    cosine, sine = rng.normal(size=(2, len(k))) / (1.0 + k) ** 2
    if n % 2 == 0:
        sine[-1] = 0.0

    def derivative(order: int) -> Function:
        def evaluate(at: FloatArray) -> FloatArray:
            angle = wave * np.multiply.outer(np.asarray(at), k) + 0.5 * np.pi * order
            waves = np.cos(angle) * cosine + np.sin(angle) * sine
            return np.asarray((waves * (wave * k) ** order).sum(axis=-1))

        return evaluate

    return Element(derivative(0), derivative(1), derivative(2))


CASES: list[tuple[str, Domain, int, Callable[[Space, np.random.Generator], Element]]] = [
    *[("piecewise linear", INTERVAL, n, linear_element) for n in (3, 8, 33)],
    *[("piecewise linear", RING, n, linear_element) for n in (3, 8, 33)],
    *[("chebyshev", INTERVAL, n, polynomial_element) for n in (2, 3, 8, 17)],
    *[("legendre", INTERVAL, n, polynomial_element) for n in (1, 2, 8, 17)],
    *[("fourier", RING, n, trigonometric_element) for n in (1, 2, 3, 8, 17)],
]


@dataclass(frozen=True)
class Case:
    """A space with a batch of its elements, known twice: by unknowns and as functions."""

    space: Space
    elements: list[Element]
    unknowns: FloatArray

    def stacked(self, part: str, x: FloatArray) -> FloatArray:
        """value, slope or curvature of each element at its row of x (S, P) or at the shared x (P,)."""
        rows = np.broadcast_to(x, (N_SAMPLES, x.shape[-1]))
        return np.stack([getattr(e, part)(row) for e, row in zip(self.elements, rows, strict=True)])


def make_case(
    projector: str, domain: Domain, n: int, make_element: Callable[[Space, np.random.Generator], Element]
) -> Case:
    """Elements of a space of dimension n; the same ones whenever it is called."""
    space = make_space(projector, domain, n)
    rng = np.random.default_rng(n)
    elements = [make_element(space, rng) for _ in range(N_SAMPLES)]
    nodal = np.stack([e.value(space.nodes) for e in elements])
    return Case(space, elements, space.coefficients(nodal))


@pytest.fixture(params=CASES, ids=lambda c: f"{c[0]}-{'ring' if c[1].periodic else 'interval'}-{c[2]}")
def case(request: pytest.FixtureRequest) -> Case:
    return make_case(*request.param)


@pytest.fixture
def scattered(case: Case) -> FloatArray:
    """Points of the domain, the same for all samples; both ends and a node among them."""
    inner = np.random.default_rng(5).uniform(case.space.domain.low, case.space.domain.high, 11)
    return np.concatenate((inner, [case.space.domain.low, case.space.domain.high], case.space.nodes[:1]))


def rounding(case: Case) -> float:
    """Rounding of values of size 1: a sum of n terms, and rounded points in functions of slope n^2."""
    return 16 * EPS * case.space.n**2


def integral(f: Function, space: Space) -> float:
    """By 24 Gauss points on each piece between nodes: exact for degree 47, and for waves to rounding."""
    inner = space.nodes[space.display_order]
    breaks = np.unique(np.concatenate(([space.domain.low], inner, [space.domain.high])))
    points, weights = leggauss(24)
    middle, half = 0.5 * (breaks[1:] + breaks[:-1]), 0.5 * np.diff(breaks)
    at = middle[:, None] + half[:, None] * points
    return float((f(at.ravel()).reshape(at.shape) * weights * half[:, None]).sum())


def test_every_projector_has_a_case() -> None:
    assert {c[0] for c in CASES} == set(PROJECTORS)


def test_projection_reproduces_the_elements(case: Case, scattered: FloatArray) -> None:
    values = case.space.evaluate(case.unknowns, scattered)
    np.testing.assert_allclose(values, case.stacked("value", scattered), rtol=0.0, atol=rounding(case))


def test_nodal_values_and_unknowns_are_one_element(case: Case) -> None:
    at_nodes = case.stacked("value", case.space.nodes)
    np.testing.assert_allclose(case.space.nodal(case.unknowns), at_nodes, rtol=0.0, atol=rounding(case))


def test_evaluation_matrix_and_points_of_each_sample_agree(case: Case, scattered: FloatArray) -> None:
    space, u = case.space, case.unknowns
    shared = space.evaluate(u, scattered)
    np.testing.assert_allclose(
        u @ space.evaluation_matrix(scattered).T, shared, rtol=0.0, atol=rounding(case)
    )
    own = np.random.default_rng(6).uniform(space.domain.low, space.domain.high, (N_SAMPLES, 7))
    np.testing.assert_allclose(
        space.evaluate_each(u, own), case.stacked("value", own), rtol=0.0, atol=rounding(case)
    )


@pytest.mark.parametrize(("order", "part"), [(1, "slope"), (2, "curvature")])
def test_derivatives(case: Case, order: int, part: str) -> None:
    space, u = case.space, case.unknowns
    rng = np.random.default_rng(7)
    points = rng.uniform(space.domain.low, space.domain.high, 9)
    own = rng.uniform(space.domain.low, space.domain.high, (N_SAMPLES, 3))
    tolerance = rounding(case) * (2.0 * space.n**2) ** order
    matrix = space.derivative_matrix(points, order)
    np.testing.assert_allclose(u @ matrix.T, case.stacked(part, points), rtol=0.0, atol=tolerance)
    each = space.differentiate_each(u, own, order)
    np.testing.assert_allclose(each, case.stacked(part, own), rtol=0.0, atol=tolerance)


def test_jets_at_a_point_of_each(case: Case) -> None:
    """Value, slope and curvature; a choice of elements has the bits of all of them."""
    space = case.space
    if not isinstance(space, SpectralSpace):
        return
    x = np.random.default_rng(8).uniform(space.domain.low, space.domain.high, N_SAMPLES)
    jets, every = space.jets(case.unknowns), np.arange(N_SAMPLES)
    found = jets(every, x)
    for order, part in enumerate(("value", "slope", "curvature")):
        tolerance = rounding(case) * (2.0 * space.n**2) ** order
        expected = case.stacked(part, x[:, None])[:, 0]
        np.testing.assert_allclose(found[order], expected, rtol=0.0, atol=tolerance)
    for which in (every[2:5], every[-1:]):
        for part_of, whole in zip(jets(which, x[which]), found, strict=True):
            assert np.array_equal(part_of, whole[which])


def test_a_piecewise_linear_element_has_the_slope_on_the_right_of_a_node() -> None:
    space = make_space("piecewise linear", INTERVAL, 8)
    u = np.random.default_rng(1).normal(size=(N_SAMPLES, 8))
    rise = np.diff(u, axis=1) / (INTERVAL.length / 7)
    expected = np.concatenate((rise, rise[:, -1:]), axis=1)
    np.testing.assert_allclose(u @ space.derivative_matrix(space.nodes).T, expected, rtol=1e-12)


def test_integral(case: Case) -> None:
    exact = [integral(e.value, case.space) for e in case.elements]
    values = (case.unknowns * case.space.integral_weights).sum(axis=-1)
    np.testing.assert_allclose(values, exact, rtol=0.0, atol=rounding(case) * case.space.domain.length)


def square(element: Element) -> Function:
    """The square of an element."""
    return lambda x: element.value(x) ** 2


def test_integral_of_the_square(case: Case) -> None:
    exact = [integral(square(element), case.space) for element in case.elements]
    tolerance = rounding(case) * case.space.domain.length
    np.testing.assert_allclose(case.space.square_integral(case.unknowns), exact, rtol=0.0, atol=tolerance)


def test_fourier_coefficients_of_the_interpolant(case: Case) -> None:
    space = case.space
    if not space.domain.periodic:
        with pytest.raises(InputError, match="a ring is needed"):
            space.fourier_coefficient(case.unknowns, 1)
        return
    breaks = np.sort(space.nodes)[1:]
    element = case.elements[0].value
    for k in sorted({0, 1, -2, space.n // 2, space.n // 2 + 1, space.n}):
        wave = 2 * np.pi * k / space.domain.length
        parts = [
            quad(
                lambda x, f=f, wave=wave: float(element(np.array([x]))[0]) * f(wave * x),
                space.domain.low,
                space.domain.high,
                points=breaks if len(breaks) else None,
                limit=400,
                epsabs=1e-12,
            )[0]
            for f in (np.cos, np.sin)
        ]
        expected = (parts[0] - 1j * parts[1]) / space.domain.length
        found = space.fourier_coefficient(case.unknowns, k)
        assert found.shape == (N_SAMPLES,)
        assert found[0] == pytest.approx(expected, abs=1e-11), k


def test_search_grid_is_ascending_and_dense(case: Case) -> None:
    grid, domain = case.space.search_grid, case.space.domain
    assert np.all(np.diff(grid) > 0.0)
    assert grid[0] >= domain.low
    assert grid[-1] <= domain.high
    if case.space.projector == "piecewise linear":
        assert np.array_equal(grid, np.sort(case.space.nodes))
    else:
        assert len(grid) >= 4 * case.space.n - 3
    np.testing.assert_allclose(
        case.space.evaluate(case.unknowns, grid), case.stacked("value", grid), rtol=0.0, atol=rounding(case)
    )


def test_display_order_sorts_the_nodes(case: Case) -> None:
    assert np.array_equal(case.space.nodes[case.space.display_order], np.sort(case.space.nodes))


SIZES = {"piecewise linear": 65, "chebyshev": 65, "legendre": 64, "fourier": 256}
N_ROWS = 96
ON_DOMAINS: list[tuple[str, Domain]] = [
    ("piecewise linear", INTERVAL),
    ("piecewise linear", RING),
    ("chebyshev", INTERVAL),
    ("legendre", INTERVAL),
    ("fourier", RING),
]


@pytest.mark.parametrize(("projector", "domain"), ON_DOMAINS)
def test_bits_of_a_row_do_not_depend_on_the_batch(projector: str, domain: Domain) -> None:
    space = make_space(projector, domain, SIZES[projector])
    rng = np.random.default_rng(11)
    u = rng.normal(size=(N_ROWS, space.n))
    own = rng.uniform(domain.low, domain.high, (N_ROWS, 3))
    shared = rng.uniform(domain.low, domain.high, 3 * space.n + 1)
    grid = space.search_grid

    def everything(rows: FloatArray, points: FloatArray) -> FloatArray:
        parts = [
            space.evaluate(rows, shared),
            space.evaluate(rows, grid),
            space.coefficients(rows),
            space.nodal(rows),
            space.evaluate_each(rows, points),
            space.differentiate_each(rows, points),
            space.square_integral(rows)[:, None],
        ]
        return np.concatenate(parts, axis=1)

    reference = everything(u, own)
    order = rng.permutation(N_ROWS)
    for width in (8, 16, 32, 96):
        for start in range(0, N_ROWS, width):
            rows = order[start : start + width]
            assert np.array_equal(everything(u[rows], own[rows]), reference[rows]), width

    each = np.concatenate((space.evaluate_each(u, own), space.differentiate_each(u, own)), axis=1)
    for rows in (order[:1], order[1:4], order[4:17]):
        found = (space.evaluate_each(u[rows], own[rows]), space.differentiate_each(u[rows], own[rows]))
        assert np.array_equal(np.concatenate(found, axis=1), each[rows])

    failed = u.copy()
    failed[5, 3], failed[20, 0] = np.nan, np.inf
    own_failed = own.copy()
    own_failed[30, 1] = np.nan
    sound = np.setdiff1d(np.arange(N_ROWS), [5, 20, 30])
    with np.errstate(all="ignore"):
        assert np.array_equal(everything(failed, own_failed)[sound], reference[sound])


@pytest.mark.parametrize(("projector", "domain"), ON_DOMAINS)
def test_a_point_that_is_not_finite_has_no_value(projector: str, domain: Domain) -> None:
    space = make_space(projector, domain, 9)
    u = np.ones((N_SAMPLES, 9))
    x = np.zeros((N_SAMPLES, 2))
    x[2, 1], x[3, 0] = np.nan, np.inf
    expected = ~np.isfinite(x)
    with np.errstate(all="ignore"):
        for values in (space.evaluate_each(u, x), space.differentiate_each(u, x, 1)):
            assert np.array_equal(np.isnan(values), expected)


NESTED = [
    ("fourier", RING, n, ring_grid(RING, m), "fourier transform")
    for n, m in ((128, 256), (255, 510), (256, 512), (256, 1000))
] + [
    ("fourier", RING, 256, np.sort(ring_grid(RING, 1024)), "fourier transform"),
    ("fourier", RING, 255, np.sort(ring_grid(RING, 1020)), "fourier transform"),
    ("fourier", RING, 16, ring_grid(RING, 32), "dense"),
    ("chebyshev", INTERVAL, 521, extremal_points(INTERVAL, 1041), "cosine transform"),
    ("chebyshev", INTERVAL, 520, extremal_points(INTERVAL, 1500), "cosine transform"),
    ("chebyshev", INTERVAL, 33, extremal_points(INTERVAL, 65), "dense"),
    ("piecewise linear", INTERVAL, 33, interval_grid(INTERVAL, 64), "gather"),
]


@pytest.mark.parametrize(("projector", "domain", "n", "points", "name"), NESTED)
def test_prolongation_to_a_nested_grid_equals_the_dense_product(
    projector: str, domain: Domain, n: int, points: FloatArray, name: str
) -> None:
    """Elements with unknowns of size 1 and a smooth envelope, so that rounding of the points does no harm."""
    space = make_space(projector, domain, n)
    rng = np.random.default_rng(n)
    rough = 1e-3 * rng.normal(size=(N_SAMPLES, n))
    u = np.cos(2 * np.pi * space.nodes / domain.length + rng.uniform(0, 6, (N_SAMPLES, 1))) + rough
    prolongation = space.prolongation(points)
    assert prolongation.name == name
    # roughness 1e-3 has slopes up to 1e-3 n^2 per length, met by points that are rounded
    tolerance = 16 * EPS * (n + 1e-3 * n**2)
    dense = u @ space.evaluation_matrix(points).T
    np.testing.assert_allclose(prolongation.apply(u), dense, rtol=0.0, atol=tolerance)


@pytest.mark.parametrize(("projector", "domain"), ON_DOMAINS)
def test_prolongation_is_set_up_once_and_forgotten_in_time(projector: str, domain: Domain) -> None:
    space = make_space(projector, domain, 9)
    points = np.array([0.1, 0.2])
    kept = space.prolongation(points)
    assert space.prolongation(points.copy()) is kept
    for shift in range(40):
        space.prolongation(points + 0.01 * (shift + 1))
    assert space.prolongation(points) is not kept


@pytest.mark.parametrize("domain", [INTERVAL, RING])
@pytest.mark.parametrize("n", [7, 64, 257])
def test_piecewise_linear_reproduces_its_nodes_to_the_bit(domain: Domain, n: int) -> None:
    space = make_space("piecewise linear", domain, n)
    u = np.random.default_rng(n).normal(size=(N_SAMPLES, n))
    finer = make_space("piecewise linear", domain, 2 * n if domain.periodic else 2 * n - 1).nodes
    assert np.array_equal(space.evaluate(u, finer)[:, ::2], u)
    assert np.array_equal(space.evaluate(u, space.nodes[space.display_order]), u[:, space.display_order])
    assert space.prolongation(space.nodes).name == "identity"
    moved = np.tile(space.nodes * (1.0 + EPS), (N_SAMPLES, 1))
    assert np.array_equal(space.evaluate_each(u, moved), u)


LEVELS = [
    ("piecewise linear", INTERVAL, 257, 513, 129, 5),
    ("piecewise linear", RING, 256, 512, 128, 6),
    ("chebyshev", INTERVAL, 33, 65, 17, 3),
    ("legendre", INTERVAL, 33, 66, 16, 2),
    ("fourier", RING, 256, 512, 128, 2),
]


@pytest.mark.parametrize(("projector", "domain", "n", "finer", "coarser", "minimum"), LEVELS)
def test_dimensions_of_the_levels(
    projector: str, domain: Domain, n: int, finer: int, coarser: int, minimum: int
) -> None:
    counts = nodes_refinement(projector, domain)
    assert (counts.refined(n), counts.coarsened(n), counts.admissible(n)) == (
        finer,
        (coarser, None),
        (n, None),
    )
    assert counts.minimum == minimum
    with pytest.raises(InputError, match=rf"scheme\.nodes: {minimum - 1}; at least {minimum} is needed"):
        counts.admissible(minimum - 1)
    with pytest.raises(InputError, match=r"scheme\.nodes: 0; at least"):
        make_space(projector, domain, 0)


@pytest.mark.parametrize(
    ("projector", "domain", "needed"),
    [
        ("chebyshev", RING, "use 'piecewise linear' or 'fourier'"),
        ("legendre", RING, "use 'piecewise linear' or 'fourier'"),
        ("fourier", INTERVAL, "use 'piecewise linear' or 'chebyshev' or 'legendre'"),
        ("hermite", INTERVAL, "one of piecewise linear, chebyshev, legendre, fourier"),
    ],
)
def test_spaces_that_do_not_exist_on_a_domain(projector: str, domain: Domain, needed: str) -> None:
    with pytest.raises(InputError, match=needed) as caught:
        make_space(projector, domain, 9)
    assert caught.value.key == "scheme.projector"
