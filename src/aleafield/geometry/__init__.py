"""Domains of a field: what a point, a length and a distance is, and how grids of points grow."""

from __future__ import annotations

from aleafield.geometry.grids import interval_grid, ring_grid
from aleafield.geometry.interval import Interval
from aleafield.geometry.refinement import Refinement
from aleafield.geometry.ring import Ring

Domain = Interval | Ring

__all__ = ["Domain", "Interval", "Refinement", "Ring", "interval_grid", "ring_grid"]
