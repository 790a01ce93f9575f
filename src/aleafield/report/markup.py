"""Markup that is escaped unless it was built here: one element writer for HTML and SVG."""

from __future__ import annotations

import re
from collections.abc import Iterable

_FORBIDDEN = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")
"""Characters that XML 1.0 (section 2.2) does not admit, not even escaped."""

_WITHOUT_CONTENT = frozenset({"br", "circle", "image", "line", "meta", "path", "rect"})


class Markup(str):
    """Text that is markup already; every other string is data and is escaped when it enters an element."""

    __slots__ = ()


Content = str | Markup | None


def escaped(text: str) -> Markup:
    """Data as markup: the five special characters replaced, characters that XML forbids shown as U+FFFD.

    >>> escaped('a < "b" & c')
    'a &lt; &quot;b&quot; &amp; c'
    """
    if isinstance(text, Markup):
        return text
    text = _FORBIDDEN.sub("\ufffd", text)
    for character, entity in (("&", "&amp;"), ("<", "&lt;"), (">", "&gt;"), ('"', "&quot;"), ("'", "&#39;")):
        text = text.replace(character, entity)
    return Markup(text)


def joined(parts: Iterable[Content], between: str = "") -> Markup:
    """Parts one after another, data escaped, None left out."""
    return Markup(escaped(between).join(escaped(part) for part in parts if part is not None))


def number_text(value: float) -> str:
    """A coordinate with at most two decimals and nothing to spare.

    >>> number_text(12.0), number_text(0.3333), number_text(-0.0)
    ('12', '0.33', '0')
    """
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text in ("-0", "") else text


def element(name: str, /, *children: Content, **attributes: str | float | None) -> Markup:
    """One element with its attributes and children.

    Parameters
    ----------
    name : tag
    children : markup, or data that is escaped; None is left out
    attributes : values that are None are left out; a trailing underscore is dropped (``class_``), the other
        underscores become hyphens (``stroke_width``); numbers are written with two decimals at most
    """
    written = [name]
    for key, value in attributes.items():
        if value is None:
            continue
        text = value if isinstance(value, str) else number_text(value)
        written.append(f'{key.rstrip("_").replace("_", "-")}="{escaped(str(text))}"')
    head = " ".join(written)
    if name in _WITHOUT_CONTENT and not children:
        return Markup(f"<{head}/>")
    return Markup(f"<{head}>{joined(children)}</{name}>")
