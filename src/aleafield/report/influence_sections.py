"""The sections on the influence of the inputs: which one causes the spread, and what to measure next."""

from __future__ import annotations

from collections.abc import Sequence

from aleafield.report.blocks import said, shown
from aleafield.report.data import ReportData
from aleafield.report.figures import Figure
from aleafield.report.influence import Influence, Measurement, influences, measurements
from aleafield.report.influence_tables import index_table, measure_table, pair_table
from aleafield.report.influence_words import (
    fixing,
    leading,
    narrowing,
    noise_share,
    order,
    pinned,
    together,
    undetermined,
)
from aleafield.report.markup import Markup, element, joined
from aleafield.report.parts import SHAPLEY
from aleafield.report.tables import parts_table
from aleafield.report.verdict import confidence_text


def causes_section(data: ReportData, figures: Sequence[Figure]) -> Markup | None:
    """Which input causes the spread of each quantity; None where no index was asked."""
    found = influences(data.summary)
    if not found:
        return None
    parts: list[Markup] = [element("p", _note(data, found))]
    for influence in found:
        parts.append(element("h3", influence.quantity))
        parts.extend(_influence(influence, figures, confidence_text(data.summary)))
    parts.extend(shown(figure) for figure in figures if figure.section == "causes" and not _of(figure, found))
    return joined(parts)


def _of(figure: Figure, found: Sequence[Influence]) -> bool:
    return figure.quantity in {influence.quantity for influence in found}


def _note(data: ReportData, found: Sequence[Influence]) -> str:
    text = "An index is a share of the variance of a quantity."
    if any(SHAPLEY in influence.kinds for influence in found):
        text += " Shapley effects share out the whole variance, even where inputs depend on each other, and add up to 1"
        if data.model.dependence:
            text += (
                f", as here ({data.model.dependence}). First-order and total indices part the variance between "
                "independent inputs only: of dependent ones they would count twice, or not at all, what two cause "
                "together"
            )
        text += "."
    return text


def _influence(influence: Influence, figures: Sequence[Figure], confidence: str) -> list[Markup]:
    sentences = [
        leading(influence),
        order(influence, confidence),
        together(influence),
        noise_share(influence),
    ]
    texts = [
        text for text in (*sentences, *undetermined(influence), *map(_sentence, influence.notes)) if text
    ]
    drawn = [one for one in figures if one.section == "causes" and one.quantity == influence.quantity]
    name = influence.quantity
    details = element(
        "details",
        element("summary", f"Error parts of the indices of {name}"),
        parts_table(f"Error parts of the indices of {name} (shares of the variance)", influence.all()),
        *(element("p", f"{one.name}: {note}") for one in influence.all() for note in one.notes),
    )
    tables = (index_table(influence, confidence), pair_table(influence, confidence), details)
    return [
        *_paragraphs(texts),
        *(shown(figure) for figure in drawn),
        *(one for one in tables if one is not None),
    ]


def _paragraphs(texts: Sequence[str]) -> list[Markup]:
    """Sentences that begin a quantity, the first one set off."""
    return [said(text, None if number else "lead") for number, text in enumerate(texts)]


def _sentence(note: str) -> str:
    return f"{note[:1].upper()}{note[1:]}."


def next_section(data: ReportData, figures: Sequence[Figure]) -> Markup | None:
    """What measuring each input would bring; None where it was not asked."""
    found = measurements(data.summary)
    if not found:
        return None
    note = (
        "All standard deviations here are expected ones: on average over the values that a measurement may find. One "
        "value that is found may leave more."
    )
    parts: list[Markup] = [element("p", note)]
    for measurement in found:
        parts.append(element("h3", measurement.quantity))
        parts.extend(_measurement(measurement, figures, confidence_text(data.summary)))
    return joined(parts)


def _measurement(found: Measurement, figures: Sequence[Figure], confidence: str) -> list[Markup]:
    promises = [pinned(found, one) for one in found.sets]
    sentences = [*promises, narrowing(found), fixing(found)] if found.measures else promises
    texts = [text for text in (*sentences, *map(_sentence, found.notes)) if text]
    drawn = [one for one in figures if one.section == "next" and one.quantity == found.quantity]
    table = measure_table(found, confidence)
    return [
        *_paragraphs(texts),
        *(shown(figure) for figure in drawn),
        *([] if table is None else [table]),
    ]
