"""Noise in X_n against direct interpolation, least squares, and inner products in closed form.

White noise: the projection of the waves of a ring onto hat functions by numpy's Gauss rule, onto polynomials by
spherical Bessel functions (DLMF 10.60.8, the expansion of a plane wave, from memory).
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.special import spherical_jn

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.kernels import GaussianKernel
from aleafield.field.noise import (
    Correlation,
    CosineCorrelation,
    ExponentialCorrelation,
    GaussianCorrelation,
    Noise,
    WhiteCorrelation,
)
from aleafield.field.noise_modes import NoiseModes, choose_modes
from aleafield.field.rates import LinearRate, LogisticRate, Rate, StepRate
from aleafield.geometry import Domain, Interval, Ring
from aleafield.projection.discretisation import Discretisation
from aleafield.projection.forcing import Forcing
from aleafield.projection.orthogonal import projected_modes
from aleafield.projection.pairing import Pairing, resolve
from aleafield.projection.path import split_path
from aleafield.projection.scheme import Scheme
from aleafield.quadrature import gauss_legendre, make_rule
from aleafield.randomness.laws import Uniform
from aleafield.spaces import Chebyshev, Fourier, Legendre, PiecewiseLinear
from tests.manufactured.problems import lone

INTERVAL, RING = Interval(-2.0, 3.0), Ring(5.0)
SCHEMES: list[tuple[Domain, str, str, int]] = [
    (INTERVAL, "piecewise linear", "collocation", 33),
    (INTERVAL, "piecewise linear", "galerkin", 33),
    (INTERVAL, "chebyshev", "collocation", 17),
    (INTERVAL, "legendre", "galerkin", 16),
    (RING, "piecewise linear", "collocation", 32),
    (RING, "piecewise linear", "galerkin", 32),
    (RING, "fourier", "collocation", 16),
    (RING, "fourier", "galerkin", 17),
]
SAMPLING = [scheme for scheme in SCHEMES if scheme[1:3] != ("piecewise linear", "galerkin")]
IDS = [f"{'ring' if d.periodic else 'interval'} {p} {m}" for d, p, m, _ in SCHEMES]


def field(domain: Domain, noise: Noise, rate: Rate | None = None) -> FieldEquation:
    kernel = lone(GaussianKernel(1.0, 0.5))
    return FieldEquation(domain, kernel, rate or LogisticRate(5.0, 0.3), Dynamics(2.0, 1.0), noise=noise)


def prepared(
    scheme: tuple[Domain, str, str, int], noise: Noise, modes: int, rate: Rate | None = None
) -> tuple[Discretisation, FieldEquation]:
    """A level with that many modes of a ring of three times the length on an interval, the domain else."""
    domain, projector, method, nodes = scheme
    equation = field(domain, noise, rate)
    pairing = resolve(Scheme(projector, method, nodes), equation)  # type: ignore[arg-type]
    white = isinstance(noise.correlation, WhiteCorrelation)
    ring = domain.length * (1.0 if domain.periodic else 3.0)
    kept = NoiseModes(modes, ring, None if white else 0.0, None if white else 0.0)
    level = Level(pairing.nodes, pairing.quadrature_points, modes=modes)
    return Discretisation(equation, level, pairing, kept), equation


def waves(x: FloatArray, modes: int, ring: float) -> FloatArray:
    """The mode functions written out, (modes, T)."""
    rows = [np.full_like(x, 1 / math.sqrt(ring))]
    for k in range(1, (modes + 1) // 2):
        angle = 2 * math.pi * k * x / ring
        rows += [math.sqrt(2 / ring) * np.cos(angle), math.sqrt(2 / ring) * np.sin(angle)]
    return np.stack(rows)


def matrix_of(discretisation: Discretisation, equation: FieldEquation, modes: int) -> FloatArray:
    """Unknowns of each mode as a batch sees them, the amplitude (1 / tau) sqrt(q_j) taken out."""
    assert equation.noise is not None
    system = discretisation.system(equation.bind(equation.binding({})), modes)
    ring = discretisation.domain.length * (1.0 if discretisation.domain.periodic else 3.0)
    amplitude = equation.noise.amplitudes(modes, ring) / 2.0
    return system.noise(np.diag(1.0 / amplitude))


NOISE = Noise(0.3, GaussianCorrelation(0.2))


@pytest.mark.parametrize("scheme", SCHEMES, ids=IDS)
def test_the_noise_is_projected_as_the_method_projects(scheme: tuple[Domain, str, str, int]) -> None:
    """Collocation, Fourier and Legendre: values at the nodes.  Piecewise-linear Galerkin: weighted least squares."""
    modes = 13
    discretisation, equation = prepared(scheme, NOISE, modes)
    space = discretisation.space
    ring = space.domain.length * (1.0 if space.domain.periodic else 3.0)
    found = matrix_of(discretisation, equation, modes)
    if scheme in SAMPLING:
        np.testing.assert_allclose(space.nodal(found), waves(space.nodes, modes, ring), atol=1e-12)
        return
    rule = make_rule("composite gauss", space.domain, space.n)
    root = np.sqrt(rule.weights)
    hats = space.evaluation_matrix(rule.points) * root[:, None]
    fitted = np.linalg.lstsq(hats, (waves(rule.points, modes, ring) * root).T, rcond=None)[0].T
    np.testing.assert_allclose(found, fitted, atol=1e-12)


@pytest.mark.parametrize("scheme", SAMPLING, ids=lambda scheme: scheme[1])
def test_the_variance_at_the_nodes_is_that_of_the_kept_modes(scheme: tuple[Domain, str, str, int]) -> None:
    """sum_j (sigma / tau)^2 q_j e_j(x)^2 = (sigma / tau)^2 (1 - dropped), at every point by whole pairs."""
    modes = 9
    noise = Noise(0.3, GaussianCorrelation(0.6))
    discretisation, equation = prepared(scheme, noise, modes)
    space = discretisation.space
    ring = space.domain.length * (1.0 if space.domain.periodic else 3.0)
    system = discretisation.system(equation.bind(equation.binding({})), modes)
    at_nodes = space.nodal(system.noise(np.eye(modes)))
    kept = 1.0 - noise.correlation.dropped(modes, ring)
    np.testing.assert_allclose((at_nodes**2).sum(axis=0), (0.3 / 2.0) ** 2 * kept, rtol=1e-11)


def hat_loads(space: PiecewiseLinear, modes: int, ring: float) -> FloatArray:
    """Integrals of the modes times the hat functions, (modes, n), by numpy's 60-point Gauss rule on each element."""
    panels = space.n if space.domain.periodic else space.n - 1
    h = space.domain.length / panels
    reference, weights = np.polynomial.legendre.leggauss(60)
    s = 0.5 * (1 + reference)
    loads = np.zeros((modes, space.n))
    for panel in range(panels):
        left, right = panel, (panel + 1) % space.n
        values = waves(space.nodes[left] + h * s, modes, ring) * (0.5 * h * weights)
        loads[:, left] += values @ (1 - s)
        loads[:, right] += values @ s
    return loads


@pytest.mark.parametrize("domain", [INTERVAL, RING], ids=["interval", "ring"])
def test_white_noise_on_hat_functions(domain: Domain) -> None:
    """Mass matrix times unknowns are the inner products, also for waves shorter than an element."""
    space = PiecewiseLinear(domain, 16)
    ring = domain.length * (1.0 if domain.periodic else 2.0)
    modes = 301
    h = domain.length / (16 if domain.periodic else 15)
    mass = (np.eye(16) * 4 + np.eye(16, k=1) + np.eye(16, k=-1)) * h / 6
    if domain.periodic:
        mass[0, -1] = mass[-1, 0] = h / 6
    else:
        mass[0, 0] = mass[-1, -1] = h / 3
    found = projected_modes(space, modes, ring) @ mass
    np.testing.assert_allclose(found, hat_loads(space, modes, ring), atol=1e-14)


@pytest.mark.parametrize("projector", [Legendre, Chebyshev])
@pytest.mark.parametrize("modes", [7, 201])
def test_white_noise_on_polynomials(projector: type[Legendre | Chebyshev], modes: int) -> None:
    """The integral of P_k(s) exp(i w s) over [-1, 1] is 2 i^k j_k(w)."""
    n, ring = 17, 10.0
    space = projector(INTERVAL, n)
    middle, half = 0.5, 2.5
    k = np.arange(n)
    rows = []
    for wave in range((modes + 1) // 2):
        frequency = 2 * math.pi * wave / ring
        phase = complex(math.cos(frequency * middle), math.sin(frequency * middle))
        integrals = 2 * 1j**k * spherical_jn(k, frequency * half) * half * phase
        coefficients = integrals * np.sqrt((2 * k + 1) / (2 * half))
        rows += [coefficients.real / math.sqrt(ring)] if wave == 0 else [
            math.sqrt(2 / ring) * coefficients.real, math.sqrt(2 / ring) * coefficients.imag
        ]  # fmt: skip
    expected = np.stack(rows)
    found = projected_modes(space, modes, ring)
    if projector is Chebyshev:
        fitted = gauss_legendre(INTERVAL, n)
        values = Legendre(INTERVAL, n).evaluation_matrix(fitted.points)
        np.testing.assert_allclose(
            found @ space.evaluation_matrix(fitted.points).T, expected @ values.T, atol=1e-12
        )
    else:
        np.testing.assert_allclose(found, expected, atol=1e-13)


@pytest.mark.parametrize("n", [32, 64, 128])
def test_white_noise_has_the_variance_of_problem_5_3(n: int) -> None:
    """Stationary variance n / (4 pi) for n modes on the ring of length 2 pi, mean over x: 2.546 for 32, ..."""
    published = {32: 2.54647908947, 64: 5.092958178941, 128: 10.18591635788}[n]
    space = Fourier(Ring(2 * math.pi), n)
    x = -math.pi + 2 * math.pi * np.arange(4 * n) / (4 * n)
    pieces = space.evaluate(projected_modes(space, 4 * n + 1, 2 * math.pi), x)
    assert (pieces**2).sum(axis=0).mean() / 2 == pytest.approx(published, rel=1e-11)


def test_white_noise_is_projected_alike_by_every_method() -> None:
    noise, rate = Noise(0.3, WhiteCorrelation()), LinearRate()
    schemes = [(INTERVAL, "piecewise linear", m, 33) for m in ("collocation", "galerkin")]
    found = [matrix_of(*prepared(scheme, noise, 65, rate), 65) for scheme in schemes]  # type: ignore[arg-type]
    np.testing.assert_array_equal(found[0], found[1])


@pytest.mark.parametrize("scheme", SCHEMES, ids=IDS)
def test_uncertain_noise(scheme: tuple[Domain, str, str, int]) -> None:
    """Each row is that of a study with its own certain numbers, to the bit and whatever its neighbours."""
    modes = 17
    noise = Noise(Uniform(0.1, 0.5), ExponentialCorrelation(Uniform(0.3, 2.0)))
    discretisation, equation = prepared(scheme, noise, modes)
    equation = replace(equation, dynamics=Dynamics(Uniform(1.0, 4.0), 1.0))
    random = np.random.default_rng(5)
    inputs = {
        "noise.strength": random.uniform(0.1, 0.5, 16),
        "noise.correlation_length": random.uniform(0.3, 2.0, 16),
        "dynamics.time_constant": random.uniform(1.0, 4.0, 16),
    }
    increments = random.standard_normal((16, modes))
    together = discretisation.system(equation.bind(equation.binding(inputs)), 16).noise(increments)
    few = {path: values[3:11] for path, values in inputs.items()}
    alone = discretisation.system(equation.bind(equation.binding(few)), 8).noise(increments[3:11])
    np.testing.assert_array_equal(together[3:11], alone)
    certain = Noise(
        float(inputs["noise.strength"][5]),
        ExponentialCorrelation(float(inputs["noise.correlation_length"][5])),
    )
    sure = replace(
        equation, noise=certain, dynamics=Dynamics(float(inputs["dynamics.time_constant"][5]), 1.0)
    )
    row = discretisation.system(sure.bind(sure.binding({})), 1).noise(increments[5:6])
    np.testing.assert_allclose(together[5], row[0], rtol=1e-13, atol=1e-15)


@pytest.mark.parametrize("rows", [1, 4])
def test_weights_along_a_functional(rows: int) -> None:
    random = np.random.default_rng(7)
    amplitude = random.uniform(0.5, 1.0, (5,) if rows == 1 else (rows, 5))
    forcing = Forcing(amplitude, random.standard_normal((5, 9)))
    increments, functional = random.standard_normal((rows, 5)), random.standard_normal(9)
    expected = forcing.apply(increments) @ functional
    np.testing.assert_allclose((increments * forcing.along(functional)).sum(axis=-1), expected, rtol=1e-13)


def test_a_field_without_noise_has_no_forcing() -> None:
    still = replace(field(RING, NOISE), noise=None)
    pairing = resolve(Scheme("fourier", "collocation", 16), still)
    discretisation = Discretisation(still, Level(16, 16), pairing)
    assert discretisation.system(still.bind(still.binding({})), 8).forcing is None
    assert discretisation.noise_operations == 0.0


def test_counted_operations() -> None:
    """700 for a random number, 2 n for its share of the product."""
    discretisation, _ = prepared((RING, "fourier", "collocation", 32), NOISE, 9)
    assert discretisation.noise_operations == 9 * (700 + 2 * 32)


def noisy_pairing(correlation: Correlation, projector: str, rate: Rate | None = None) -> Pairing:
    domain = RING if projector == "fourier" or isinstance(correlation, CosineCorrelation) else INTERVAL
    equation = field(domain, Noise(0.1, correlation), rate)
    return resolve(Scheme(projector, "galerkin" if projector == "legendre" else "collocation", 33), equation)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("correlation", "projector", "orders"),
    [
        (GaussianCorrelation(0.5), "piecewise linear", (2.0, 2.0)),
        (GaussianCorrelation(0.5), "chebyshev", (None, None)),
        (CosineCorrelation((1.0,)), "fourier", (None, None)),
        (ExponentialCorrelation(0.5), "piecewise linear", (0.5, 1.0)),
        (ExponentialCorrelation(0.5), "fourier", (0.5, 1.0)),
    ],
)
def test_a_field_is_as_smooth_as_its_noise(
    correlation: Correlation, projector: str, orders: tuple[float | None, float | None]
) -> None:
    pairing = noisy_pairing(correlation, projector)
    assert (pairing.space.order, pairing.quadrature.order) == orders
    rough = isinstance(correlation, ExponentialCorrelation)
    assert pairing.space.observed_only is rough
    assert any("Brownian" in warning for warning in pairing.warnings) is rough
    assert (pairing.time.order, pairing.time.observed_only) == (1.0, False)


def test_only_observed_orders_where_theory_has_none() -> None:
    step = noisy_pairing(GaussianCorrelation(0.5), "piecewise linear", StepRate(0.3))
    assert (step.time.order, step.time.observed_only) == (1.0, True)
    white = noisy_pairing(WhiteCorrelation(), "legendre", LinearRate())
    assert (white.space.order, white.space.observed_only, white.quadrature.observed_only) == (
        None,
        True,
        True,
    )
    assert any("not a function" in warning for warning in white.warnings)
    assert white.time.order == 1.0


def test_the_path_of_levels_under_noise() -> None:
    """Twice the pairs of modes on the run's mesh; all other levels keep the run's modes."""
    equation = field(INTERVAL, Noise(0.1, ExponentialCorrelation(1.0)))
    pairing = resolve(Scheme("piecewise linear", "collocation", 33), equation)
    noise = choose_modes(equation, equation, 33, 65)
    assert noise is not None
    run = Level(33, 33, modes=noise.modes)
    parts = split_path(pairing, run, noise)
    assert [part.name for part in parts] == ["quadrature", "space", "time", "noise_modes"]
    assert {level.modes for part in parts[:3] for level in part.levels} == {noise.modes}
    last = parts[-1]
    assert last.pair == (run, replace(run, modes=2 * noise.modes + 1))
    assert (last.coarse_pair, last.known_factor) == (None, noise.factor)
    assert last.levels == frozenset(last.pair)


@pytest.mark.parametrize("correlation", [CosineCorrelation((1.0, 0.5)), WhiteCorrelation()])
def test_no_part_where_no_share_is_dropped(correlation: Correlation) -> None:
    equation = field(RING, Noise(0.1, correlation), LinearRate())
    pairing = resolve(Scheme("fourier", "collocation", 32), equation)
    noise = choose_modes(equation, equation, 32, 64)
    assert noise is not None
    parts = split_path(pairing, Level(32, 32, modes=noise.modes), noise)
    assert [part.name for part in parts] == ["quadrature", "space", "time"]
