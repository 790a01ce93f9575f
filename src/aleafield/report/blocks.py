"""Blocks of a page that several sections use: a paragraph and a figure with its caption."""

from __future__ import annotations

from aleafield.report.figures import Figure
from aleafield.report.markup import Markup, element, joined


def said(text: str, kind: str | None = None) -> Markup:
    """A paragraph whose numbers stay on one line with their per cent sign or power of ten."""
    for mark in ("%", "\N{MULTIPLICATION SIGN} 10"):
        text = text.replace(f" {mark}", f"\N{NO-BREAK SPACE}{mark.replace(' ', chr(160))}")
    return element("p", text, class_=kind)


def shown(figure: Figure) -> Markup:
    """A figure with its title and caption."""
    caption = joined((element("b", f"{figure.drawing.title}. "), figure.caption))
    return element("figure", figure.drawing.inline(), element("figcaption", caption))
