"""Which input causes it: bars of the indices of every input, with their intervals."""

from __future__ import annotations

from collections.abc import Sequence

from aleafield.report.findings import Finding
from aleafield.report.influence import Influence
from aleafield.report.parts import NOISE, IndexKind
from aleafield.report.rounding import typographic
from aleafield.report.svg import Drawing, Frame, box, label, part_style, segment, text_width, whisker
from aleafield.report.ticks import round_step
from aleafield.report.verdict import interval_text

MOST_INPUTS = 24
"""Inputs that a picture shows; tables hold all."""

_WIDTH, _RIGHT, _LEAST_LEFT = 600.0, 96.0, 110.0
_TOP, _BAR, _PITCH, _GAP = 32.0, 12.0, 15.0, 12.0


def index_bars(influence: Influence, name: str) -> Drawing | None:
    """Bars of all kinds of indices that have a value, the most important inputs first, the noise by itself at the end.

    Returns
    -------
    Drawing, or None where no index has a value
    """
    kinds = influence.stated
    shown = influence.inputs[:MOST_INPUTS] if kinds else ()
    groups: list[tuple[str, list[tuple[str, Finding]]]] = [
        (one.path, [(kind.style, one.indices[kind]) for kind in kinds if kind in one.indices])
        for one in shown
    ]
    if influence.noise is not None:
        groups.append(("noise", [(NOISE.key, influence.noise)]))
    stated = [found for _, bars in groups for _, found in bars if found.value is not None]
    if not stated:
        return None
    left = max(_LEAST_LEFT, *(text_width(path) + 20 for path, _ in groups))
    height = sum(_PITCH * len(bars) + _GAP for _, bars in groups)
    drawing = Drawing(
        name,
        f"Which input causes the spread of {influence.quantity}",
        " ".join(f"{_says(found)}." for found in stated),
        width=left + _WIDTH + _RIGHT,
        height=_TOP + height + 44,
        style=part_style([*(kind.style for kind in kinds), NOISE.key]),
    )
    _draw_legend(drawing, kinds, influence.noise is not None, left)
    frame = Frame(left, _TOP, _WIDTH, height, (0.0, _reach(stated)), (0.0, 1.0))
    y = _TOP + _GAP / 2
    for path, bars in groups:
        bottom = y + _PITCH * len(bars)
        drawing.add(label(left - 10, (y + bottom) / 2 + 3, path, None, "end"))
        for style, found in bars:
            _draw_bar(drawing, frame, style, found, y)
            y += _PITCH
        y += _GAP
        if path != groups[-1][0]:
            drawing.add(segment(0, y - _GAP / 2 - 1.5, frame.right + _RIGHT, y - _GAP / 2 - 1.5, "grid"))
    drawing.add(*frame.bottom_axis("share of the variance"))
    return drawing


def _reach(stated: Sequence[Finding]) -> float:
    """End of the axis: what the longest bar with its interval needs, at most 1."""
    longest = max(max(found.value or 0.0, found.interval[1] or 0.0) for found in stated)
    step = round_step(longest or 1.0, 8)
    return min(1.0, step * (int(longest / step) + 1))


def _says(found: Finding) -> str:
    return f"{found.name}: {typographic(found.rounded.value)}, {interval_text(found)}"


def _draw_legend(drawing: Drawing, kinds: Sequence[IndexKind], noisy: bool, x: float) -> None:
    entries = [(kind.style, kind.name, kind.meaning) for kind in kinds]
    if noisy:
        entries.append((NOISE.key, "noise, total", NOISE.meaning))
    for style, text, meaning in entries:
        drawing.add(box(x, 4, 12, 12, f"part-{style}", meaning, radius=2), label(x + 18, 14, text))
        x += 18 + text_width(text) + 18


def _draw_bar(drawing: Drawing, frame: Frame, style: str, found: Finding, y: float) -> None:
    middle = y + _BAR / 2
    if found.value is None:
        drawing.add(label(frame.left + 6, middle + 4, "not determined", "quiet"))
        return
    end = frame.x(min(max(found.value, 0.0), frame.x_range[1]))
    drawing.add(
        box(frame.left, y, max(end - frame.left, 1.0), _BAR, f"part-{style}", _says(found), radius=1.5)
    )
    low, high = (found.value if side is None else side for side in found.interval)
    drawing.add(*whisker(frame.x(low), frame.x(high), middle))
    drawing.add(label(frame.right + 12, middle + 4, typographic(found.rounded.value), "quiet"))
