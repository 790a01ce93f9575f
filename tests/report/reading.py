"""Reads pages and drawings back, as a browser would."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ElementTree

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.report.svg import Drawing

SVG = "{http://www.w3.org/2000/svg}"


def page_tree(text: str) -> ElementTree.Element:
    """The elements of a page; raises ParseError where tags do not match or data is not escaped."""
    head = "<!doctype html>\n"
    assert text.startswith(head)
    return ElementTree.fromstring(text.removeprefix(head))


def words(element: ElementTree.Element) -> str:
    """All text within an element, white space collapsed."""
    return " ".join("".join(element.itertext()).split())


def section(tree: ElementTree.Element, name: str) -> ElementTree.Element:
    """The section of a page with that identifier."""
    found = tree.find(f".//section[@id='{name}']")
    assert found is not None
    return found


def rows(tree: ElementTree.Element, caption: str) -> list[list[str]]:
    """Cells of the table with that caption, without its heads."""
    for table in tree.iter("table"):
        if words(table.find("caption")) == caption:  # type: ignore[arg-type]
            return [[words(cell) for cell in row] for row in table.iterfind("tbody/tr")]
    raise AssertionError(f"no table {caption!r}")


def number(text: str) -> float:
    """A number as the page writes it."""
    return float(
        text.replace("\N{MINUS SIGN}", "-")
        .replace(" \N{MULTIPLICATION SIGN} 10", "e")
        .translate(str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789"))
    )


def read_back(drawing: Drawing | None) -> ElementTree.Element:
    """The elements of a drawing, read back from its file."""
    assert drawing is not None
    return ElementTree.fromstring(drawing.document())


def axis_of(root: ElementTree.Element, anchor: str, along: str) -> tuple[float, float]:
    """Offset and slope of the lowest axis, px against its numbers."""
    marks = [
        (number(words(t)), float(t.get(along) or 0), float(t.get("y") or 0))
        for t in root.iter(f"{SVG}text")
        if t.get("text-anchor") == anchor and re.fullmatch("[\N{MINUS SIGN}0-9.]+", words(t))
    ]
    values, places, _ = np.array(
        [m for m in marks if anchor != "middle" or m[2] == max(y for *_, y in marks)]
    ).T
    slope, offset = np.polyfit(values, places, 1)
    return float(offset), float(slope)


def cloud_places(path: ElementTree.Element) -> FloatArray:
    """Places of the dots of a cloud in px, from its relative steps."""
    steps = re.findall(r"m(-?\d+) ?(-?\d+)h0", path.get("d") or "")
    assert "".join(f"m{a}{b if b.startswith('-') else ' ' + b}h0" for a, b in steps) == path.get("d")
    left, top, scale = (float(n) for n in re.findall(r"[0-9.]+", path.get("transform") or ""))
    found: FloatArray = np.cumsum(np.array(steps, dtype=np.int64), axis=0) * scale + [left, top]
    return found
