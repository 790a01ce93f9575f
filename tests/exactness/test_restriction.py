"""The projections: exact on the space, orthogonal by their rule, and equal to a dense solve."""

from __future__ import annotations

import numpy as np
import pytest

from aleafield.errors import InputError
from aleafield.geometry import Domain, Interval, Ring
from aleafield.projection.restriction import MassRestriction, ModalRestriction
from aleafield.quadrature import gauss_legendre, make_rule
from aleafield.spaces import Legendre, PiecewiseLinear

DOMAINS: list[Domain] = [Interval(-1.0, 2.0), Ring(3.0)]
RULES = [
    ("trapezoid", 1),
    ("trapezoid", 2),
    ("trapezoid", 3),
    ("simpson", 1),
    ("composite gauss", 1),
    ("composite gauss", 2),
]


def count(domain: Domain, nodes: int, panels: int) -> int:
    """Count of a composite rule with that many panels in each element."""
    return nodes * panels if domain.periodic else (nodes - 1) * panels + 1


@pytest.mark.parametrize("domain", DOMAINS, ids=["interval", "ring"])
@pytest.mark.parametrize(("rule_name", "panels"), RULES)
@pytest.mark.parametrize("nodes", [3, 8, 17])
def test_mass_restriction(domain: Domain, rule_name: str, panels: int, nodes: int) -> None:
    """Against numpy's dense solution of M c = Phi' W v, and exact for elements of the space."""
    space = PiecewiseLinear(domain, nodes)
    rule = make_rule(rule_name, domain, count(domain, nodes, panels))
    restriction = MassRestriction(space, rule)
    hats = space.evaluation_matrix(rule.points)
    mass = hats.T @ (rule.weights[:, None] * hats)
    random = np.random.default_rng(11)
    values = random.standard_normal((8, len(rule.points)))
    dense = np.linalg.solve(mass, hats.T @ (rule.weights * values).T).T
    np.testing.assert_allclose(restriction.apply(values), dense, rtol=0, atol=1e-12)
    u = random.standard_normal((8, nodes))
    np.testing.assert_allclose(restriction.apply(space.evaluate(u, rule.points)), u, rtol=0, atol=1e-12)
    matrix = random.standard_normal((2, len(rule.points), 5))
    folded = restriction.fold(matrix)
    assert folded.shape == (2, nodes, 5)
    np.testing.assert_allclose(folded[1, :, 3], restriction.apply(matrix[1:, :, 3])[0], rtol=0, atol=1e-13)


@pytest.mark.parametrize("domain", DOMAINS, ids=["interval", "ring"])
def test_lumping_is_the_identity(domain: Domain) -> None:
    """The trapezoid rule at the nodes makes the mass matrix diagonal and the projection interpolation."""
    space = PiecewiseLinear(domain, 9)
    values = np.random.default_rng(2).standard_normal((8, 9))
    restriction = MassRestriction(space, make_rule("trapezoid", domain, 9))
    np.testing.assert_allclose(restriction.apply(values), values, rtol=1e-14)


def test_too_few_points_are_refused() -> None:
    space = PiecewiseLinear(Interval(0.0, 1.0), 9)
    with pytest.raises(InputError) as caught:
        MassRestriction(space, make_rule("trapezoid", Interval(0.0, 1.0), 5))
    assert caught.value.key == "scheme.quadrature_points"


def test_modal_restriction_is_the_orthogonal_projection() -> None:
    """exp has Legendre coefficients that scipy's adaptive quadrature gives to 1e-12."""
    from scipy.integrate import quad

    interval = Interval(-1.0, 1.0)
    space = Legendre(interval, 16)
    coefficients = ModalRestriction(space).apply(np.exp(gauss_legendre(interval, 16).points)[None, :])[0]
    for k in range(5):
        basis = np.zeros(k + 1)
        basis[k] = np.sqrt((2 * k + 1) / 2)
        exact, _ = quad(
            lambda x, b=basis: np.exp(x) * np.polynomial.legendre.legval(x, b), -1, 1, epsabs=1e-14
        )
        assert coefficients[k] == pytest.approx(exact, abs=1e-12)
