"""The distribution of a quantity: histogram, quantiles and mean with their intervals, levels to exceed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.report.findings import Finding, QuantityFindings, with_units
from aleafield.report.markup import element
from aleafield.report.rounding import typographic
from aleafield.report.svg import Drawing, Frame, arrow, label, labelled, segment, text_width
from aleafield.report.verdict import interval_text

_LEFT, _WIDTH, _HEIGHT = 120.0, 780.0, 220.0
_ROW = 19.0


@dataclass(frozen=True)
class Histogram:
    """Counts (B,) between edges (B + 1,), and how many values lie below and above."""

    edges: FloatArray
    counts: IntArray
    below: int
    above: int

    @property
    def size(self) -> int:
        """Number of all values."""
        return int(self.counts.sum()) + self.below + self.above


def histogram(values: FloatArray) -> Histogram | None:
    """Bars of the finite values; None without any.

    Width by Freedman and Diaconis 1981 (from memory), 8 to 48 bars.  Where a few values lie farther than four
    interquartile ranges outside the quartiles the bars end there and the rest is counted.

    Parameters
    ----------
    values : float array (S,)
    """
    finite = values[np.isfinite(values)]
    if len(finite) == 0:
        return None
    low, high = float(finite.min()), float(finite.max())
    first, third = np.quantile(finite, [0.25, 0.75])
    middle = float(third - first)
    if middle > 0:
        low, high = max(low, float(first) - 4 * middle), min(high, float(third) + 4 * middle)
    if not high > low:
        reach = 0.05 * abs(low) or 0.5
        low, high = low - reach, high + reach
    width = 2 * middle / len(finite) ** (1 / 3)
    bars = int(np.clip((high - low) / width if width > 0 else 24, 8, 48))
    counts, edges = np.histogram(finite, bars, (low, high))
    return Histogram(edges, counts.astype(np.int64), int((finite < low).sum()), int((finite > high).sum()))


def distribution(findings: QuantityFindings, values: FloatArray, name: str) -> Drawing | None:
    """The stored values of a quantity with its findings on the same axis.

    Parameters
    ----------
    findings : QuantityFindings
    values : float array (S',), NaN where the quantity does not occur
    name : name of the drawing

    Returns
    -------
    Drawing, or None where no value is stored
    """
    bars = histogram(values)
    if bars is None:
        return None
    rows = [f for f in (findings.mean, *findings.quantiles.values()) if f.value is not None]
    levels = {float(key): found for key, found in findings.exceed.items()}
    x_range = _range(bars, rows, list(levels))
    shown = {level: found for level, found in levels.items() if x_range[0] <= level <= x_range[1]}
    top = 16.0 + 17.0 * len(shown)
    shares = bars.counts / bars.size
    frame = Frame(_LEFT, top, _WIDTH, _HEIGHT, x_range, (0.0, float(shares.max()) * 1.06))
    strip = frame.bottom + 10 + _ROW * len(rows)
    drawing = Drawing(
        name,
        f"Distribution of {findings.name}",
        f"Histogram of {bars.size} values between {bars.edges[0]:.4g} and {bars.edges[-1]:.4g}, with "
        f"{len(rows)} estimates and their intervals below it and {len(shown)} levels marked.",
        width=_LEFT + _WIDTH + 28,
        height=strip + 48,
    )
    drawing.add(*frame.left_axis("share of values"))
    says = [
        f"{bars.edges[i]:.4g} to {bars.edges[i + 1]:.4g}: {int(count)} of {bars.size} values"
        for i, count in enumerate(bars.counts)
    ]
    lowest = min(shown, default=np.inf)
    kinds = ["bar beyond" if edge >= lowest else "bar" for edge in bars.edges[:-1]]
    drawing.add(*frame.bars(bars.edges, shares, says, kinds))
    for number, (level, found) in enumerate(sorted(shown.items())):
        _draw_level(drawing, frame, level, found, 14.0 + 17.0 * (len(shown) - 1 - number), findings.units)
    for number, found in enumerate(rows):
        _draw_finding(drawing, frame, found, frame.bottom + 10 + _ROW * (number + 0.5))
    axis = Frame(frame.left, frame.top, frame.width, strip - frame.top, x_range, (0.0, 1.0))
    drawing.add(*axis.bottom_axis(labelled(findings.name, findings.units)))
    return drawing


def _range(bars: Histogram, rows: list[Finding], levels: list[float]) -> tuple[float, float]:
    """The bars, and what lies within half their extent beside them."""
    low, high = float(bars.edges[0]), float(bars.edges[-1])
    reach = 0.5 * (high - low)
    ends = [end for found in rows for end in (found.value, *found.interval) if end is not None]
    near = [end for end in (*ends, *levels) if low - reach <= end <= high + reach]
    low, high = min([low, *near]), max([high, *near])
    pad = 0.02 * (high - low)
    return low - pad, high + pad


def _draw_level(drawing: Drawing, frame: Frame, level: float, found: Finding, y: float, units: str) -> None:
    x = frame.x(level)
    drawing.add(segment(x, y + 3, x, frame.bottom, "limit"))
    rounded = found.rounded
    text = f"above {with_units(repr(level), units)}: P = {typographic(rounded.value)}"
    if x - 6 - text_width(text) > 0:  # to the left, where the lines of higher levels do not cross it
        drawing.add(label(x - 6, y + 8, text, "limit-text", "end"))
    else:
        drawing.add(label(x + 6, y + 8, text, "limit-text"))


def _draw_finding(drawing: Drawing, frame: Frame, found: Finding, y: float) -> None:
    """A dot at the value and a bar over its interval, cut at the frame; an arrow where it is open."""
    assert found.value is not None
    drawing.add(label(frame.left - 10, y + 4, found.name, "quiet", "end"))
    drawing.add(segment(frame.left, y, frame.right, y, "grid"))
    side = found.open_side
    low, high = (end if end is not None else found.value for end in found.interval)
    low, high = max(low, frame.x_range[0]), min(high, frame.x_range[1])
    if high > low:
        drawing.add(segment(frame.x(low), y, frame.x(high), y, "whisker"))
    if side is not None:
        end, direction = (frame.right, 1) if side == "above" else (frame.left, -1)
        drawing.add(
            segment(frame.x(found.value), y, end - 6 * direction, y, "open"), arrow(end, y, direction)
        )
    if frame.holds(found.value):
        says = f"{found.name}: {typographic(found.rounded.value)}, {interval_text(found)}"
        drawing.add(
            element("circle", element("title", says), cx=frame.x(found.value), cy=y, r=4, class_="dot")
        )
