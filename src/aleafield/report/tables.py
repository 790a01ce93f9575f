"""The tables of a report as HTML; every number stands in the digits it earned."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from aleafield.report.data import Summary
from aleafield.report.findings import (
    FieldFindings,
    Finding,
    ObservedOrder,
    QuantityFindings,
    quantity_findings,
)
from aleafield.report.markup import Content, Markup, element
from aleafield.report.parts import PARTS, Part
from aleafield.report.rounding import DASH, short, typographic
from aleafield.report.svg import labelled
from aleafield.report.verdict import (
    confidence_text,
    half_width_text,
    interval_text,
    main_parts,
    runs_name,
    value_text,
)
from aleafield.units import Units


def table(caption: str, heads: Sequence[str], rows: Sequence[Sequence[Content]]) -> Markup:
    """A table whose first column names its rows; wider ones scroll by themselves."""
    head = element("tr", *(element("th", text, scope="col") for text in heads))
    body = (
        element("tr", element("th", row[0], scope="row"), *(element("td", cell) for cell in row[1:]))
        for row in rows
    )
    return element(
        "div",
        element(
            "table",
            element("caption", caption),
            element("thead", head),
            element("tbody", *body),
        ),
        class_="wide",
    )


def answers(summary: Summary) -> Markup:
    """One row per quantity: mean, interval, spread, and where the error comes from."""
    confidence = confidence_text(summary)
    rows = [
        (
            found.name,
            value_text(found.mean) if found.mean.value is not None else found.mean.reason or DASH,
            interval_text(found.mean),
            value_text(found.sd),
            DASH if found.occurs is None else value_text(found.occurs),
            main_parts(found.mean),
        )
        for found in quantity_findings(summary)
    ]
    heads = (
        "quantity",
        "mean",
        f"{confidence} interval",
        "standard deviation",
        "P(occurs)",
        "its error comes from",
    )
    return table("Mean and spread of every quantity", heads, rows)


def spread_table(findings: QuantityFindings, confidence: str) -> Markup:
    """Mean, standard deviation and quantiles of a quantity, with intervals and corrected values."""
    rows = [_row(found) for found in (findings.mean, findings.sd, *findings.quantiles.values())]
    heads = ("statistic", "value", f"{confidence} interval", "half-width", "biases subtracted")
    return table(f"How uncertain {findings.name} is", heads, rows)


def chance_table(findings: Sequence[QuantityFindings], confidence: str) -> Markup | None:
    """The probabilities of all quantities; None where none was asked."""
    rows: list[tuple[Content, ...]] = []
    for quantity in findings:
        found = [*quantity.exceed.values(), *([] if quantity.occurs is None else [quantity.occurs])]
        rows.extend((quantity.name, one.name, *_row(one)[1:4]) for one in found)
    if not rows:
        return None
    heads = ("quantity", "event", "probability", f"{confidence} interval", "half-width")
    return table("How likely it is", heads, rows)


def _row(found: Finding) -> tuple[Content, ...]:
    corrected = found.corrected
    correction: str = DASH
    if corrected is not None and corrected.value is not None:
        correction = f"{value_text(corrected)} ({interval_text(corrected)})"
    value: Content = value_text(found)
    if found.value is None and found.reason:
        value = element("span", found.reason, class_="reason")
    return (
        found.name,
        value,
        interval_text(found),
        half_width_text(found),
        correction,
    )


def variance_table(findings: Sequence[QuantityFindings], confidence: str) -> Markup | None:
    """The variance of every quantity by its causes; None where nothing was parted."""
    rows: list[tuple[Content, ...]] = []
    for quantity in findings:
        if quantity.variance is not None:
            rows.extend((quantity.name, *_row(one)[:4]) for one in quantity.variance.all())
    if not rows:
        return None
    heads = ("quantity", "variance", "value", f"{confidence} interval", "half-width")
    return table("Variance by its causes", heads, rows)


def field_table(findings: Sequence[FieldFindings], units: Units, confidence: str) -> Markup | None:
    """Variance and correlation length of the field by time; None without any."""
    if not findings:
        return None
    rows = [
        (short(found.time, 6), *_row(found.variance)[1:3], *_row(found.correlation_length)[1:3])
        for found in findings
    ]
    heads = (
        labelled("t", units.time),
        "variance",
        f"{confidence} interval (sampling)",
        "correlation length",
        f"{confidence} interval (sampling)",
    )
    return table("Variance and correlation length of the field", heads, rows)


def error_table(findings: QuantityFindings) -> Markup:
    """Every part of every statistic of a quantity in its own units."""
    return parts_table(
        f"Error parts of {findings.name} ({findings.units}; probabilities without unit)", findings.all()
    )


def parts_table(caption: str, findings: Iterable[Finding]) -> Markup:
    """Every part of the error of each finding; a dash where a part does not apply."""
    rows = []
    for found in findings:
        cells: list[Content] = [found.name]
        for part in PARTS:
            text = typographic(short(found.error.get(part.key), 2))
            small = text != DASH and not found.resolved(part)
            cells.append(element("span", text, class_="small") if small else text)
        cells.append(element("b", half_width_text(found)))
        rows.append(cells)
    return table(caption, ("statistic", *(part.name for part in PARTS), "total"), rows)


def order_table(findings: QuantityFindings, summary: Summary) -> Markup | None:
    """Observed and expected order of each part of the mean, and why; None where none was measured."""
    orders, parts = findings.mean.orders, summary["scheme"]["parts"]
    rows = []
    for part in PARTS:
        order = orders.get(part.key)
        if order is not None:
            seen = typographic(short(order.observed))
            expected = _expected(part, order, parts[part.key]["proven"])
            rows.append((part.name, seen, expected, short(order.factor), parts[part.key]["note"]))
    if not rows:
        return None
    heads = ("part", "observed order", "expected order", "factor", "why that order is expected")
    return table(f"Orders behind the parts of the mean of {findings.name}", heads, rows)


def _expected(part: Part, order: ObservedOrder, proven: bool) -> str:
    if part.known_factor:
        return "none: the factor is known"
    if order.expected is not None:
        return short(order.expected)
    return "beyond any power" if proven else "none proven"


def input_table(summary: Summary) -> Markup | None:
    """The uncertain inputs with their laws; None without any."""
    rows = [
        (
            path,
            element("code", entry["law"]),
            entry["units"],
            typographic(short(entry["mean"], 5)),
            typographic(short(entry["sd"], 4)),
        )
        for path, entry in summary["inputs"].items()
    ]
    return table("Uncertain inputs", ("input", "law", "unit", "mean", "sd"), rows) if rows else None


def failure_table(summary: Summary) -> Markup | None:
    """Failed samples, as far as they are listed, with their inputs; None without any."""
    failed = summary["failed"]
    failures = failed["list"]
    if not failures:
        return None
    paths = list(failures[0]["inputs"])
    repeated = summary["sampling"] is not None and summary["sampling"]["noise_repeats"] > 1
    rows = [
        (
            str(failure["sample"]),
            *((str(failure["repeat"]),) if repeated else ()),
            short(failure["time"], 4),
            *(typographic(short(failure["inputs"][path], 5)) for path in paths),
        )
        for failure in failures
    ]
    all_of_them = failed["listed"] == failed["count"]
    name = runs_name(summary)
    caption = f"Failed {name}" if all_of_them else f"The first {failed['listed']} failed {name}"
    heads = ("sample", *(("repeat",) if repeated else ()), "failed at t", *paths)
    return table(caption, heads, rows)
