"""The problems of ``aleafield verify``.

Manufactured solutions use a kernel k(x) b(y) with b the derivative of the solution's spatial shape, so that the
integral of b f(A a + B) is a difference of antiderivatives of the logistic rate and the drive is closed.
"""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.verification.noisy_problems import NOISY_PROBLEMS
from aleafield.verification.problem import KnownProblem, Series

_LINE = np.linspace(-1.0, 1.0, 801)
_RING = np.linspace(-np.pi, np.pi, 401)[:-1]
_MANUFACTURED = "own construction; method of manufactured solutions (Roache 2002, from memory)"


def _manufactured(shape: str, derivative: str, left: str, right: str, duration: float = 1.0) -> str:
    """Study text with the solution A(t) a(x) + B(t), A = 1 + sin(t)/2, B = cos(2t)/5, kernel cos(2x) b(y).

    `left` and `right` are values v for which the integral is (F(A right + B) - F(A left + B)) / A.
    """
    return f"""
[domain]
shape = "interval"
from = -1.0
to = 1.0
[kernel]
form = "formula"
formula = "cos(2*x) * ({derivative})"
[rate]
form = "logistic"
gain = 3.0
threshold = 0.4
[drive]
formula = "(dA + A)*({shape}) + dB + B - cos(2*x)*(high - low)/A"
A = "1 + sin(t)/2"
dA = "cos(t)/2"
B = "cos(2*t)/5"
dB = "-2*sin(2*t)/5"
high = "log(1 + exp(3*(A*({right}) + B - 0.4)))/3"
low = "log(1 + exp(3*(A*({left}) + B - 0.4)))/3"
[initial]
formula = "({shape}) + 0.2"
[dynamics]
time_constant = 1.0
duration = {duration}
"""


def _at_one(shape: FloatArray) -> FloatArray:
    return np.asarray((1 + np.sin(1.0) / 2) * shape + np.cos(2.0) / 5)


_SMOOTH = KnownProblem(
    name="smooth manufactured field",
    source=_MANUFACTURED,
    study=_manufactured("exp(x)", "exp(y)", "1/e", "e"),
    exact=lambda x: _at_one(np.exp(x)),
    points=_LINE,
    series=(
        Series("piecewise linear", "collocation", "nodes", (21, 41, 81, 161), 2, 8.1e-5),
        Series("piecewise linear", "galerkin", "nodes", (21, 41, 81, 161), 2, 8.1e-5),
        Series("chebyshev", "collocation", "nodes", (6, 10, 14), None, 1e-10),
        Series("legendre", "galerkin", "nodes", (6, 10, 14), None, 1e-10),
        Series(
            "chebyshev",
            "collocation",
            "quadrature points",
            (17, 33, 65, 129),
            2,
            3.6e-5,
            quadrature="trapezoid",
            nodes=24,
        ),
        Series(
            "legendre",
            "galerkin",
            "quadrature points",
            (17, 33, 65, 129),
            2,
            3.6e-5,
            quadrature="trapezoid",
            nodes=24,
        ),
        Series("chebyshev", "collocation", "steps", (8, 16, 32), 4, 6e-9, nodes=18),
    ),
)

_KINKED = KnownProblem(
    name="manufactured field with a kink at 0",
    source=_MANUFACTURED,
    study=_manufactured("exp(abs(x)) - 1", "exp(abs(y))/2", "0", "e - 1"),
    exact=lambda x: _at_one(np.exp(np.abs(x)) - 1),
    points=_LINE,
    series=(Series("piecewise linear", "collocation", "nodes", (21, 41, 81, 161), 2, 8e-5),),
)


def _inverse_rate_field(x: FloatArray) -> FloatArray:
    activity = 0.5 + np.cos(2 * x - 1.0) / 4
    return np.asarray(0.3 + np.log(activity / (1 - activity)) / 2)


_DIAGONAL = KnownProblem(
    name="exponential kernel, kink on the diagonal",
    source="own construction: the firing rate along the solution is chosen first",
    study="""
[domain]
shape = "interval"
from = -1.0
to = 1.0
[kernel]
form = "exponential"
strength = 1.0
width = 1.0
[rate]
form = "logistic"
gain = 2.0
threshold = 0.3
[drive]
# (1/2)[(e^(ikx) - e^(-(x+1)-ik))/(1+ik) + (e^(ikx) - e^(-(1-x)+ik))/(1-ik)] with k = 2, real and imaginary part
formula = "slope/(2*activity*(1 - activity)) + field - (m0/2 + (re*cos(t) + im*sin(t))/4)"
activity = "1/2 + cos(2*x - t)/4"
slope = "sin(2*x - t)/4"
field = "0.3 + log(activity/(1 - activity))/2"
m0 = "1 - (exp(-(x + 1)) + exp(-(1 - x)))/2"
ca = "cos(2*x) - exp(-(x + 1))*cos(2)"
sa = "sin(2*x) + exp(-(x + 1))*sin(2)"
cb = "cos(2*x) - exp(-(1 - x))*cos(2)"
sb = "sin(2*x) - exp(-(1 - x))*sin(2)"
re = "((ca + 2*sa) + (cb - 2*sb))/10"
im = "((sa - 2*ca) + (sb + 2*cb))/10"
[initial]
formula = "0.3 + log(activity/(1 - activity))/2"
activity = "1/2 + cos(2*x)/4"
[dynamics]
time_constant = 1.0
duration = 1.0
""",
    exact=_inverse_rate_field,
    points=_LINE,
    series=(
        Series("piecewise linear", "collocation", "nodes", (21, 41, 81, 161), 2, 6.1e-5),
        Series("chebyshev", "collocation", "nodes", (9, 17, 33), 2, 5e-4),
    ),
)

_LEGENDRE = KnownProblem(
    name="linear field, Legendre kernel",
    source="eigenfunctions of the kernel: c_l exp(-(1 - mu_l) t) P_l",
    study="""
[domain]
shape = "interval"
from = -1.0
to = 1.0
[kernel]
form = "formula"
formula = "0.6/2 - 0.5*3/2*x*y + 0.3*5/2*(3*x**2 - 1)/2*(3*y**2 - 1)/2"
[rate]
form = "linear"
[initial]
formula = "1 + 2*x - (3*x**2 - 1)/2 + 0.7*(5*x**3 - 3*x)/2"
[dynamics]
time_constant = 1.0
duration = 2.0
""",
    exact=lambda x: (
        np.exp(-0.8)
        + 2 * np.exp(-3.0) * x
        - np.exp(-1.4) * (3 * x**2 - 1) / 2
        + 0.7 * np.exp(-2.0) * (5 * x**3 - 3 * x) / 2
    ),
    points=_LINE,
    series=(
        Series("legendre", "galerkin", "nodes", (3, 4, 6), None, 1e-12, steps=1600),
        Series("chebyshev", "collocation", "nodes", (3, 6, 8), None, 1e-12, steps=1600),
    ),
)


def _poisson_field(x: FloatArray) -> FloatArray:
    k = np.arange(1, 60)
    modes = 2 * 0.4**k * np.exp(-(1 - 0.7 * 0.5**k) * 1.5)
    return np.asarray(np.exp(-0.3 * 1.5) + np.cos(np.outer(x, k)) @ modes)


_POISSON = KnownProblem(
    name="linear field on a ring, Poisson kernel",
    source="mode k decays as exp(-(1 - g r^k) t)",
    study="""
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "formula"
formula = "0.7/(2*pi)*(1 - 0.25)/(1 - cos(x - y) + 0.25)"
[rate]
form = "linear"
[initial]
formula = "(1 - 0.16)/(1 - 0.8*cos(x) + 0.16)"
[dynamics]
time_constant = 1.0
duration = 1.5
""",
    exact=_poisson_field,
    points=_RING,
    series=(
        Series("fourier", "collocation", "nodes", (16, 32, 64), None, 1e-9),
        Series("fourier", "galerkin", "nodes", (16, 32, 64), None, 1e-9),
        Series("piecewise linear", "collocation", "nodes", (32, 64, 128), 2, 5e-4),
    ),
)

_ROTATING = KnownProblem(
    name="logistic field on a ring, three modes",
    source="exact reduction to three equations, solved by an adaptive method of order 8",
    study="""
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "formula"
formula = "-0.05 + 0.6*cos(x - y) + 0.15*sin(x - y)"
[rate]
form = "logistic"
gain = 6.0
threshold = 0.35
[initial]
formula = "0.2 + 0.9*cos(x)"
[dynamics]
time_constant = 1.0
duration = 2.0
""",
    exact=lambda x: -0.07387139203207 + 0.8772975800793 * np.cos(x) + 0.5147196632905 * np.sin(x),
    points=_RING,
    series=(Series("fourier", "collocation", "nodes", (16, 32, 64), None, 1e-9, steps=400),),
)

_BUMP = KnownProblem(
    name="stationary bump, cosine kernel, step rate",
    source="Kilpatrick and Ermentrout 2013 (from memory): A = sqrt(1 + h) + sqrt(1 - h)",
    study="""
[domain]
shape = "ring"
length = "2*pi"
[kernel]
form = "cosine"
coefficients = [0.0, 1.0]
[rate]
form = "step"
threshold = 0.5
[initial]
formula = "1.8*cos(x)"
[dynamics]
time_constant = 1.0
duration = 24.0
""",
    exact=lambda x: (np.sqrt(1.5) + np.sqrt(0.5)) * np.cos(x),
    points=_RING,
    series=(
        Series("fourier", "collocation", "quadrature points", (64, 128, 256), 2, 1e-4, nodes=16),
        Series("piecewise linear", "collocation", "nodes", (64, 128, 256), 2, 2e-4, order_tolerance=0.15),
    ),
)


def _front(x: FloatArray) -> FloatArray:
    """Level set at ct, c = 4/9; ahead of it an exponential, behind it the relaxed field (s = 1, tau = 1.5)."""
    c, h, tau, t = 4 / 9, 0.3, 1.5, 1.7
    since = t - x / c
    relaxed = np.exp(-since / tau)
    g = 1 / tau - c
    behind = h * relaxed + (1 - relaxed) - np.exp(x - c * t) * (1 - np.exp(-since * g)) / (2 * g * tau)
    return np.asarray(np.where(x >= c * t, h * np.exp(-(x - c * t)), behind))


_FRONT = KnownProblem(
    name="travelling front, exponential kernel, step rate",
    source="Coombes 2005 (speed, from memory); field re-derived",
    study="""
[domain]
shape = "interval"
from = -15.0
to = 15.0
[kernel]
form = "exponential"
strength = 1.0
width = 1.0
[rate]
form = "step"
threshold = 0.3
[initial]
formula = "where(x < 0, 0.3*(2 - exp(minimum(x, 0))), 0.3*exp(-maximum(x, 0)))"
[dynamics]
time_constant = 1.5
duration = 1.7
""",
    exact=_front,
    points=np.linspace(0.1, 3.0, 201),
    series=(
        Series("piecewise linear", "collocation", "nodes", (151, 301, 601), 2, 1e-3, order_tolerance=0.5),
    ),
)

PROBLEMS = (_SMOOTH, _KINKED, _DIAGONAL, _LEGENDRE, _POISSON, _ROTATING, _BUMP, _FRONT, *NOISY_PROBLEMS)
"""All problems, in the order in which they are printed."""
