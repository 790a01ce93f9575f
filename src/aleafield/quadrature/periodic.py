"""The periodic trapezoid rule."""

from __future__ import annotations

import numpy as np

from aleafield.geometry import Ring, ring_grid
from aleafield.quadrature.rule import Lattice, Rule


def periodic_trapezoid(ring: Ring, n: int) -> Rule:
    """n equal weights at the points j length / n, wrapped, in the order j = 0 .. n - 1.

    Exact for cos(2 pi k x / length) and its sine unless k is a nonzero multiple of n (then aliased to a
    constant), hence faster than any power for analytic periodic functions.

    References
    ----------
    Trefethen and Weideman 2014, "The exponentially convergent trapezoidal rule", SIAM Review 56 (from
    memory).
    """
    spacing = ring.length / n
    return Rule("trapezoid", ring_grid(ring, n), np.full(n, spacing), Lattice(0.0, spacing, (0.0,)))
