"""The error split as a picture: one bar per statistic, cut into the parts of its total half-width."""

from __future__ import annotations

from aleafield.report.findings import Finding, QuantityFindings, with_units
from aleafield.report.parts import PARTS, Part
from aleafield.report.rounding import percent, short, typographic
from aleafield.report.svg import Drawing, arrow, box, label, part_style, segment, text_width
from aleafield.report.verdict import half_width_text

_LEFT, _WIDTH, _RIGHT = 150.0, 640.0, 150.0
_BAR, _ROW = 24.0, 36.0
_STRONG = 1.1
"""Strong letters are wider than the others."""
_TAIL = 64.0
"""Room of the arrow that stands for an open end."""


def error_split(findings: QuantityFindings, name: str) -> Drawing | None:
    """Bars of all statistics that have a total; every bar stands for its whole total.

    The biases have their own lengths; the random parts add in quadrature and divide their common length in
    proportion to their squares, so that each bar is exactly filled.  Where an end of the interval is open the
    bar stands for the side that is bounded, and an arrow follows it.

    Returns
    -------
    Drawing, or None where no statistic has a positive total
    """
    rows = [(found, shares) for found in findings.all() if (shares := found.shares())]
    if not rows:
        return None
    present = [part for part in PARTS if any(part in shares for _, shares in rows)]
    legend, legend_height = _legend(present)
    drawing = Drawing(
        name,
        f"Where the error of {findings.name} comes from",
        " ".join(f"{found.name}: {_spoken_row(found, shares)}." for found, shares in rows),
        width=_LEFT + _WIDTH + max(_RIGHT, *(_STRONG * text_width(_total(found)) + 20 for found, _ in rows)),
        height=legend_height + _ROW * len(rows) + 6,
        style=part_style([part.style for part in PARTS]),
    )
    for part, x, y in legend:
        drawing.add(
            box(x, y, 12, 12, f"part-{part.style}", part.meaning, radius=2), label(x + 18, y + 10, part.name)
        )
    for number, (found, shares) in enumerate(rows):
        _draw_row(drawing, found, shares, legend_height + _ROW * number + 4)
    return drawing


def spoken(shares: dict[Part, float]) -> str:
    """Shares in words, largest first, as in "sampling 62 %, space 38 %"."""
    ordered = sorted(shares.items(), key=lambda item: -item[1])
    return ", ".join(f"{part.name} {percent(share)}" for part, share in ordered if share > 0)


def _spoken_row(found: Finding, shares: dict[Part, float]) -> str:
    if found.open_side is None:
        return spoken(shares)
    return f"open {found.open_side}, the other side {spoken(shares)}"


def _legend(parts: list[Part]) -> tuple[list[tuple[Part, float, float]], float]:
    """Places of the entries in lines that do not overflow, and the height they take."""
    places = []
    x, y = _LEFT, 6.0
    for part in parts:
        room = 18 + text_width(part.name) + 18
        if x > _LEFT and x + room > _LEFT + _WIDTH + _RIGHT:
            x, y = _LEFT, y + 20
        places.append((part, x, y))
        x += room
    return places, y + 24


def _total(found: Finding) -> str:
    """What stands at the end of a bar."""
    text = half_width_text(found)
    return text if found.open_side is not None else f"\N{PLUS-MINUS SIGN} {with_units(text, found.units)}"


def _draw_row(drawing: Drawing, found: Finding, shares: dict[Part, float], y: float) -> None:
    middle = y + _BAR / 2 + 4
    drawing.add(label(_LEFT - 10, middle, found.name, None, "end"))
    side = found.open_side
    x, whole, of = (_LEFT, _WIDTH, "total") if side is None else (_LEFT, _WIDTH - _TAIL, "bounded side")
    for part, share in shares.items():
        width = share * whole
        if width < 0.25:
            continue
        size = with_units(typographic(short(found.error[part.key], 2)), found.units)
        says = f"{part.name}: {size}, {percent(share)} of the {of}"
        drawing.add(box(x, y, max(width - 1.5, 0.5), _BAR, f"part-{part.style}", says, radius=2))
        for text in (f"{part.name} {percent(share)}", percent(share)):
            if text_width(text) + 10 < width:
                drawing.add(label(x + width / 2, middle, text, f"on-{part.style}", "middle"))
                break
        x += width
    if side is not None:
        end, y = _LEFT + _WIDTH, y + _BAR / 2
        drawing.add(segment(end - _TAIL + 3, y, end - 6, y, "open"), arrow(end, y, 1))
    drawing.add(label(_LEFT + _WIDTH + 10, middle, _total(found), "strong"))
