"""The report: one HTML file that holds everything it shows."""

from __future__ import annotations

from collections.abc import Sequence

from aleafield.report.blocks import said, shown
from aleafield.report.caution import CAUTION
from aleafield.report.data import ReportData
from aleafield.report.figures import Figure
from aleafield.report.findings import QuantityFindings, field_findings, quantity_findings
from aleafield.report.influence_sections import causes_section, next_section
from aleafield.report.look import SCRIPT, style_sheet
from aleafield.report.markup import Content, Markup, element, joined
from aleafield.report.methods import methods
from aleafield.report.parting import consequence, parting
from aleafield.report.rounding import DASH, percent, short, typographic
from aleafield.report.tables import (
    chance_table,
    error_table,
    failure_table,
    field_table,
    input_table,
    order_table,
    spread_table,
    variance_table,
)
from aleafield.report.verdict import (
    METHODS,
    answer,
    cause,
    confidence_text,
    exceedance,
    failed_text,
    from_surrogate,
    interval_text,
    occurrence,
    realizations_text,
    remedies,
    runs_name,
    spread,
    surrogate_note,
)

SECTIONS: tuple[tuple[str, str], ...] = (
    ("answers", "The answers"),
    ("spread", "How uncertain"),
    ("chances", "Chance of exceeding"),
    ("noise", "Noise or ignorance"),
    ("causes", "Which input causes it"),
    ("next", "What to measure next"),
    ("error", "Where the error comes from"),
    ("time", "Over time"),
    ("field", "The field"),
    ("distributions", "Distributions"),
    ("inputs", "Inputs"),
    ("failures", "Failures and warnings"),
    ("methods", "Methods"),
    ("study", "The study"),
)
"""Identifier and heading of every section, in order.

"noise" and "time" stand for noisy fields only, "causes" and "next" where the study asks for them.
"""


def page(data: ReportData, figures: Sequence[Figure]) -> str:
    """The whole page; it refers to nothing outside itself and can be read with scripts switched off.

    Parameters
    ----------
    data : ReportData
    figures : of `report_figures`
    """
    findings = quantity_findings(data.summary)
    contents: dict[str, Markup | None] = {
        "answers": _answers(data, findings),
        "spread": _spread(data, findings),
        "chances": _chances(data, findings),
        "causes": causes_section(data, figures),
        "next": next_section(data, figures),
        "error": _error(data, figures, findings),
        "field": _field(data, figures),
        "distributions": _distributions(figures),
        "inputs": _inputs(data, figures),
        "failures": _failures(data),
        "methods": _methods(data),
        "study": element("pre", element("code", data.study_text)),
    }
    if data.model.noise is not None:
        contents |= {"noise": _noise(data, figures, findings), "time": _over_time(figures)}
    present = [(name, heading) for name, heading in SECTIONS if contents.get(name) is not None]
    sections = (
        element("section", element("h2", heading), contents[name], id=name) for name, heading in present
    )
    caution = element("aside", element("p", element("b", "Caution")), element("p", CAUTION), class_="caution")
    head = element(
        "head",
        element("meta", charset="utf-8"),
        element("meta", name="viewport", content="width=device-width, initial-scale=1"),
        element("title", data.title),
        element("style", Markup(style_sheet())),
    )
    body = element(
        "body", _header(data, present), element("main", *sections, caution), element("script", Markup(SCRIPT))
    )
    return f"<!doctype html>\n{element('html', head, body, lang='en')}\n"


def _header(data: ReportData, sections: Sequence[tuple[str, str]]) -> Markup:
    links = (element("a", heading, href=f"#{name}") for name, heading in sections)
    return element(
        "header",
        element("h1", data.title),
        element("p", data.about, class_="about") if data.about else None,
        element("ul", *(element("li", text, class_=kind) for text, kind in _facts(data)), class_="facts"),
        element("nav", joined(links, " ")),
    )


def _facts(data: ReportData) -> list[tuple[str, str | None]]:
    """The run in a few words, each with its style."""
    summary = data.summary
    sampling, cost, aim = summary["sampling"], summary["cost"], summary["aim"]
    facts: list[tuple[str, str | None]] = []
    if sampling is None:
        facts.append(("one run, no uncertain inputs", None))
    else:
        count = realizations_text(summary, "\N{MULTIPLICATION SIGN}")
        facts.append((f"{count}, {METHODS[sampling['method']]}", None))
        facts.append((f"{len(summary['inputs']) or 'no'} uncertain inputs", None))
        if sampling.get("asked") == "polynomial chaos":
            found = quantity_findings(summary)
            accepted = sum(bool(from_surrogate(one.all())) for one in found)
            told = f"accepted for {accepted} of {len(found)} quantities" if accepted else "refused"
            facts.append((f"polynomial chaos: {told}", None if accepted == len(found) else "bad"))
    facts.append((f"intervals at {confidence_text(summary)} confidence", None))
    facts.append((f"computed in {short(cost['measured_s'])} s", None))
    facts.append((f"{percent(cost['split_share'])} of the work for the error split", None))
    if summary["failed"]["count"]:
        facts.append((failed_text(summary), "bad"))
    if aim is not None:
        outcome, kind = ("met", "good") if aim["met"] else ("missed", "bad")
        facts.append((f"aim of {aim['tolerance']} on {aim['quantity']}: {outcome}", kind))
    return facts


def _answers(data: ReportData, findings: Sequence[QuantityFindings]) -> Markup:
    confidence = confidence_text(data.summary)
    cards = element("div", *(_card(data, found, confidence) for found in findings), class_="cards")
    aim = data.summary["aim"]
    if aim is None:
        return cards
    outcome = "is met" if aim["met"] else "is missed"
    return joined((cards, said(f"The aim of the study {outcome}: {aim['reason']}.", "aim")))


def _card(data: ReportData, found: QuantityFindings, confidence: str) -> Markup:
    mean, measure = found.mean, data.measures.get(found.name)
    name = f"mean of {found.name}" + (f" ({measure})" if measure and measure != found.name else "")
    unit = None if found.units == "1" or mean.value is None else element("small", f" {found.units}")
    big = joined((DASH if mean.value is None else typographic(mean.rounded.value), unit))
    return element(
        "article",
        element("h3", name),
        element("p", big, class_="big"),
        said(f"{confidence} interval: {interval_text(mean)}", "range"),
        said(answer(found, confidence)),
        *(
            said(text)
            for text in (occurrence(found), exceedance(found), spread(found), parting(found))
            if text
        ),
        class_="card",
    )


def _spread(data: ReportData, findings: Sequence[QuantityFindings]) -> Markup:
    confidence = confidence_text(data.summary)
    note = (
        "Values are written to the digits that their half-width leaves; ends of intervals are rounded "
        "outwards. The spread (standard deviation, quantiles) is a property of the model, its inputs and its "
        "noise and does not shrink with more samples; the intervals do."
    )
    notes = (said(text) for found in findings if (text := surrogate_note(found)))
    return joined((element("p", note), *notes, *(spread_table(found, confidence) for found in findings)))


def _chances(data: ReportData, findings: Sequence[QuantityFindings]) -> Markup:
    found = chance_table(findings, confidence_text(data.summary))
    if found is None:
        return element("p", "The study asks for no level to exceed ([report] exceed).")
    note = "A quantity exceeds a level where it occurs and lies above it."
    return joined((element("p", note), found))


def _noise(data: ReportData, figures: Sequence[Figure], findings: Sequence[QuantityFindings]) -> Markup:
    note = (
        "A quantity varies because the inputs are not known, and because the tissue is noisy. The first part would "
        "go if the inputs were measured; the second is the mean variance between runs with the same inputs, and "
        "stays."
    )
    parted = (said(f"{parting(found)} {consequence(found)}".strip(), "lead") for found in findings)
    drawn = (shown(figure) for figure in figures if figure.section == "noise")
    return joined(
        (element("p", note), *parted, *drawn, variance_table(findings, confidence_text(data.summary)))
    )


def _over_time(figures: Sequence[Figure]) -> Markup:
    drawn = [shown(figure) for figure in figures if figure.section == "time"]
    if not drawn:
        return element("p", "No quantity of this study is one number of the field at a time.")
    return element("div", *drawn, class_="pair")


def _error(data: ReportData, figures: Sequence[Figure], findings: Sequence[QuantityFindings]) -> Markup:
    drawn = {figure.quantity: figure for figure in figures if figure.section == "error"}
    parts: list[Content] = []
    for found in findings:
        parts.append(element("h3", found.name))
        parts.append(said(cause(found.name, found.mean), "lead"))
        shrink = remedies(found.mean)
        if shrink:
            parts.append(element("p", "What would shrink it:"))
            parts.append(element("ul", *(element("li", text) for text in shrink)))
        if found.name in drawn:
            parts.append(shown(drawn[found.name]))
        parts.append(
            element(
                "details",
                element("summary", f"Table of the error parts of {found.name}"),
                error_table(found),
                element("p", "Quiet numbers are below a tenth of their total: bounded only as parts of it."),
                order_table(found, data.summary),
                *(element("p", f"{one.name}: {note}") for one in found.all() for note in one.notes),
            )
        )
    return joined(parts)


def _field(data: ReportData, figures: Sequence[Figure]) -> Markup:
    found = field_table(field_findings(data.summary, data.units), data.units, confidence_text(data.summary))
    drawn = [shown(figure) for figure in figures if figure.section == "field"]
    pictures = (
        element("div", *drawn, class_="pair")
        if drawn
        else element("p", "The mean or the spread of the field is not finite: nothing can be drawn.")
    )
    if found is None:
        return pictures
    note = (
        "The variance is that of u over all runs, averaged over the domain. The correlation length is the distance "
        "at which the correlation of u at two points has fallen to 1/e."
    )
    return joined((pictures, element("p", note), found))


def _distributions(figures: Sequence[Figure]) -> Markup:
    drawn = [shown(figure) for figure in figures if figure.section == "distribution"]
    return joined(drawn) if drawn else element("p", "No quantity has a stored value.")


def _inputs(data: ReportData, figures: Sequence[Figure]) -> Markup:
    found = input_table(data.summary)
    if found is None:
        return element("p", "No input is uncertain.")
    joint = said(f"They depend on one another: {data.model.dependence}.") if data.model.dependence else None
    return joined((found, joint, *(shown(figure) for figure in figures if figure.section == "inputs")))


def _failures(data: ReportData) -> Markup:
    summary = data.summary
    failed, warnings = summary["failed"], summary["warnings"]
    reasons = ", ".join(f"{count} {reason.replace('_', ' ')}" for reason, count in failed["reasons"].items())
    sampling = summary["sampling"]
    of = "" if sampling is None else f" of {sampling['samples'] * sampling['noise_repeats']}"
    text = (
        f"{failed['count']}{of} {runs_name(summary)} failed ({reasons or DASH}); statistics are over the others."
        if failed["count"]
        else f"No {runs_name(summary).removesuffix('s')} failed."
    )
    listed = (
        element("ul", *(element("li", warning) for warning in warnings), class_="warn")
        if warnings
        else element("p", "No warnings.")
    )
    return joined((element("p", text), failure_table(summary), listed))


def _methods(data: ReportData) -> Markup:
    found = methods(data)
    texts = (element("p", element("b", f"{heading}. "), text) for heading, text in found.paragraphs)
    sources = (element("li", source) for source in found.sources)
    return element("div", *texts, element("h3", "Sources"), element("ol", *sources), class_="methods")
