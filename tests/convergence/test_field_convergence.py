"""Every pair of projector and quadrature converges as announced, and docs/orders.md says what is true."""

from __future__ import annotations

import pytest

from aleafield.errors import InputError
from aleafield.projection.expectation import Expected
from aleafield.projection.pairing import resolve
from aleafield.projection.scheme import Scheme
from tests.convergence.field_orders import (
    CASES,
    FAST,
    Case,
    Observed,
    Refused,
    all_pairs,
    measure,
    sort_pairs,
)
from tests.convergence.order_table import cells, page, read_rows
from tests.convergence.write_table import PAGE

ALLOWED, REFUSED = sort_pairs()


def assert_as_announced(expected: Expected, observed: Observed) -> None:
    """A proven order within 0.2; "faster than any power" above 6; one that is only observed not below it.

    Overall orders of root-mean-square differences over two or three halvings: the next term of the expansion,
    of relative size h^2 and at most 1/4 on the coarsest level, moves them by less than log2(1.25)/2 = 0.16.
    """
    if observed.order is None:
        return
    if expected.order is None:
        assert observed.order > FAST
    elif expected.observed_only:
        assert observed.order > expected.order - 0.3
    else:
        assert observed.order == pytest.approx(expected.order, abs=0.2)


def number(text: str) -> float | None:
    """The number of a cell, None for words."""
    try:
        return float(text)
    except ValueError:
        return None


@pytest.mark.parametrize(
    ("domain", "scheme", "case"),
    ALLOWED,
    ids=[f"{d}-{s.projector}-{s.method}-{s.quadrature}-{c.name}" for d, s, c in ALLOWED],
)
def test_orders_are_as_announced_and_as_documented(domain: str, scheme: Scheme, case: Case) -> None:
    row = measure(domain, scheme, case)
    assert_as_announced(row.expected_space, row.space)
    assert_as_announced(row.expected_quadrature, row.integral)
    if row.whole is not None:
        orders = [
            part.order for part in (row.expected_space, row.expected_quadrature) if part.order is not None
        ]
        lowest = Expected(min(orders) if orders else None, "the lower of the two")
        assert_as_announced(lowest, row.whole)
    shown = cells(row)
    documented = read_rows(PAGE.read_text(encoding="utf-8"))[shown[:5]]
    for now, then in zip(shown[5:], documented, strict=True):
        one, other = number(now), number(then)
        if one is None or other is None:
            assert now == then
        else:
            assert one == pytest.approx(other, rel=0.5, abs=0.0) if one < 1 else abs(one - other) <= 0.11


def test_the_documented_pairs_are_all_pairs() -> None:
    documented = read_rows(PAGE.read_text(encoding="utf-8"))
    assert set(documented) == {(d, s.projector, s.method, s.quadrature, c.name) for d, s, c in ALLOWED}
    tail = page([], REFUSED).split("## Pairs that are refused")[1]
    assert PAGE.read_text(encoding="utf-8").endswith(tail)


def test_every_pair_is_either_allowed_or_refused() -> None:
    allowed = {(d, s) for d, s, _ in ALLOWED}
    refused = {(r.domain, r.projector, r.method, r.quadrature) for r in REFUSED}
    assert len(allowed) + len(refused) == len(all_pairs())


@pytest.mark.parametrize("pair", REFUSED, ids=lambda r: f"{r.domain}-{r.projector}-{r.method}-{r.quadrature}")
def test_refusals_name_the_entry_and_the_way_out(pair: Refused) -> None:
    """Each names a projector on the wrong domain, a wrong method, or the rule, and what would be right."""
    wrong_domain = (
        pair.projector == "fourier"
        if pair.domain == "interval"
        else pair.projector in ("chebyshev", "legendre")
    )
    wrong_method = (pair.projector, pair.method) in (("chebyshev", "galerkin"), ("legendre", "collocation"))
    entry = "projector" if wrong_domain else "method" if wrong_method else "quadrature"
    assert pair.error.key == f"scheme.{entry}"
    assert "use" in pair.error.needed or "needed" in pair.error.needed


@pytest.mark.parametrize("domain", ["interval", "ring"])
@pytest.mark.parametrize("quadrature", ["trapezoid", "simpson", "gauss-legendre", "clenshaw-curtis"])
def test_a_step_rate_takes_the_matched_quadrature_only(domain: str, quadrature: str) -> None:
    equation = CASES[domain][2].equation
    with pytest.raises(InputError) as caught:
        resolve(Scheme("piecewise linear", "collocation", 65, quadrature), equation)
    assert caught.value.key == "scheme.quadrature"
    assert "matched" in caught.value.needed
