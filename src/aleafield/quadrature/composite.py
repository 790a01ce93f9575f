"""Composite rules: one small rule on each of many equal panels, on an interval or a ring.

On a ring the panels start at x = 0 and go round; the points are wrapped and keep that order.
"""

from __future__ import annotations

import numpy as np
from numpy.polynomial.legendre import leggauss

from aleafield.geometry import Domain, Interval, interval_grid, ring_grid
from aleafield.quadrature.periodic import periodic_trapezoid
from aleafield.quadrature.rule import Lattice, Rule


def trapezoid(domain: Domain, panels: int) -> Rule:
    """Trapezoid rule on equal panels: exact for linear functions, error h^2 for twice differentiable ones.

    On an interval panels + 1 points, on a ring `panels` points and equal weights.
    """
    if not isinstance(domain, Interval):
        return periodic_trapezoid(domain, panels)
    spacing = domain.length / panels
    weights = np.full(panels + 1, spacing)
    weights[[0, -1]] = 0.5 * spacing
    lattice = Lattice(domain.low, spacing, (0.0,))
    return Rule("trapezoid", interval_grid(domain, panels), weights, lattice)


def simpson(domain: Domain, panels: int) -> Rule:
    """Simpson's rule on equal panels, the midpoints added: exact for cubics, error h^4 for smooth functions.

    2 panels + 1 points on an interval, 2 panels on a ring.
    """
    spacing = domain.length / (2 * panels)
    weights = np.full(2 * panels, 2.0 * spacing / 3.0)
    weights[1::2] = 4.0 * spacing / 3.0
    if not isinstance(domain, Interval):
        lattice = Lattice(0.0, spacing, (0.0,))
        return Rule("simpson", ring_grid(domain, 2 * panels), weights, lattice)
    weights[0] = spacing / 3.0
    weights = np.append(weights, spacing / 3.0)
    lattice = Lattice(domain.low, spacing, (0.0,))
    return Rule("simpson", interval_grid(domain, 2 * panels), weights, lattice)


def composite_gauss(domain: Domain, panels: int, per_panel: int = 2) -> Rule:
    """Gauss-Legendre rule with `per_panel` points on each panel.

    Exact for polynomials of degree 2 per_panel - 1 on each panel; error h^(2 per_panel) for smooth functions.
    The points are ordered panel by panel: `per_panel` interleaved uniform grids.
    """
    spacing = domain.length / panels
    reference, reference_weights = leggauss(per_panel)
    offsets = 0.5 * spacing * (1.0 + reference)
    if isinstance(domain, Interval):
        origin = domain.low
        starts = interval_grid(domain, panels)[:-1]
    else:
        origin = 0.0
        starts = (np.arange(panels) * domain.length) / panels
    points = domain.wrap((starts[:, None] + offsets[None, :]).ravel())
    weights = np.tile(0.5 * spacing * reference_weights, panels)
    lattice = Lattice(origin, spacing, tuple(offsets.tolist()))
    return Rule("composite gauss", points, weights, lattice)
