"""What kind of functions an equation is made of: smooth ones, or some with kinks and jumps.

Whether a formula is smooth is seen from the decay of its expansion coefficients, with every uncertain input
at its mean: Chebyshev coefficients on an interval, Fourier coefficients on a ring.  A kink shows as decay
like k^-2, a jump like 1/k.  On a ring a formula that is smooth on the line has a kink where the ring closes
unless it is periodic, and a formula of the shortest distance one opposite every point; no reading of the
formula would tell how large.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Literal

import numpy as np
import scipy.fft

from aleafield.arrays import BoolArray, FloatArray
from aleafield.field.equation import FieldEquation
from aleafield.field.formula_term import FormulaTerm
from aleafield.field.kernels import Kernel
from aleafield.field.rates import FormulaRate, Rate, Smoothness
from aleafield.geometry import Domain, Interval, ring_grid
from aleafield.quadrature import extremal_points

RateSmoothness = Smoothness | Literal["jump"]
Regularity = Literal["smooth", "kinked", "jump"]

_POINTS = 4096
_TAIL = 1e-12
"""Size of the last eighth of the coefficients, relative to the largest, above which a function is not smooth:
a kink whose slope jumps by the function's size over the domain leaves about 1e-7 there."""
_JUMP_TAIL = 3e-6
"""The same above which it jumps: a jump by the function's size leaves about 1e-4 there."""

_ACTIVITIES = (1e-6, 1e6)
_HALVINGS = 60
"""A cell's ends are then neighbouring numbers, beside 0 as good as that; a continuous formula hardly changes."""
_JUMP = 1e-6
"""Change within what is left of a cell, as a share of the values at its ends, that counts as a jump."""
_NOTHING = 1e-200
"""Values of this size are underflow."""

_PLACES = (0.1370, 0.4142, 0.8090)
"""Positions, as shares of the length, at which a kernel is looked at: no nodes of common meshes."""

_TIMES = (0.037, 0.41, 0.83)
"""Times, as shares of the duration, at which a drive is looked at."""


def typical(equation: FieldEquation) -> FieldEquation:
    """The equation bound to one sample with every input at its mean.

    What does not depend on an input is a float in it, so that `certain` of a kernel is exact.
    """
    means = {entry.path: np.array([entry.law.mean], dtype=np.float64) for entry in equation.uncertain()}
    return equation.bind(equation.binding(means))


def regularity_on(domain: Domain, function: Callable[[FloatArray], FloatArray]) -> Regularity:
    """Whether a function of points (P,) with values (.., P) is smooth, has a kink, or a jump or a pole."""
    with np.errstate(all="ignore"):
        if isinstance(domain, Interval):
            values = function(extremal_points(domain, _POINTS + 1))
            coefficients = np.abs(scipy.fft.dct(values, type=1, axis=-1))
        else:
            values = function(ring_grid(domain, _POINTS))
            coefficients = np.abs(scipy.fft.rfft(values, axis=-1))
        if not np.all(np.isfinite(coefficients)):
            return "jump"
        tail = coefficients[..., -coefficients.shape[-1] // 8 :].max()
        if tail <= _TAIL * coefficients.max():
            return "smooth"
        return "jump" if tail > _JUMP_TAIL * coefficients.max() else "kinked"


def smooth_on(domain: Domain, function: Callable[[FloatArray], FloatArray]) -> bool:
    """Whether a function of points (P,) with values (.., P) has no kink and no jump on the domain."""
    return regularity_on(domain, function) == "smooth"


def kernel_is_smooth(equation: FieldEquation) -> bool:
    """Whether every part of a bound equation's kernel is smooth in x and y, the diagonal included."""
    return all(_part_is_smooth(part, equation.domain) for part in equation.kernel.parts.values())


def _part_is_smooth(part: Kernel, domain: Domain) -> bool:
    if part.smooth is not None:
        return part.smooth
    places = domain.low + np.asarray(_PLACES)[:, None] * domain.length
    return smooth_on(domain, lambda y: part.matrix(places, y[None, :], domain)) and smooth_on(
        domain, lambda x: part.matrix(x[None, :], places, domain)
    )


def rate_smoothness(rate: Rate) -> RateSmoothness:
    """The smoothness of a bound rate; "jump" for a formula with a kink by its text and a jump by its values.

    A step rate does not count as one that jumps: its crossings are resolved.
    """
    if rate.smoothness == "kinked" and isinstance(rate, FormulaRate) and _jumps(rate):
        return "jump"
    return rate.smoothness


def _jumps(rate: Rate) -> bool:
    """Whether f(u) has a jump: cells of a grid of activities are halved, each time the half with the larger
    change kept, until only a jump can change the value within one.

    The activities are those of both signs from 1e-6 to 1e6, with neighbours 0.7 % apart, and 0.
    """
    sizes = np.geomspace(_ACTIVITIES[0], _ACTIVITIES[1], _POINTS)
    ends = np.concatenate((-sizes[::-1], [0.0], sizes))
    low, high = ends[:-1], ends[1:]
    with np.errstate(all="ignore"):
        at_low, at_high = rate(low[None, :])[0], rate(high[None, :])[0]
        size = np.abs(at_low) + np.abs(at_high)
        for _ in range(_HALVINGS):
            middle = 0.5 * (low + high)
            at_middle = rate(middle[None, :])[0]
            left: BoolArray = np.abs(at_middle - at_low) >= np.abs(at_high - at_middle)
            low, high = np.where(left, low, middle), np.where(left, middle, high)
            at_low, at_high = np.where(left, at_low, at_middle), np.where(left, at_middle, at_high)
        change = np.abs(at_high - at_low)
    return bool(np.any(change > _JUMP * size + _NOTHING))


def initial_is_smooth(equation: FieldEquation) -> bool:
    """Whether the initial state of a bound equation is smooth in x."""
    return _term_is_smooth(equation.initial, equation.domain, 0.0)


def drive_is_smooth(equation: FieldEquation) -> bool:
    """Whether the drive of a bound equation is smooth in x, at three times of the run and by its formula.

    A formula with a kink in x that moves with t may look smooth at three times; it is then taken as kinked.
    """
    drive = equation.drive
    if drive.depends_on("t") and drive.kinks_in("x"):
        return False
    duration = equation.dynamics.duration
    return all(_term_is_smooth(drive, equation.domain, share * duration) for share in _TIMES)


def data_jump(equation: FieldEquation) -> bool:
    """Whether the initial state or the drive of a bound equation, at one of three times, jumps in x."""
    duration = equation.dynamics.duration
    looks = [(equation.initial, 0.0), *((equation.drive, share * duration) for share in _TIMES)]
    return any(_regularity(term, equation.domain, t) == "jump" for term, t in looks)


def _term_is_smooth(term: FormulaTerm, domain: Domain, t: float) -> bool:
    return _regularity(term, domain, t) == "smooth"


def _regularity(term: FormulaTerm, domain: Domain, t: float) -> Regularity:
    if not term.depends_on("x"):
        return "smooth"

    def values(x: FloatArray) -> FloatArray:
        found = term.evaluate({"x": x, "t": t}, axes=1)
        return np.array(np.broadcast_to(found, np.broadcast_shapes(found.shape, x.shape)))

    return regularity_on(domain, values)
