"""Quadrature rules on a domain, judged alone before any solver uses them."""

from __future__ import annotations

from aleafield.quadrature.clenshaw_curtis import clenshaw_curtis, extremal_points
from aleafield.quadrature.composite import composite_gauss, simpson, trapezoid
from aleafield.quadrature.crossings import active_moments, crossing_weights
from aleafield.quadrature.gauss import gauss_legendre
from aleafield.quadrature.named import RULE_NAMES, count_refinement, make_rule
from aleafield.quadrature.periodic import periodic_trapezoid
from aleafield.quadrature.rule import Lattice, Rule

__all__ = [
    "RULE_NAMES",
    "Lattice",
    "Rule",
    "active_moments",
    "clenshaw_curtis",
    "composite_gauss",
    "count_refinement",
    "crossing_weights",
    "extremal_points",
    "gauss_legendre",
    "make_rule",
    "periodic_trapezoid",
    "simpson",
    "trapezoid",
]
