"""Rules by name and by the count that a study file gives as `quadrature_points`."""

from __future__ import annotations

from aleafield.errors import InputError
from aleafield.geometry import Domain, Interval, Refinement
from aleafield.quadrature.clenshaw_curtis import clenshaw_curtis
from aleafield.quadrature.composite import composite_gauss, simpson, trapezoid
from aleafield.quadrature.gauss import gauss_legendre
from aleafield.quadrature.rule import Rule

COMPOSITE_RULES = {"trapezoid": trapezoid, "simpson": simpson, "composite gauss": composite_gauss}
INTERVAL_RULES = {"gauss-legendre": gauss_legendre, "clenshaw-curtis": clenshaw_curtis}
RULE_NAMES = (*COMPOSITE_RULES, *INTERVAL_RULES)


def count_refinement(name: str, domain: Domain) -> Refinement:
    """How the count of a rule grows: see `make_rule` for what it counts.

    Raises
    ------
    InputError
        Where the name is unknown or the rule does not exist on the domain.
    """
    if name not in RULE_NAMES:
        raise InputError("scheme.quadrature", f"{name!r}", "one of " + ", ".join(RULE_NAMES) + " is needed")
    if domain.periodic and name in INTERVAL_RULES:
        raise InputError("scheme.quadrature", f"{name!r} on a ring", "on a ring the trapezoid rule is needed")
    both_ends = not domain.periodic and name != "gauss-legendre"
    return Refinement(both_ends, smallest=2 if both_ends else 1, key="scheme.quadrature_points")


def make_rule(name: str, domain: Domain, count: int) -> Rule:
    """The rule of that name on the domain.

    Parameters
    ----------
    name : str
        One of `RULE_NAMES`.
    domain : Interval or Ring
    count : int
        Composite rules: number of panel ends (count - 1 panels on an interval, count on a ring; simpson adds
        the midpoints, composite gauss has two points inside each panel).  gauss-legendre and clenshaw-curtis:
        number of points on the whole interval.

    Raises
    ------
    InputError
        Where the name is unknown, the rule does not exist on the domain, or the count is too small.
    """
    count_refinement(name, domain).check(count)
    if isinstance(domain, Interval) and name in INTERVAL_RULES:
        return INTERVAL_RULES[name](domain, count)
    return COMPOSITE_RULES[name](domain, count if domain.periodic else count - 1)
