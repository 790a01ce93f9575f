"""The L2-orthogonal projection of noise modes onto a space, for noise that cannot be sampled at points."""

from __future__ import annotations

import math

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.field.noise import mode_functions, wave_numbers
from aleafield.geometry import Interval
from aleafield.projection.restriction import MassRestriction
from aleafield.quadrature import composite_gauss, gauss_legendre
from aleafield.spaces import Fourier, Legendre, PiecewiseLinear, Space

_DEGREE = 60.0
"""A wave of phase w on [-1, 1] is a polynomial of degree max(e w, 60) to within 2^-60 (see `_points`)."""


def projected_modes(space: Space, modes: int, length: float) -> FloatArray:
    """Unknowns (modes, n) of the L2-orthogonal projections of the modes of a ring of that length.

    Fourier: the modes of the space stay, the others vanish.  Piecewise linear: a wave's inner product with a hat
    function is its value at the node times that of the hat with a wave about its own node, then the mass matrix.
    Polynomials: inner products with Legendre polynomials by one Gauss rule.  The rules are exact to rounding.
    """
    if isinstance(space, Fourier):
        return _on_waves(space, modes, length)
    if isinstance(space, PiecewiseLinear):
        return _on_hats(space, modes, length)
    assert isinstance(space.domain, Interval)
    polynomials = Legendre(space.domain, space.n)
    shortest = math.pi * (modes - 1) / length * space.domain.length / 2.0
    rule = gauss_legendre(space.domain, _points(space.n - 1, shortest))
    sampled = mode_functions(rule.points, modes, length) * rule.weights
    coefficients = sampled @ polynomials.evaluation_matrix(rule.points)
    if isinstance(space, Legendre):
        return np.asarray(coefficients)
    return np.asarray(coefficients @ polynomials.evaluation_matrix(space.nodes).T)


def _points(degree: int, phase: float) -> int:
    """Gauss points for polynomials of a degree times waves exp(i w s) on [-1, 1], w at most `phase`.

    The coefficients of such a wave in Chebyshev polynomials are 2 J_nu(w), and |J_nu(w)| <= (e w / (2 nu))^nu,
    which from nu = max(e w, 60) on is below 2^-nu.  A rule with p points is exact up to degree 2p - 1.
    """
    return math.ceil((degree + max(math.e * phase, _DEGREE) + 1.0) / 2.0)


def _on_waves(space: Fourier, modes: int, length: float) -> FloatArray:
    """The values at the nodes of the modes of the space; for even n the last one only as a cosine."""
    values = mode_functions(space.nodes, modes, length)
    twice = 2 * wave_numbers(modes)
    beyond = twice > space.n
    beyond |= (twice == space.n) & (np.arange(modes) % 2 == 0)
    values[beyond] = 0.0
    return values


def _on_hats(space: PiecewiseLinear, modes: int, length: float) -> FloatArray:
    """M^-1 times inner products with the hat functions.

    With w the phase of a wave on an element of length h, half a hat gives h times c + i d for a wave about its node,
    the integrals of (1 - s) cos(w s) and (1 - s) sin(w s) over s from 0 to 1; on the other side of the node h times
    c - i d.
    """
    domain, n = space.domain, space.n
    panels = n if domain.periodic else n - 1
    h = domain.length / panels
    phase = 2.0 * np.pi * h / length * wave_numbers(modes)
    side = gauss_legendre(Interval(0.0, 1.0), _points(1, 0.5 * float(phase[-1])))
    falling = (1.0 - side.points) * side.weights
    c = h * (np.cos(phase[:, None] * side.points) @ falling)
    d = h * (np.sin(phase[:, None] * side.points) @ falling)
    values = mode_functions(space.nodes, modes, length)
    load = 2.0 * c[:, None] * values
    if not domain.periodic:
        shifted = _conjugate(values[:, [0, -1]])
        load[:, 0] = c * values[:, 0] + d * shifted[:, 0]
        load[:, -1] = c * values[:, -1] - d * shifted[:, 1]
    return MassRestriction(space, composite_gauss(domain, panels)).of_load(load)


def _conjugate(values: FloatArray) -> FloatArray:
    """-sin for each cosine and cos for each sine of a wave, (modes, T): what a phase beside a point adds."""
    conjugate = np.zeros_like(values)
    conjugate[1::2], conjugate[2::2] = -values[2::2], values[1::2]
    return conjugate
