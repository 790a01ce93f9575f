"""The variance of the quantities as bars: what the parameters cause, and what the noise."""

from __future__ import annotations

from collections.abc import Sequence

from aleafield.report.findings import Finding, QuantityFindings
from aleafield.report.parting import per_cent
from aleafield.report.parts import CAUSES, NOISE, PARAMETERS
from aleafield.report.svg import Drawing, Frame, box, label, part_style, segment, text_width

_WIDTH, _RIGHT = 580.0, 210.0
_TOP, _BAR, _ROW = 30.0, 22.0, 50.0
_LEAST_LEFT = 150.0


def variance_parts(findings: Sequence[QuantityFindings], name: str) -> Drawing | None:
    """A bar per quantity, cut at the share of the parameters; the interval of the cut is marked below it.

    Returns
    -------
    Drawing, or None where no share is known
    """
    rows = [
        (quantity.name, quantity.variance.share)
        for quantity in findings
        if quantity.variance is not None
        and quantity.variance.share is not None
        and quantity.variance.share.value is not None
    ]
    if not rows:
        return None
    left = max(_LEAST_LEFT, *(text_width(quantity) + 20 for quantity, _ in rows))
    bottom = _TOP + _ROW * len(rows)
    drawing = Drawing(
        name,
        "Noise or ignorance",
        " ".join(
            f"{quantity}: {per_cent(share)} of the variance from the parameters." for quantity, share in rows
        ),
        width=left + _WIDTH + _RIGHT,
        height=bottom + 44,
        style=part_style([cause.key for cause in CAUSES]),
    )
    x = left
    for cause in CAUSES:
        drawing.add(
            box(x, 4, 12, 12, f"part-{cause.key}", cause.meaning, radius=2), label(x + 18, 14, cause.name)
        )
        x += 18 + text_width(cause.name) + 18
    frame = Frame(left, _TOP, _WIDTH, bottom - _TOP, (0.0, 100.0), (0.0, 1.0))
    for number, (quantity, share) in enumerate(rows):
        _draw_row(drawing, frame, quantity, share, _TOP + _ROW * number)
    drawing.add(*frame.bottom_axis("share of the variance (%)"))
    return drawing


def _draw_row(drawing: Drawing, frame: Frame, quantity: str, share: Finding, y: float) -> None:
    assert share.value is not None
    middle = y + _BAR / 2 + 4
    cut = frame.x(100 * share.value)
    drawing.add(label(frame.left - 10, middle, quantity, None, "end"))
    for cause, start, end in ((PARAMETERS, frame.left, cut), (NOISE, cut, frame.right)):
        if end - start > 0.25:
            says = f"{cause.name}: {100 * (end - start) / frame.width:.3g} % of the variance of {quantity}"
            drawing.add(box(start, y, max(end - start - 1, 0.5), _BAR, f"part-{cause.key}", says, radius=2))
        if text_width(cause.name) + 10 < end - start:
            drawing.add(label((start + end) / 2, middle, cause.name, f"on-{cause.key}", "middle"))
    low, high = share.interval
    level = y + _BAR + 8
    if low is not None and high is not None:
        first, last = frame.x(100 * low), frame.x(100 * high)
        drawing.add(
            segment(first, level, last, level, "whisker"),
            *(segment(end, level - 4, end, level + 4, "whisker") for end in (first, last)),
        )
    drawing.add(segment(cut, y, cut, level + 4, "whisker"))
    drawing.add(label(frame.right + 10, middle, per_cent(share), "strong"))
