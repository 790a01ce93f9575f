"""Tables of the influence of the inputs: indices, pairs, and what to measure next."""

from __future__ import annotations

from aleafield.report.findings import Finding
from aleafield.report.influence import Influence, Measurement
from aleafield.report.influence_words import with_interval
from aleafield.report.markup import Content, Markup, element
from aleafield.report.parts import TOTAL
from aleafield.report.rounding import DASH
from aleafield.report.tables import table
from aleafield.report.verdict import half_width_text, interval_text, main_parts, value_text


def index_table(influence: Influence, confidence: str) -> Markup:
    """All indices of single inputs with their intervals, and where the error of the ruling ones comes from."""
    kinds, ruling = influence.kinds, influence.ruling
    rows: list[tuple[Content, ...]] = [
        (
            one.path,
            *(_cell(one.indices.get(kind)) for kind in kinds),
            *(
                ()
                if ruling is None
                else (main_parts(one.indices[ruling]) if ruling in one.indices else DASH,)
            ),
        )
        for one in influence.inputs
    ]
    if influence.noise is not None and TOTAL in kinds:
        cells = (_cell(influence.noise if kind is TOTAL else None) for kind in kinds)
        rows.append(("noise", *cells, *(() if ruling is None else (main_parts(influence.noise),))))
    heads = [f"{kind.name} ({confidence} interval)" for kind in kinds]
    if ruling is not None:
        heads.append(f"where the error comes from ({ruling.name})")
    return table(f"Indices of {influence.quantity}", ("input", *heads), rows)


def pair_table(influence: Influence, confidence: str) -> Markup | None:
    """The second-order indices, largest first; None where none was asked."""
    if not influence.pairs:
        return None
    rows = [
        (
            f"{pair.first} with {pair.other}",
            _reason(pair.index) or value_text(pair.index),
            interval_text(pair.index),
            half_width_text(pair.index),
        )
        for pair in influence.pairs
    ]
    heads = ("pair", "second order", f"{confidence} interval", "half-width")
    return table(f"Pairs of inputs that act together on {influence.quantity}", heads, rows)


def measure_table(found: Measurement, confidence: str) -> Markup | None:
    """What stays of the spread once each input is known better; None where no input is listed."""
    if not found.measures:
        return None
    rows = [
        (
            one.path,
            _cell(one.known),
            _cell(one.halved),
            DASH if one.may_be_fixed is None else "yes" if one.may_be_fixed else "no",
        )
        for one in found.measures
    ]
    heads = (
        "input",
        f"sd when known exactly ({confidence} interval)",
        f"sd when its spread is halved ({confidence} interval)",
        "may be fixed",
    )
    return table(f"What to measure next for {found.quantity}", heads, rows)


def _cell(found: Finding | None) -> Content:
    return DASH if found is None else _reason(found) or with_interval(found)


def _reason(found: Finding) -> Markup | None:
    """Why a value is missing, as the page sets reasons; None where there is one or nothing to say."""
    if found.value is not None or not found.reason:
        return None
    return element("span", found.reason, class_="reason")
