"""What to measure next: the spread that stays when an input is known exactly, or twice as well."""

from __future__ import annotations

from aleafield.report.figures.index_bars import MOST_INPUTS
from aleafield.report.findings import Finding, with_units
from aleafield.report.influence import Measure, Measurement
from aleafield.report.markup import Markup, element
from aleafield.report.rounding import short, typographic
from aleafield.report.svg import Drawing, Frame, box, label, labelled, segment, text_width, whisker
from aleafield.report.verdict import interval_text

_WIDTH, _RIGHT, _LEAST_LEFT = 600.0, 110.0, 110.0
_TOP, _ROW = 54.0, 34.0
_KNOWN, _HALVED = -5.0, 7.0
"""Places of the two marks about the middle of a row, px."""


def remaining_spread(measurement: Measurement, name: str) -> Drawing | None:
    """A row per input: the gain from the present spread to what stays, with the wanted spread as a line.

    Returns
    -------
    Drawing, or None where the present spread or all that would stay is not determined
    """
    present = measurement.present
    rows = [one for one in measurement.measures[:MOST_INPUTS] if _stated(one)]
    if present.value is None or not rows:
        return None
    found = [part for one in rows for part in (one.known, one.halved) if part.value is not None]
    wanted = sorted({one.wanted_sd for one in measurement.sets})
    sets = [one for one in measurement.sets if one.inputs and one.remaining_sd is not None]
    places = [present.value, *wanted, *(one.remaining_sd for one in sets if one.remaining_sd is not None)]
    places += [end for part in (*found, present) for end in (part.value, *part.interval) if end is not None]
    low, high = min(places), max(places)
    low = 0.0 if low < 0.4 * high else low - 0.05 * (high - low)
    left = max(_LEAST_LEFT, *(text_width(one.path) + 20 for one in rows))
    height = _ROW * (len(rows) + len(sets))
    drawing = Drawing(
        name,
        f"What would narrow {measurement.quantity}",
        f"Standard deviation now {_spoken(present)}. "
        + " ".join(f"{part.name}: {_spoken(part)}." for part in found),
        width=left + _WIDTH + _RIGHT,
        height=_TOP + height + 44,
    )
    frame = Frame(left, _TOP, _WIDTH, height, (low, high + 0.03 * (high - low)), (0.0, 1.0))
    _draw_legend(drawing, left)
    _draw_present(drawing, frame, present)
    needed = {path for one in sets for path in one.inputs or ()}
    for number, one in enumerate(rows):
        remark = "may be fixed" if one.may_be_fixed else "pin down" if one.path in needed else ""
        _draw_row(drawing, frame, one, present.value, _TOP + _ROW * (number + 0.5), remark)
    for number, chosen in enumerate(sets):
        y = _TOP + _ROW * (len(rows) + number + 0.5)
        assert chosen.remaining_sd is not None
        says = f"{', '.join(chosen.inputs or ())}: {short(chosen.remaining_sd, 3)}"
        drawing.add(segment(0, y - _ROW / 2, frame.right, y - _ROW / 2, "axis"))
        drawing.add(label(left - 10, y + 4, "all to pin down", "strong", "end"))
        drawing.add(*_gain(frame, chosen.remaining_sd, present.value, y, _ROW / 2 - 5, says))
        drawing.add(_mark(frame.x(chosen.remaining_sd), y, "dot", says))
    now = frame.x(present.value)
    drawing.add(segment(now, frame.top, now, frame.bottom, "now"))
    for level in wanted:
        x = frame.x(level)
        text = f"wanted {with_units(typographic(short(level, 4)), measurement.units)}"
        drawing.add(segment(x, _TOP - 12, x, frame.bottom, "limit"))
        fits = x + text_width(text) + 8 < frame.right + _RIGHT
        drawing.add(label(x + (5 if fits else -5), _TOP - 5, text, "limit-text", None if fits else "end"))
    drawing.add(
        *frame.bottom_axis(labelled(f"standard deviation of {measurement.quantity}", measurement.units))
    )
    return drawing


def _stated(one: Measure) -> bool:
    return one.known.value is not None or one.halved.value is not None


def _spoken(found: Finding) -> str:
    return f"{typographic(found.rounded.value)}, {interval_text(found)}"


def _draw_legend(drawing: Drawing, x: float) -> None:
    for kind, text in (("dot", "known exactly"), ("ring", "spread halved")):
        drawing.add(_mark(x + 6, 10, kind, text), label(x + 18, 14, text))
        x += 18 + text_width(text) + 18
    drawing.add(segment(x + 6, 2, x + 6, 18, "now"), label(x + 16, 14, "as it is now"))


def _draw_present(drawing: Drawing, frame: Frame, present: Finding) -> None:
    assert present.value is not None
    low, high = (present.value if end is None else end for end in present.interval)
    says = f"now: {_spoken(present)}"
    width = frame.x(high) - frame.x(low)
    drawing.add(box(frame.x(low), frame.top, width, frame.height, "now-band", says))


def _draw_row(drawing: Drawing, frame: Frame, one: Measure, present: float, y: float, remark: str) -> None:
    drawing.add(segment(frame.left, y + _ROW / 2, frame.right, y + _ROW / 2, "grid"))
    drawing.add(label(frame.left - 10, y + 4, one.path, None, "end"))
    for found, shift, half, kind in ((one.known, _KNOWN, 5.0, "dot"), (one.halved, _HALVED, 3.5, "ring")):
        if found.value is None:
            continue
        says = f"{found.name}: {_spoken(found)}"
        low, high = (found.value if end is None else end for end in found.interval)
        drawing.add(*_gain(frame, found.value, present, y + shift, half, says))
        drawing.add(*whisker(frame.x(low), frame.x(high), y + shift))
        drawing.add(_mark(frame.x(found.value), y + shift, kind, says))
    if remark:
        drawing.add(label(frame.right + 12, y + 4, remark, "strong" if remark == "pin down" else "quiet"))


def _gain(frame: Frame, remaining: float, present: float, y: float, half: float, says: str) -> list[Markup]:
    """The bar from what stays to what is; none where nothing is gained."""
    start, end = frame.x(remaining), frame.x(present)
    return [box(start, y - half, end - start, 2 * half, "gain", says)] if end > start else []


def _mark(x: float, y: float, kind: str, says: str) -> Markup:
    return element("circle", element("title", says), cx=x, cy=y, r=4, class_=kind)
