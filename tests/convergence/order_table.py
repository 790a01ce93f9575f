"""The table of orders as markdown, written to docs/orders.md by `python -m tests.convergence.write_table`."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence

from tests.convergence.field_orders import Refused, Row

HEAD = """\
# Orders of convergence

This page is made by `python -m tests.convergence.write_table`; a test measures it anew and compares.

Every projector, method and quadrature that a study file can name is on it. *Space* is the error of the
projector with the quadrature points held, *quadrature* that of the integrals with the projector held: root-
mean-square differences of two neighbouring levels over the domain, from the coarsest level to the finest
that is not lost in rounding ("rounding": all of them are). *All* is the error against the exact solution
when both are refined, and *error* its size at the last level but one.

The smooth and the kinked kernel belong to manufactured solutions with a logistic rate: on the interval [-1,
1] the degenerate kernel cos(2x) exp(y) and an exponential kernel of width 1, on the ring of length 2 pi a
gaussian and an exponential kernel of width 0.5. A step rate goes with the matched quadrature only, which
resolves its threshold crossings; the exact solution is not known and no order is proven, so that the
expected one is marked "observed only". Its orders are means over eight shifts of the active patch.

The time step is the classical Runge-Kutta method: order 4 where rate and drive are smooth in time and every
switch of the drive lies on the schedule, order 1 where a switch is uncertain or depends on x, about 2 for
rates with kinks.

## Pairs that go together
"""

REFUSED_HEAD = """
## Pairs that are refused

"""

COLUMNS = (
    "domain",
    "projector",
    "method",
    "quadrature",
    "kernel and rate",
    "space: expected",
    "observed",
    "quadrature: expected",
    "observed",
    "all: observed",
    "error",
)


def cells(row: Row) -> tuple[str, ...]:
    """The cells of a row."""
    return (
        row.domain,
        row.projector,
        row.method,
        row.quadrature,
        row.case,
        row.expected_space.text,
        row.space.text,
        row.expected_quadrature.text,
        row.integral.text,
        "-" if row.whole is None else row.whole.text,
        "-" if row.error is None else ("below 1e-8" if row.error < 1e-8 else f"{row.error:.0e}"),
    )


def _line(entries: Iterable[str]) -> str:
    return "| " + " | ".join(entries) + " |"


def _table(columns: Sequence[str], rows: Iterable[Sequence[str]]) -> Iterator[str]:
    yield _line(columns)
    yield _line("---" for _ in columns)
    for row in rows:
        yield _line(row)


def _groups(refused: Sequence[Refused]) -> list[tuple[str, ...]]:
    """Refused pairs with the same fault in one row, so that a projector that is at fault is named once."""
    found: dict[tuple[str, str, str], tuple[list[str], list[str], str]] = {}
    for one in refused:
        method = "" if one.error.key == "scheme.projector" else one.method
        fault = one.quadrature if one.error.key == "scheme.quadrature" else ""
        methods, quadratures, _ = found.setdefault(
            (one.domain, one.projector, method + fault), ([], [], f"`{one.error.key}`: {one.error.needed}")
        )
        methods += [one.method] if one.method not in methods else []
        quadratures += [one.quadrature] if one.quadrature not in quadratures else []
    return [
        (domain, projector, ", ".join(methods), "any" if len(quadratures) > 1 else quadratures[0], needed)
        for (domain, projector, _), (methods, quadratures, needed) in found.items()
    ]


def page(rows: Sequence[Row], refused: Sequence[Refused]) -> str:
    """The whole page."""
    lines = [HEAD, *_table(COLUMNS, map(cells, rows)), REFUSED_HEAD.rstrip("\n"), ""]
    lines += _table(("domain", "projector", "method", "quadrature", "what is right"), _groups(refused))
    return "\n".join(lines) + "\n"


def read_rows(text: str) -> dict[tuple[str, ...], tuple[str, ...]]:
    """Cells of the first table of a page, by their first five."""
    found = {}
    for line in text.splitlines():
        entries = tuple(entry.strip() for entry in line.strip().strip("|").split("|"))
        if (
            line.startswith("|")
            and len(entries) == len(COLUMNS)
            and entries != COLUMNS
            and entries[0] != "---"
        ):
            found[entries[:5]] = entries[5:]
    return found
