"""Reads pages and drawings back, as a browser would."""

from __future__ import annotations

import xml.etree.ElementTree as ElementTree

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
