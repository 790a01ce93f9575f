"""Field problems whose solutions are known in closed form, one record each.

The device of the problems on [-1, 1] with a degenerate kernel: if w(x, y) = k(x) b(y) and b is the
derivative of the shape a of the solution u = A(t) a(x) + B(t), the integral of b(y) f(A a(y) + B) is a
difference of antiderivatives F of the rate, F(u) = log(1 + exp(gain (u - threshold))) / gain for the
logistic one. For the other problems the rate f(u) = H is chosen first and u is its inverse, so that the
integral is linear in H.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.formula_term import FormulaTerm
from aleafield.field.kernels import (
    Connectivity,
    CosineKernel,
    ExponentialKernel,
    FormulaKernel,
    GaussianKernel,
    Kernel,
)
from aleafield.field.rates import LinearRate, LogisticRate, StepRate
from aleafield.formula import Formula
from aleafield.geometry import Interval, Ring
from aleafield.randomness.laws import Law, Uniform

CIRCLE = Ring(2 * np.pi)
SYMMETRIC = Interval(-1.0, 1.0)


def term(text: str, names: Mapping[str, float | str | Law] | None = None) -> FormulaTerm:
    """A formula with names beside it; a string beside it is a formula of its own."""
    beside = {k: Formula(v) if isinstance(v, str) else v for k, v in (names or {}).items()}
    return FormulaTerm(Formula(text), beside)


def lone(kernel: Kernel) -> Connectivity:
    """A kernel without other parts."""
    return Connectivity({"": kernel})


@dataclass(frozen=True)
class Problem:
    """A field and its solution.

    Attributes
    ----------
    equation : FieldEquation
    exact : function of points (P,) and a time, giving u (P,)
    table : rows (x, t, u, drive), computed independently to 12 digits or more
    """

    equation: FieldEquation
    exact: Callable[[FloatArray, float], FloatArray]
    table: tuple[tuple[float, float, float, float], ...] = ()


def antiderivative_problem(
    shape: str,
    weight: str,
    ends: tuple[str, ...],
    exact_shape: Callable[[FloatArray], FloatArray],
    table: tuple[tuple[float, float, float, float], ...],
) -> Problem:
    """u = A(t) a(x) + B(t), A = 1 + sin(t)/2, B = cos(2t)/5, kernel cos(2x) b(y), gain 3, threshold 0.4.

    Parameters
    ----------
    shape, weight : formulas of a(x) and b(y)
    ends : formulas of the arguments of F whose alternating sum, the first counted positive, is the integral
    exact_shape : a(x) on arrays
    table : independent values
    """
    names: dict[str, float | str] = {
        "amplitude": "1 + sin(t)/2",
        "amplitude_rate": "cos(t)/2",
        "offset": "cos(2*t)/5",
        "offset_rate": "-2*sin(2*t)/5",
        "shape": shape,
        "upper": f"log(1 + exp(3*({ends[0]} - 0.4)))/3",
        "lower": f"log(1 + exp(3*({ends[1]} - 0.4)))/3",
    }
    drive = term(
        "amplitude_rate*shape + offset_rate + amplitude*shape + offset - cos(2*x)*(upper - lower)/amplitude",
        names,
    )

    def exact(x: FloatArray, t: float) -> FloatArray:
        return (1 + np.sin(t) / 2) * exact_shape(x) + np.cos(2 * t) / 5

    equation = FieldEquation(
        SYMMETRIC,
        lone(FormulaKernel(term(f"cos(2*x)*{weight}"))),
        LogisticRate(3.0, 0.4),
        Dynamics(1.0, 1.0),
        drive,
        term("shape + 1/5", {"shape": shape}),
    )
    return Problem(equation, exact, table)


def analytic() -> Problem:
    """a(x) = exp(x): an entire solution."""
    return antiderivative_problem(
        "exp(x)",
        "exp(y)",
        ("(amplitude*e + offset)", "(amplitude/e + offset)"),
        np.exp,
        (
            (-0.6, 0.3, 0.7949712231343, 0.02703659648279),
            (0.25, 0.3, 1.638820267919, 0.07856872611123),
            (0.25, 1.0, 1.741031115328, -0.2075871041602),
            (0.9, 1.0, 3.411216069938, 4.212090735733),
        ),
    )


def kinked_solution() -> Problem:
    """a(x) = exp(|x|) - 1: continuous, slope jumps at 0."""
    return antiderivative_problem(
        "exp(abs(x)) - 1",
        "exp(abs(y))/2",
        ("(amplitude*(e - 1) + offset)", "offset"),
        lambda x: np.expm1(np.abs(x)),
        (
            (-0.6, 0.3, 1.108662282268, 0.7687331871166),
            (0.25, 0.3, 0.491060164588, -0.8264620325503),
            (0.25, 1.0, 0.3202956229237, -1.133317224426),
            (0.9, 1.0, 1.990480577534, 2.323108580281),
        ),
    )


def twice_differentiable_solution() -> Problem:
    """a(x) = |x|^3: the third derivative jumps at 0."""
    return antiderivative_problem(
        "abs(x)**3",
        "1.5*y**2",
        ("(amplitude + offset)", "offset"),
        lambda x: np.abs(x) ** 3,
        (
            (-0.6, 0.3, 0.4129833053014, 0.03778324932079),
            (0.25, 0.3, 0.1830008745965, -0.6469611592332),
            (0.25, 1.0, -0.06103037524062, -0.968230088699),
            (0.9, 1.0, 0.9524868066531, 0.9275055210428),
        ),
    )


def kinked_kernel() -> Problem:
    """Exponential kernel of width 1, f(u) = 1/2 + cos(2x - t)/4, logistic gain 2, threshold 0.3.

    With q = 1, k = 2 and phases c(x) = exp(i k x) the integral of w cos(k y - t) is Re(exp(-i t) m(x)),
    m(x) = (q/2) [(c(x) - exp(-q (x+1) - i k))/(q + i k) + (c(x) - exp(-q (1-x) + i k))/(q - i k)].  The
    products are written out in real numbers: 1/(1 +- 2i) = (1 -+ 2i)/5.
    """
    names: dict[str, float | str] = {
        "rate": "1/2 + cos(2*x - t)/4",
        "rate_speed": "sin(2*x - t)/4",
        "left": "exp(-(x + 1))",
        "right": "exp(-(1 - x))",
        "mean": "(2 - left - right)/2",
        "wave": "(2*cos(2*x - t) - left*(cos(2 + t) - 2*sin(2 + t)) - right*(cos(2 - t) - 2*sin(2 - t)))/10",
    }
    drive = term(
        "rate_speed/(2*rate*(1 - rate)) + 0.3 + log(rate/(1 - rate))/2 - mean/2 - wave/4",
        names,
    )

    def exact(x: FloatArray, t: float) -> FloatArray:
        rate = 0.5 + np.cos(2 * x - t) / 4
        return 0.3 + np.log(rate / (1 - rate)) / 2

    equation = FieldEquation(
        SYMMETRIC,
        lone(ExponentialKernel(1.0, 1.0)),
        LogisticRate(2.0, 0.3),
        Dynamics(1.0, 1.0),
        drive,
        term("0.3 + log(rate/(1 - rate))/2", {"rate": "1/2 + cos(2*x)/4"}),
    )
    return Problem(
        equation,
        exact,
        (
            (-0.7, 0.3, 0.2354884079722, -0.5747005499608),
            (0.2, 0.3, 0.8459811126816, 0.5102233362724),
            (0.2, 1.0, 0.7388223410971, 0.02250420875033),
            (0.9, 1.0, 0.6635684648368, 0.7699448636616),
        ),
    )


MODE_STRENGTHS = (0.6, -0.5, 0.3, 0.0)
MODE_AMPLITUDES = (1.0, 2.0, -1.0, 0.7)


def legendre_modes() -> Problem:
    """Linear field, kernel sum of mu_l (2l + 1)/2 P_l(x) P_l(y): mode l decays as exp(-(1 - mu_l) t)."""
    kernel = "0.6/2 - 0.5*3/2*x*y + 0.3*5/2*(3*x**2 - 1)/2*(3*y**2 - 1)/2"

    def exact(x: FloatArray, t: float) -> FloatArray:
        decay = np.exp(-(1 - np.array(MODE_STRENGTHS)) * t)
        return np.polynomial.legendre.legval(x, np.array(MODE_AMPLITUDES) * decay)

    equation = FieldEquation(
        SYMMETRIC,
        lone(FormulaKernel(term(kernel))),
        LinearRate(),
        Dynamics(1.0, 2.0),
        initial=term("1 + 2*x - (3*x**2 - 1)/2 + 0.7*(5*x**3 - 3*x)/2"),
    )
    return Problem(equation, exact)


def growth_factor(z: float | FloatArray) -> FloatArray:
    """What a step of the classical Runge-Kutta method multiplies a mode by; z is its rate times the step."""
    return np.asarray(1 + z + np.square(z) / 2 + np.power(z, 3) / 6 + np.power(z, 4) / 24)


def stepped_legendre_modes(x: FloatArray, steps: int, step: float) -> FloatArray:
    """The solution of `legendre_modes` after that many Runge-Kutta steps, exact in space."""
    factors = growth_factor(-(1 - np.array(MODE_STRENGTHS)) * step) ** steps
    return np.polynomial.legendre.legval(x, np.array(MODE_AMPLITUDES) * factors)


def wave_on_the_ring(kernel: Kernel, symbol: Callable[[int], float]) -> Problem:
    """f(u) = 1/2 + cos(2x - t)/4 on the ring of length 2 pi, logistic gain 6, threshold 0.35.

    A kernel with symbol w_k takes it to w_0/2 + w_2 cos(2x - t)/4, whatever the kernel.
    """
    names: dict[str, float | str] = {
        "rate": "1/2 + cos(2*x - t)/4",
        "rate_speed": "sin(2*x - t)/4",
        "mean": symbol(0),
        "second": symbol(2),
    }
    drive = term(
        "rate_speed/(6*rate*(1 - rate)) + 0.35 + log(rate/(1 - rate))/6 - mean/2 - second*cos(2*x - t)/4",
        names,
    )

    def exact(x: FloatArray, t: float) -> FloatArray:
        rate = 0.5 + np.cos(2 * x - t) / 4
        return 0.35 + np.log(rate / (1 - rate)) / 6

    equation = FieldEquation(
        CIRCLE,
        lone(kernel),
        LogisticRate(6.0, 0.35),
        Dynamics(1.0, 1.0),
        drive,
        term("0.35 + log(rate/(1 - rate))/6", {"rate": "1/2 + cos(2*x)/4"}),
    )
    return Problem(equation, exact)


def gaussian_wave() -> Problem:
    """The wave under a gaussian kernel, symbol strength exp(-(width k)^2 / 2)."""
    return wave_on_the_ring(GaussianKernel(1.5, 0.5), lambda k: 1.5 * np.exp(-((0.5 * k) ** 2) / 2))


def exponential_wave() -> Problem:
    """The wave under an exponential kernel, symbol strength / (1 + (width k)^2)."""
    return wave_on_the_ring(ExponentialKernel(1.5, 0.5), lambda k: 1.5 / (1 + (0.5 * k) ** 2))


def three_modes() -> FieldEquation:
    """Logistic field with kernel a0 + a1 cos z + b1 sin z, which keeps the span of 1, cos, sin.

    Reduced to three equations by hand: (c0, c1, c2)(2) = `THREE_MODES_AT_2` from an adaptive solver of
    order 8.
    """
    return FieldEquation(
        CIRCLE,
        lone(FormulaKernel(term("-0.05 + 0.6*cos(x - y) + 0.15*sin(x - y)"))),
        LogisticRate(6.0, 0.35),
        Dynamics(1.0, 2.0),
        initial=term("0.2 + 0.9*cos(x)"),
    )


THREE_MODES_AT_2 = (-0.07387139203207, 0.8772975800793, 0.5147196632905)

POISSON = "0.7/(2*pi)*(1 - 0.25)/(1 - cos(x - y) + 0.25)"
"""Kernel with symbol 0.7 * 0.5**|k|."""


def linear_modes() -> FieldEquation:
    """Linear field with the Poisson kernel; started in modes 0, 1 and 3 with amplitude 1 each."""
    return FieldEquation(
        CIRCLE,
        lone(FormulaKernel(term(POISSON))),
        LinearRate(),
        Dynamics(1.0, 1.5),
        initial=term("1 + cos(x) + cos(3*x)"),
    )


SHIFTED = Uniform(0.0, 1.0)
"""Stands for the shift of runs that differ in nothing else: errors of crossings depend on where in a
panel they lie, and only their mean square over shifts has an order."""


def bump_on_the_ring(duration: float) -> FieldEquation:
    """Step rate, threshold 1/2, kernel cos z: started at the stable bump, input `initial.shift`.

    The stable bump is A cos(x - shift) with A = sqrt(1 + h) + sqrt(1 - h), active for |x - shift| < 5 pi /
    12; its amplitude returns like exp(-0.928 t), its shift is free. Kilpatrick and Ermentrout 2013, SIAM J.
    Appl. Dyn. Syst. 12 (from memory), re-derived.
    """
    return FieldEquation(
        CIRCLE,
        lone(CosineKernel((0.0, 1.0))),
        StepRate(0.5),
        Dynamics(1.0, duration),
        initial=term("(sqrt(1.5) + sqrt(0.5))*cos(x - shift)", {"shift": SHIFTED}),
    )


BUMP_AMPLITUDE = float(np.sqrt(1.5) + np.sqrt(0.5))
BUMP_HALF_WIDTH = 5 * np.pi / 12


LINE_BUMP_WIDTH = 2.542641357774
LINE_BUMP_PEAK = 0.1782779205964


def bump_on_the_line(duration: float) -> FieldEquation:
    """Step rate, threshold 0.05, w = (1 - r) exp(-r)/4, on [-15, 15]; input `initial.shift`.

    The wide bump of width a with a exp(-a)/4 = 0.05 is stable: Amari 1977, Biol. Cybern. 27 (from memory).
    The drive uses the active set only, so that cutting the line off costs nothing.
    """
    return FieldEquation(
        Interval(-15.0, 15.0),
        lone(FormulaKernel(term("(1 - r)*exp(-r)/4"))),
        StepRate(0.05),
        Dynamics(1.0, duration),
        initial=term(
            "(right*exp(-abs(right)) - left*exp(-abs(left)))/4",
            {
                "right": "x - shift + half",
                "left": "x - shift - half",
                "half": LINE_BUMP_WIDTH / 2,
                "shift": SHIFTED,
            },
        ),
    )


def moving_front() -> Problem:
    """Exponential kernel of width 1, step rate, threshold 0.3, time constant 1.5: no transient, front at c t.

    Input `initial.shift` moves everything to the right.

    c = (1 - 2h)/(2 h tau) = 4/9.  For x >= 0 ahead of the front u = h exp(-(x - c t)); behind it, with t' the
    time since it passed and g = 1/tau - c,
    u = h E + 1 - E - exp(x - c t) (1 - exp(-g t'))/(2 g tau), E = exp(-t'/tau).  The exact values hold for
    x >= 0. On [-15, 15] the drive at the front is short by exp(-15)/2.
    """
    h, tau = 0.3, 1.5
    speed = (1 - 2 * h) / (2 * h * tau)
    g = 1 / tau - speed

    def exact(x: FloatArray, t: float) -> FloatArray:
        passed = np.maximum(t - x / speed, 0.0)
        decay = np.exp(-passed / tau)
        way = x - speed * t
        behind = h * decay + 1 - decay - np.exp(np.minimum(way, 0.0)) * -np.expm1(-g * passed) / (2 * g * tau)
        return np.where(way >= 0, h * np.exp(-way), behind)

    equation = FieldEquation(
        Interval(-15.0, 15.0),
        lone(ExponentialKernel(1.0, 1.0)),
        StepRate(h),
        Dynamics(tau, 1.7),
        initial=term(
            "where(z >= 0, h*exp(-z), h*(2 - exp(z)))", {"h": h, "z": "x - shift", "shift": SHIFTED}
        ),
    )
    return Problem(equation, exact)


FRONT_SPEED = 4.0 / 9.0
