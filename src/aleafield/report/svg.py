"""Drawings: a canvas with title and description, and a plot frame with axes, lines, bands, bars and maps."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.report.image import Bytes, data_address, png
from aleafield.report.markup import Content, Markup, element, number_text
from aleafield.report.palette import css_variables, map_colours
from aleafield.report.ticks import tick_labels, ticks

STYLE = (
    ".plot{font-family:system-ui,'Segoe UI','Helvetica Neue',Arial,sans-serif;font-size:12px}"
    ".plot text{fill:var(--ink)}.plot .quiet{fill:var(--quiet)}.plot .strong{font-weight:600}"
    ".plot .axis{stroke:var(--line);fill:none}.plot .grid{stroke:var(--grid);fill:none}"
    ".plot .curve{stroke:var(--accent);stroke-width:2;fill:none;stroke-linejoin:round}"
    ".plot .band{fill:var(--accent-soft);opacity:.6}.plot .band.inner{opacity:1}"
    ".plot .single{stroke:var(--quiet);stroke-width:1;fill:none;stroke-linejoin:round;opacity:.8}"
    ".plot .fan{fill:var(--accent);opacity:.17}.plot .fan.inner{opacity:.26}"
    ".plot .bar{fill:var(--accent-soft)}.plot .bar.beyond{fill:var(--mark);opacity:.55}"
    ".plot .limit{stroke:var(--mark);stroke-width:1.5;stroke-dasharray:4 3}"
    ".plot .limit-text{fill:var(--mark);font-weight:600}"
    ".plot .limit-text{paint-order:stroke;stroke:var(--panel);stroke-width:4px}"
    ".plot .whisker{stroke:var(--ink);stroke-width:2}.plot .dot{fill:var(--ink)}"
    ".plot .halo{stroke:var(--panel);stroke-width:5;opacity:.75}"
    ".plot .ring{fill:var(--panel);stroke:var(--ink);stroke-width:2}.plot .gain{fill:var(--accent-soft)}"
    ".plot .now{stroke:var(--ink);stroke-width:1.5}.plot .now-band{fill:var(--quiet);opacity:.18}"
    ".plot .cloud{fill:none;stroke:var(--accent);stroke-width:5;stroke-linecap:round;opacity:.45}"
    ".plot .trend{fill:none;stroke:var(--mark);stroke-width:2;stroke-linejoin:round}"
    ".plot .open{stroke:var(--ink);stroke-width:2;stroke-dasharray:2 3}"
    ".plot .probe{fill:transparent}.plot .probe:hover{fill:var(--quiet);fill-opacity:.18}"
)
"""Rules for the classes that drawings use; colours are the variables of `palette`."""

_LETTER = 6.6
"""Mean advance of a letter at 12 px, for estimates of the room that a label needs."""


def text_width(text: str) -> float:
    """Estimated width of a label in px."""
    return _LETTER * len(text)


def part_style(parts: Sequence[str]) -> str:
    """Rules that fill a segment of an error part and its label with the part's own colours."""
    return "".join(
        f".plot .part-{name}{{fill:var(--part-{name})}}.plot text.on-{name}{{fill:var(--on-part-{name})}}"
        for name in parts
    )


@dataclass
class Drawing:
    """A picture of its own: what is drawn, its title and what a reader who cannot see it is told.

    Attributes
    ----------
    name : short name of letters, digits and hyphens; file name and prefix of the identifiers
    title, description : plain text
    width, height : px
    style : rules besides `STYLE`
    content : elements in drawing order
    """

    name: str
    title: str
    description: str
    width: float
    height: float
    style: str = ""
    content: list[Markup] = field(default_factory=list)

    def add(self, *parts: Markup) -> None:
        """Draw on top of what is there."""
        self.content.extend(parts)

    def _element(self, *before: Content, space: str | None) -> Markup:
        title, description = f"{self.name}-title", f"{self.name}-text"
        return element(
            "svg",
            element("title", self.title, id=title),
            element("desc", self.description, id=description),
            *before,
            *self.content,
            xmlns=space,
            viewBox=f"0 0 {number_text(self.width)} {number_text(self.height)}",
            width=self.width,
            height=self.height,
            role="img",
            class_="plot",
            aria_labelledby=f"{title} {description}",
        )

    def inline(self) -> Markup:
        """The drawing inside a page that has the styles."""
        return self._element(space=None)

    def document(self) -> str:
        """The drawing as a file that stands alone (SVG 1.1 and 2)."""
        style = element("style", Markup(css_variables() + STYLE + self.style))
        ground = element("rect", width="100%", height="100%", fill="var(--panel)")
        content = self._element(style, ground, space="http://www.w3.org/2000/svg")
        return f'<?xml version="1.0" encoding="UTF-8"?>\n{content}\n'


def label(
    x: float, y: float, text: str, kind: str | None = None, anchor: str | None = None, turn: bool = False
) -> Markup:
    """A line of text; `anchor` is middle or end, `turn` sets it upright along a vertical axis."""
    rotation = f"rotate(-90 {number_text(x)} {number_text(y)})" if turn else None
    return element("text", text, x=x, y=y, class_=kind, text_anchor=anchor, transform=rotation)


def segment(x1: float, y1: float, x2: float, y2: float, kind: str) -> Markup:
    """A straight line."""
    return element("line", x1=x1, y1=y1, x2=x2, y2=y2, class_=kind)


def box(
    x: float,
    y: float,
    width: float,
    height: float,
    kind: str,
    says: str | None = None,
    radius: float | None = None,
) -> Markup:
    """A rectangle; `says` is shown to the reader who points at it."""
    children = () if says is None else (element("title", says),)
    return element("rect", *children, x=x, y=y, width=width, height=height, class_=kind, rx=radius)


def whisker(left: float, right: float, y: float) -> list[Markup]:
    """An interval between two places in px, readable on any ground; none where it has no length."""
    if not right > left:
        return []
    line = [segment(left, y, right, y, kind) for kind in ("halo", "whisker")]
    return line + [segment(end, y - 3.5, end, y + 3.5, "whisker") for end in (left, right)]


def path(points: Sequence[tuple[float, float]], kind: str, closed: bool = False) -> Markup:
    """A polyline through points in px."""
    steps = "L".join(f"{number_text(x)} {number_text(y)}" for x, y in points)
    return element("path", d=f"M{steps}{'Z' if closed else ''}", class_=kind)


def arrow(x: float, y: float, direction: int) -> Markup:
    """The head of an arrow whose tip is at (x, y); direction 1 points to the right, -1 to the left."""
    back = x - 8 * direction
    return path([(back, y - 5), (x, y), (back, y + 5)], "dot", closed=True)


@dataclass(frozen=True)
class Frame:
    """A plot area: the rectangle in px and the ranges of the data along it (y grows upwards).

    A range without extent is widened about its value.
    """

    left: float
    top: float
    width: float
    height: float
    x_range: tuple[float, float]
    y_range: tuple[float, float]

    def __post_init__(self) -> None:
        for name in ("x_range", "y_range"):
            low, high = getattr(self, name)
            if not high > low:
                reach = abs(low) * 0.05 or 1.0
                object.__setattr__(self, name, (low - reach, high + reach))

    @property
    def right(self) -> float:
        """Right edge in px."""
        return self.left + self.width

    @property
    def bottom(self) -> float:
        """Bottom edge in px."""
        return self.top + self.height

    def x(self, value: float) -> float:
        """Position of a datum along the horizontal axis in px."""
        low, high = self.x_range
        return self.left + self.width * (value - low) / (high - low)

    def y(self, value: float) -> float:
        """Position of a datum along the vertical axis in px."""
        low, high = self.y_range
        return self.bottom - self.height * (value - low) / (high - low)

    def holds(self, value: float) -> bool:
        """Whether a datum lies within the horizontal range."""
        return self.x_range[0] <= value <= self.x_range[1]

    def bottom_axis(self, title: str, room: float = 80.0) -> list[Markup]:
        """Ticks, two at least, labels and title below the plot; `room` is what a tick has along it in px."""
        wanted = max(2, round(self.width / room))
        values = ticks(*self.x_range, wanted)
        while len(values) < 2:
            wanted += 1
            values = ticks(*self.x_range, wanted)
        parts = [segment(self.left, self.bottom, self.right, self.bottom, "axis")]
        for value, text in zip(values, tick_labels(values), strict=True):
            x = self.x(value)
            parts.append(segment(x, self.bottom, x, self.bottom + 4, "axis"))
            parts.append(label(x, self.bottom + 17, text, "quiet", "middle"))
        parts.append(label(self.left + self.width / 2, self.bottom + 36, title, None, "middle"))
        return parts

    def levels(self) -> list[float]:
        """Data at which the left axis has its ticks."""
        return ticks(*self.y_range, wanted=max(2, round(self.height / 48)))

    def left_axis(self, title: str, grid: bool = True) -> list[Markup]:
        """Ticks, labels and title at the left, with lines across the plot."""
        values = self.levels()
        parts = []
        labels = tick_labels(values)
        for value, text in zip(values, labels, strict=True):
            y = self.y(value)
            if grid:
                parts.append(segment(self.left, y, self.right, y, "grid"))
            parts.append(label(self.left - 8, y + 4, text, "quiet", "end"))
        room = max((text_width(text) for text in labels), default=0.0)
        x = self.left - room - 20
        parts.append(label(x, self.top + self.height / 2, title, None, "middle", turn=True))
        return parts

    def curve(self, x: FloatArray, y: FloatArray, kind: str = "curve") -> Markup:
        """The line through (x, y)."""
        return path([(self.x(float(a)), self.y(float(b))) for a, b in zip(x, y, strict=True)], kind)

    def band(self, x: FloatArray, low: FloatArray, high: FloatArray, kind: str = "band") -> Markup:
        """The area between two curves over the same x."""
        there = [(self.x(float(a)), self.y(float(b))) for a, b in zip(x, low, strict=True)]
        back = [(self.x(float(a)), self.y(float(b))) for a, b in zip(x[::-1], high[::-1], strict=True)]
        return path(there + back, kind, closed=True)

    def bars(
        self, edges: FloatArray, heights: FloatArray, says: Sequence[str], kinds: Sequence[str]
    ) -> list[Markup]:
        """Bars from the lower end of the vertical range; heights (B,), edges (B + 1,)."""
        parts = []
        for index, height in enumerate(heights):
            left, right, top = (
                self.x(float(edges[index])),
                self.x(float(edges[index + 1])),
                self.y(float(height)),
            )
            width = max(right - left - 1, 0.5)
            parts.append(box(left, top, width, self.bottom - top, kinds[index], says[index]))
        return parts

    def colour_map(self, values: FloatArray, span: tuple[float, float], both_signs: bool) -> Markup:
        """A map of values (rows, columns) that fills the plot; row 0 lies at the bottom."""
        low, high = span
        share = (values - low) / (high - low) if high > low else np.zeros_like(values)
        indices: Bytes = np.rint(255 * np.clip(share, 0.0, 1.0)).astype(np.uint8)[::-1]
        return element(
            "image",
            x=self.left,
            y=self.top,
            width=self.width,
            height=self.height,
            preserveAspectRatio="none",
            href=data_address(png(indices, map_colours(both_signs))),
        )

    def colour_bar(self, span: tuple[float, float], both_signs: bool, title: str) -> list[Markup]:
        """The scale of a colour map, at the right of the plot."""
        bar = Frame(self.right + 16, self.top, 12, self.height, (0.0, 1.0), span)
        parts = [bar.colour_map(np.linspace(*span, 256)[:, None], span, both_signs)]
        values = ticks(*bar.y_range, wanted=5)
        labels = tick_labels(values)
        for value, text in zip(values, labels, strict=True):
            parts.append(segment(bar.right, bar.y(value), bar.right + 4, bar.y(value), "axis"))
            parts.append(label(bar.right + 7, bar.y(value) + 4, text, "quiet"))
        x = bar.right + 20 + max((text_width(text) for text in labels), default=0.0)
        parts.append(label(x, self.top + self.height / 2, title, None, "middle", turn=True))
        return parts


def labelled(name: str, units: str) -> str:
    """An axis title: the name with its unit, where it has one.

    >>> labelled("x", "mm"), labelled("share", "1")
    ('x (mm)', 'share')
    """
    return name if units in ("", "1") else f"{name} ({units})"
