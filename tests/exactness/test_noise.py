"""Noise in space: covariances against their closed forms, shares that are dropped against plain sums, and the modes
that are kept.

Closed forms: sums over images, the hyperbolic form of the periodised exponential, and the variances of problem
5.2 of our list of reference problems (Poisson's summation of a Gaussian, checked there to 3e-16).
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.kernels import GaussianKernel
from aleafield.field.noise import (
    CosineCorrelation,
    ExponentialCorrelation,
    GaussianCorrelation,
    LengthCorrelation,
    Noise,
    WhiteCorrelation,
    mode_functions,
)
from aleafield.field.noise_modes import MOST_MODES, SAMPLES, TOLERANCE, NoiseModes, choose_modes
from aleafield.field.parameter import Parameter
from aleafield.field.rates import LinearRate
from aleafield.formula import Formula
from aleafield.geometry import Domain, Interval, Ring
from aleafield.randomness.laws import Discrete, LogNormal, Normal, TruncatedNormal, Uniform
from tests.manufactured.problems import lone

RING = 2 * math.pi
INTERVAL, ON_RING = Interval(-10.0, 10.0), Ring(RING)
FORMS: list[type[LengthCorrelation]] = [GaussianCorrelation, ExponentialCorrelation]
LENGTHS = np.array([0.02, 0.1, 0.3, 1.0, 3.0, 40.0])


def images(form: type[LengthCorrelation], z: FloatArray, length: float, ring: float) -> FloatArray:
    """The covariance summed over images and divided by its value at 0, as it is defined."""
    if form is ExponentialCorrelation:  # both geometric series
        distance = np.abs(z - ring * np.rint(z / ring))
        both = np.exp(-distance / length) + np.exp(-(ring - distance) / length)
        return np.asarray(both / (1.0 + math.exp(-ring / length)))
    shifts = ring * np.arange(-60 - int(9 * length / ring), 61 + int(9 * length / ring))
    values = [np.exp(-0.5 * ((at[..., None] + shifts) / length) ** 2).sum(axis=-1) for at in (z, np.zeros(1))]
    return np.asarray(values[0] / values[1])


def covariance(correlation: LengthCorrelation, x: FloatArray, modes: int, ring: float) -> FloatArray:
    """sum_j q_j e_j(x) e_j(y) at all pairs of points."""
    functions = mode_functions(x, modes, ring)
    return np.asarray((functions.T * correlation.spectrum(modes, ring)) @ functions)


def test_mode_functions_are_orthonormal() -> None:
    """The periodic trapezoid rule with more points than waves add up to is exact."""
    ring, modes = 3.7, 41
    x = -0.5 * ring + ring * np.arange(64) / 64
    functions = mode_functions(x, modes, ring)
    np.testing.assert_allclose(functions @ functions.T * (ring / 64), np.eye(modes), atol=1e-14)


def test_mode_functions_by_their_names() -> None:
    x = np.array([0.4, -1.3])
    first = np.cos(2 * np.pi * x / 5.0), np.sin(2 * np.pi * x / 5.0), np.cos(4 * np.pi * x / 5.0)
    np.testing.assert_allclose(mode_functions(x, 5, 5.0)[1:4], np.sqrt(0.4) * np.array(first), rtol=1e-14)
    np.testing.assert_allclose(mode_functions(x, 5, 5.0)[0], np.sqrt(0.2))


@pytest.mark.parametrize("length", LENGTHS)
def test_the_gaussian_covariance_is_the_sum_over_images(length: float) -> None:
    x = np.linspace(-3.0, 3.0, 13)
    modes = 2 * (20 + int(10 * RING / (2 * math.pi * length))) + 1
    expected = images(GaussianCorrelation, x[:, None] - x, length, RING)
    np.testing.assert_allclose(covariance(GaussianCorrelation(length), x, modes, RING), expected, atol=2e-14)


@pytest.mark.parametrize("length", LENGTHS)
def test_the_exponential_covariance_is_the_sum_over_images(length: float) -> None:
    """Its series ends slowly: what is left out is at most the dropped share of the variance."""
    x, modes = np.linspace(-3.0, 3.0, 13), 4001
    correlation = ExponentialCorrelation(length)
    found = covariance(correlation, x, modes, RING)
    dropped = correlation.dropped(modes, RING)
    expected = images(ExponentialCorrelation, x[:, None] - x, length, RING)
    assert np.abs(found - expected).max() <= dropped * (1 + 1e-6) + 1e-14
    np.testing.assert_allclose(np.diag(found), 1.0 - dropped, rtol=1e-13)


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("length", [0.3, 1.0, 3.0])
def test_the_spectrum_is_the_fourier_integral(form: type[LengthCorrelation], length: float) -> None:
    """q_k is the integral over the ring of C(z) cos(2 pi k z / R): adaptive quadrature."""
    found = form(length).spectrum(9, RING)
    for k in range(5):
        integral, _ = quad(
            lambda z, k=k: float(images(form, np.array([z]), length, RING)[0]) * math.cos(k * z),
            0.0, RING, limit=200, epsabs=1e-12, points=[math.pi],
        )  # fmt: skip
        np.testing.assert_allclose(found[[max(0, 2 * k - 1), 2 * k]], integral, rtol=0, atol=1e-10)


@pytest.mark.parametrize(
    ("length", "fixed_amplitude", "with_kernel"),
    [
        (1.0, 0.5000000026753, 0.862956089454),
        (0.5, 0.5, 0.7640489950732),
        (0.25, 0.5, 0.6450005438011),
        (0.1, 0.5, 0.5595428821216),
    ],
)
def test_variances_of_problem_5_2(length: float, fixed_amplitude: float, with_kernel: float) -> None:
    """Stationary variance without a kernel C(0) / 2, and with w_1 = 0.6: modes of rate 1 - w_k, noise q_k."""
    q = GaussianCorrelation(length).spectrum(401, RING)
    rates = np.ones(401)
    rates[1:3] = 0.4
    variance = (q / (2 * rates)).sum() / RING
    assert variance == pytest.approx(with_kernel / (2 * fixed_amplitude), rel=1e-12)
    assert q.sum() / RING == pytest.approx(1.0, rel=1e-13)


def gaussian_share(a: float, waves: int) -> float:
    """Plain sums over wave numbers, with enough terms."""
    k = np.arange(1, waves + int(12 / a) + 50, dtype=np.float64)
    terms = np.exp(-0.5 * (a * k) ** 2)
    return 2 * math.fsum(terms[waves:]) / (1 + 2 * math.fsum(terms))


def exponential_share(a: float, waves: int) -> float:
    """Plain sums of 200,000 terms, then the integral from half a step on (error (a k)^-2 k^-2 / 12, below 1e-11)."""
    last = 200_000
    terms = 1.0 / (1.0 + (a * np.arange(1, last + 1, dtype=np.float64)) ** 2)
    rest = math.atan2(1.0, a * (last + 0.5)) / a
    return 2 * (math.fsum(terms[waves:]) + rest) / (1 + 2 * (math.fsum(terms) + rest))


@pytest.mark.parametrize("a", [0.003, 0.049, 0.051, 0.7, 2.5, 3.0])
@pytest.mark.parametrize("reach", [0.0, 1.0, 4.0, 5.5])
def test_dropped_share_of_a_gaussian(a: float, reach: float) -> None:
    """Shares from 1 to 1e-8 and less to 8 digits, on both sides of where tails become integrals."""
    waves = int(reach / a)
    found = GaussianCorrelation(a * RING / (2 * math.pi)).dropped(2 * waves + 1, RING)
    assert found == pytest.approx(gaussian_share(a, waves), rel=1e-7)


@pytest.mark.parametrize("a", [0.003, 0.1, 1.0, 8.0, 300.0])
@pytest.mark.parametrize("waves", [0, 1, 5, 400])
def test_dropped_share_of_an_exponential(a: float, waves: int) -> None:
    found = ExponentialCorrelation(a * RING / (2 * math.pi)).dropped(2 * waves + 1, RING)
    assert found == pytest.approx(exponential_share(a, waves), rel=1e-9)


@pytest.mark.parametrize("form", FORMS)
def test_correlation_lengths_beyond_all_reason(form: type[LengthCorrelation]) -> None:
    """Much longer than the ring: constant in space with variance 1.  Much shorter: all waves alike, sum rule lost."""
    for long in (1e5, 1e200, 1e308):
        q = form(long).spectrum(5, RING)
        assert q[0] == pytest.approx(RING, rel=1e-9)
        assert np.all(q[1:] <= 1e-9)
        assert 0.0 <= form(long).dropped(1, RING) <= 1e-9
    for short in (1e-5, 1e-200, 1e-308):
        correlation = form(short)
        q = correlation.spectrum(5, RING)
        assert np.all(np.isfinite(q))
        integral = {GaussianCorrelation: math.sqrt(2 * math.pi), ExponentialCorrelation: 2.0}[form] * short
        if short > 1e-149:
            np.testing.assert_allclose(q, integral, rtol=1e-8)
        assert correlation.dropped(5, RING) == pytest.approx(1.0, abs=2e-5)


@pytest.mark.parametrize("form", FORMS)
def test_every_sample_has_its_own_length(form: type[LengthCorrelation]) -> None:
    together = form(LENGTHS)  # type: ignore[arg-type]
    alone = [form(float(length)) for length in LENGTHS]
    assert together.spectrum(33, RING).shape == (len(LENGTHS), 33)
    np.testing.assert_allclose(together.spectrum(33, RING), [c.spectrum(33, RING) for c in alone], rtol=1e-15)
    np.testing.assert_allclose(together.dropped(33, RING), [c.dropped(33, RING) for c in alone], rtol=1e-15)


def test_cosine_correlation() -> None:
    """C(z) = (1 + 3 cos z + 2 cos 3z) / 6, and one sample with other coefficients."""
    correlation = CosineCorrelation((1.0, 3.0, 0.0, 2.0))
    x = np.linspace(-3.0, 3.0, 9)
    functions = mode_functions(x, correlation.modes, RING)
    found = (functions.T * correlation.spectrum(correlation.modes, RING)) @ functions
    z = x[:, None] - x
    np.testing.assert_allclose(found, (1 + 3 * np.cos(z) + 2 * np.cos(3 * z)) / 6, atol=1e-14)
    assert correlation.modes == 7
    assert correlation.dropped(7, RING) == 0.0
    assert correlation.dropped(3, RING) == pytest.approx(1 / 3)
    assert not correlation.spectrum(11, RING)[7:].any()
    several = CosineCorrelation((1.0, np.array([3.0, 0.0, 1e308])))  # type: ignore[arg-type]
    np.testing.assert_allclose(several.spectrum(3, RING)[:, 0] / RING, [0.25, 1.0, 1e-308], rtol=1e-14)
    np.testing.assert_allclose(several.spectrum(3, RING).sum(axis=1), RING, rtol=1e-14)


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("share", [1e-3, 0.01, 0.1, 0.4, 1.0, 10.0])
def test_the_covariance_on_an_interval(form: type[LengthCorrelation], share: float) -> None:
    """The longer ring's modes give C(|x - y|) within 1e-6, and exactly `image_error` is reached at both ends."""
    interval = 20.0
    length = share * interval
    ring = form.ring_around(interval, length)
    assert ring == max(
        2 * interval, interval + {GaussianCorrelation: 5.3, ExponentialCorrelation: 14.0}[form] * length
    )
    error = form.image_error(interval, ring, length)
    z = np.linspace(0.0, interval, 401)
    plain = {
        GaussianCorrelation: np.exp(-0.5 * (z / length) ** 2),
        ExponentialCorrelation: np.exp(-z / length),
    }[form]
    change = np.abs(images(form, z, length, ring) - plain).max()
    assert change == pytest.approx(error, rel=1e-6, abs=1e-13)
    assert error < 1e-6
    if form is GaussianCorrelation:
        x = np.linspace(-0.5 * interval, 0.5 * interval, 21)
        modes = 2 * int(12 * ring / (2 * math.pi * length)) + 1
        found = covariance(form(length), x, modes, ring)
        expected = np.exp(-0.5 * ((x[:, None] - x) / length) ** 2)
        assert np.abs(found - expected).max() < 1e-6


def equation(domain: Domain, noise: Noise, **parameters: Parameter) -> FieldEquation:
    return FieldEquation(
        domain,
        lone(GaussianKernel(0.0, 1.0)),
        LinearRate(),
        Dynamics(1.0, 1.0),
        noise=noise,
        parameters=parameters,
    )


def chosen(
    domain: Domain,
    noise: Noise,
    inputs: dict[str, FloatArray] | None = None,
    unknowns: int = 256,
    **parameters: Parameter,
) -> NoiseModes:
    unbound = equation(domain, noise, **parameters)
    first = unbound.bind(unbound.binding(inputs or {}))
    modes = choose_modes(unbound, first, unknowns, 2 * unknowns)
    assert modes is not None
    return modes


def test_the_fewest_modes_within_the_tolerance() -> None:
    """l = 0.5 on the ring of length 2 pi: the share beyond wave k is about erfc(k l / sqrt 2)."""
    found = chosen(ON_RING, Noise(0.1, GaussianCorrelation(0.5)))
    waves = next(k for k in range(1, 99) if gaussian_share(0.5, k) <= TOLERANCE)
    assert found.modes == 2 * waves + 1
    assert (found.length, found.image_error, found.note) == (RING, 0.0, "")
    assert found.finer == 2 * found.modes + 1
    assert found.dropped == pytest.approx(gaussian_share(0.5, waves), rel=1e-9)
    assert found.dropped_finer == pytest.approx(gaussian_share(0.5, found.modes), rel=1e-6)
    assert found.factor == pytest.approx(1.25)
    assert not found.exact
    assert not found.white


def test_no_fewer_than_three_modes() -> None:
    assert chosen(ON_RING, Noise(0.1, GaussianCorrelation(50.0))).modes == 3


def test_the_shortest_length_decides_and_the_shares_are_means() -> None:
    lengths = np.linspace(0.2, 0.9, 8)
    noise = Noise(0.1, GaussianCorrelation(Uniform(0.2, 0.9)))
    found = chosen(ON_RING, noise, {"noise.correlation_length": lengths})
    assert found.modes == chosen(ON_RING, Noise(0.1, GaussianCorrelation(0.2))).modes
    waves = (found.modes - 1) // 2
    expected = np.mean([gaussian_share(length, waves) for length in lengths])
    assert found.dropped == pytest.approx(expected, rel=1e-7)


def test_no_more_modes_than_the_space_carries() -> None:
    """The exponential spectrum falls like k^-2: the share beyond is like 1 / modes, and the factor 2.5."""
    found = chosen(ON_RING, Noise(0.1, ExponentialCorrelation(0.5)), unknowns=64)
    assert found.modes == 63
    assert found.dropped == pytest.approx(exponential_share(0.5, 31), rel=1e-9)
    assert found.factor == pytest.approx(2.5, rel=0.02)
    assert f"{100 * exponential_share(0.5, 31):.2g} % of its variance" in found.note
    longer = chosen(Interval(0.0, 1.0), Noise(0.1, ExponentialCorrelation(2.0)), unknowns=65)
    assert longer.length == 29.0
    assert longer.modes == 65 * 29  # odd already
    tiny = Noise(0.1, GaussianCorrelation(1e-9))
    assert chosen(ON_RING, tiny, unknowns=100_000).modes == MOST_MODES


UPPER_ENDS: list[tuple[Parameter, FloatArray, float]] = [
    (0.5, np.zeros(0), 0.5),
    (Uniform(1.0, 4.0), np.array([1.5, 3.0]), 4.0),
    (TruncatedNormal(2.0, 1.0, 0.5, 4.5), np.array([1.5, 3.0]), 4.5),
    (LogNormal(0.5, 0.25), np.array([1.5, 3.0]), math.exp(0.5 + 0.25 * 4.753424308822899)),
    (Formula("2 * l"), np.array([1.5, 3.0]), 6.0),
]


@pytest.mark.parametrize(("length", "drawn", "longest"), UPPER_ENDS)
def test_the_ring_holds_the_longest_correlation(length: Parameter, drawn: FloatArray, longest: float) -> None:
    """Upper end of the law, the 1 - 1e-6 quantile (4.7534 sd of a normal law, tables), or the largest sample."""
    noise = Noise(0.1, GaussianCorrelation(length))
    if isinstance(length, Formula):
        found = chosen(INTERVAL, noise, {"l": drawn}, l=Uniform(1.0, 4.0))
    else:
        found = chosen(INTERVAL, noise, {"noise.correlation_length": drawn} if len(drawn) else {})
    assert found.length == pytest.approx(max(40.0, 20.0 + 5.3 * longest), rel=1e-9)
    assert found.image_error < 1e-6


def test_modes_of_cosine_and_white_noise() -> None:
    cosine = chosen(ON_RING, Noise(0.1, CosineCorrelation((0.0, 1.0, 0.5))))
    assert (cosine.modes, cosine.dropped, cosine.exact, cosine.note) == (5, 0.0, True, "")
    assert "waves up to 2" in chosen(ON_RING, Noise(0.1, CosineCorrelation((1.0,) * 4)), unknowns=4).note
    on_ring = chosen(ON_RING, Noise(0.1, WhiteCorrelation()), unknowns=256)
    assert (on_ring.modes, on_ring.length, on_ring.white, on_ring.exact) == (513, RING, True, False)
    on_interval = chosen(INTERVAL, Noise(0.1, WhiteCorrelation()), unknowns=257)
    assert (on_interval.modes, on_interval.length) == (1029, 40.0)
    assert (on_interval.dropped, on_interval.factor) == (None, 1.25)


def test_no_noise_no_modes() -> None:
    still = replace(equation(ON_RING, Noise(0.1, WhiteCorrelation())), noise=None)
    assert choose_modes(still, still, 64, 128) is None
    assert SAMPLES == 1024  # the study file's rule


def test_paths_of_uncertain_numbers() -> None:
    noise = Noise(Uniform(0.1, 0.2), CosineCorrelation((1.0, Uniform(0.5, 1.0))))
    unbound = equation(ON_RING, noise, s=Uniform(0.0, 1.0))
    assert [u.path for u in unbound.uncertain()] == ["s", "noise.strength", "noise.coefficients.1"]
    values = {
        "s": np.zeros(2),
        "noise.strength": np.array([0.1, 0.2]),
        "noise.coefficients.1": np.array([1.0, 0.5]),
    }
    bound = unbound.bind(unbound.binding(values)).noise
    assert bound is not None
    expected = np.sqrt(RING) * np.array([[0.1, 0.2]]).T * np.sqrt([[0.5, 0.25, 0.25], [2 / 3, 1 / 6, 1 / 6]])
    np.testing.assert_allclose(bound.amplitudes(3, RING), expected, rtol=1e-14)


IMPOSSIBLE: list[tuple[Noise, str, str]] = [
    (Noise(-0.1, WhiteCorrelation()), "noise.strength", "zero or positive"),
    (Noise(Normal(0.1, 0.05), WhiteCorrelation()), "noise.strength", "truncated_normal"),
    (Noise(0.1, GaussianCorrelation(0.0)), "noise.correlation_length", "must be positive"),
    (Noise(0.1, GaussianCorrelation(Normal(1.0, 0.5))), "noise.correlation_length", "truncated_normal"),
    (Noise(0.1, CosineCorrelation((1.0, -0.5))), "noise.coefficients.1", "zero or positive"),
    (Noise(0.1, CosineCorrelation((0.0, 0.0))), "noise.coefficients", "at least must be positive"),
    (
        Noise(0.1, CosineCorrelation((Formula("0 * c"), 0.0))),
        "noise.coefficients",
        "at least must be positive",
    ),
    (
        Noise(0.1, CosineCorrelation((0.0, Discrete((0.0, 1.0), (1.0, 3.0))))),
        "noise.coefficients",
        "probability 0.25",
    ),
]


@pytest.mark.parametrize(("noise", "key", "says"), IMPOSSIBLE)
def test_what_cannot_be_is_refused(noise: Noise, key: str, says: str) -> None:
    with pytest.raises(InputError) as caught:
        noise.refuse_impossible_laws("noise", {"c": 2.0})
    assert caught.value.key == key
    assert says in str(caught.value)


def test_zero_is_possible_where_only_less_is_not() -> None:
    noise = Noise(Discrete((0.0, 1.0), (1.0, 1.0)), CosineCorrelation((0.0, Uniform(0.0, 1.0))))
    noise.refuse_impossible_laws("noise", {})


def test_samples_that_cannot_be() -> None:
    bound = Noise(np.array([0.0, 0.1, -0.1]), CosineCorrelation((0.0, np.array([0.0, 1.0, 2.0]))))  # type: ignore[arg-type]
    found = {(v.path, v.position) for v in bound.impossible_samples("noise")}
    assert found == {("noise.strength", 2), ("noise.coefficients", 0)}


def test_cosine_waves_need_a_ring() -> None:
    CosineCorrelation((1.0,)).refuse_domain(ON_RING)
    with pytest.raises(InputError, match="'gaussian' or 'exponential'"):
        CosineCorrelation((1.0,)).refuse_domain(INTERVAL)
