"""The result of a run as lines for a terminal."""

from __future__ import annotations

from collections.abc import Sequence

from aleafield.report.data import Summary
from aleafield.report.findings import Finding, QuantityFindings, quantity_findings, with_units
from aleafield.report.influence import Influence, Measurement, influences, measurements
from aleafield.report.influence_words import pinned, undetermined
from aleafield.report.parting import per_cent
from aleafield.report.parts import PARTS, Part
from aleafield.report.rounding import DASH, percent
from aleafield.report.verdict import METHODS, confidence_text, main_parts, realizations_text

_BAR = 20
_MOST_INPUTS = 8
_COLOURS = {
    "space": "34",
    "quadrature": "96",
    "time": "32",
    "noise_modes": "33",
    "surrogate": "35",
    "bias_noise": "90",
    "sampling": "91",
}


def result_lines(summary: Summary, files: Sequence[str] = (), colour: bool = False) -> list[str]:
    """The table of a run and the lines below it.

    Parameters
    ----------
    summary : as in summary.json
    files : names of what the run left
    colour : whether escape sequences may be used; False on anything but a terminal and where NO_COLOR is set

    Returns
    -------
    lines : quantity, mean and interval, spread, where the error comes from; then quantiles, exceedance,
        occurrence, the causes of variance, indices of the inputs and what to pin down, failures, warnings, files
    """
    findings = quantity_findings(summary)
    heads = ("quantity", f"mean and {confidence_text(summary)} interval", "spread (sd)", "error comes from")
    rows = [(found.name, _estimate(found.mean), _spread(found.sd), _cause(found.mean)) for found in findings]
    bars = [_bar(found.mean) for found in findings] if colour else None
    lines = _aligned([heads, *rows], bars)
    if colour:
        lines[0] = f"\x1b[1m{lines[0]}\x1b[0m"
    for found in findings:
        details = _details(found)
        if details:
            lines += ["", found.name, *_aligned(details, None, indent="  ")]
    causes = _causes(findings)
    if causes:
        lines += ["", *causes]
    for block in (*map(_influence, influences(summary)), *map(_promises, measurements(summary))):
        lines += ["", *block] if block else []
    lines.append("")
    lines += _closing(summary)
    if files:
        lines.append("files: " + ", ".join(files))
    return lines


def _estimate(found: Finding) -> str:
    """Value, unit and interval on one line, or why there is none; "at least" and "at most" for an open end."""
    if found.value is None:
        return found.reason or "-"
    rounded = found.rounded
    value = with_units(rounded.value, found.units)
    if rounded.low is not None and rounded.high is not None:
        return f"{value} [{rounded.low}, {rounded.high}]"
    if rounded.low is not None:
        return f"{value}, at least {rounded.low}"
    return value if rounded.high is None else f"{value}, at most {rounded.high}"


def _spread(found: Finding) -> str:
    return "-" if found.value is None else with_units(found.rounded.value, found.units)


def _cause(found: Finding) -> str:
    return main_parts(found).replace(DASH, "-")


def _details(found: QuantityFindings) -> list[tuple[str, ...]]:
    rest = [*found.quantiles.values(), *found.exceed.values()]
    if found.occurs is not None:
        rest.append(found.occurs)
    return [(one.name, _estimate(one), _cause(one)) for one in rest]


def _causes(findings: Sequence[QuantityFindings]) -> list[str]:
    """The block on the causes of variance; empty without noise."""
    rows: list[tuple[str, ...]] = []
    unknown: dict[str, list[str]] = {}
    for found in findings:
        variance = found.variance
        if variance is None:
            continue
        if variance.share is not None and variance.share.value is None:
            unknown.setdefault(variance.share.reason, []).append(found.name)
            continue
        share = "0 % (no uncertain inputs)" if variance.share is None else per_cent(variance.share)
        rows.append((found.name, _estimate(variance.total), _estimate(variance.noise), share))
    heads = ("noise or ignorance", "variance", "of which noise", "share of the parameters")
    lines = _aligned([heads, *rows], None) if rows else []
    return lines + [f"noise or ignorance of {', '.join(names)}: {why}" for why, names in unknown.items()]


def _influence(found: Influence) -> list[str]:
    """The most important inputs of a quantity with their indices, or why there are none."""
    why = [text for text in undetermined(found) if text]
    kinds = found.stated
    if not kinds:
        return why
    shown = found.inputs[:_MOST_INPUTS]
    rows = [
        (one.path, *(_index(one.indices[kind]) if kind in one.indices else "-" for kind in kinds))
        for one in shown
    ]
    if found.noise is not None:
        rows.append(("noise, total", _index(found.noise), *("" for _ in kinds[1:])))
    lines = _aligned([(f"causes of {found.quantity}", *(kind.name for kind in kinds)), *rows], None)
    rest = len(found.inputs) - len(shown)
    return [*lines, *([f"and {rest} less important inputs"] if rest else []), *why]


def _index(found: Finding) -> str:
    return "-" if found.value is None else _estimate(found)


def _promises(found: Measurement) -> list[str]:
    return [pinned(found, one, written=str) for one in found.sets]


def _closing(summary: Summary) -> list[str]:
    lines = []
    failed, sampling, cost = summary["failed"], summary["sampling"], summary["cost"]
    if sampling is not None:
        count = realizations_text(summary, "x")
        lines.append(f"{count} ({METHODS[sampling['method']]}), {failed['count']} failed")
    elif failed["count"]:
        lines.append("the run failed: a value was not finite")
    share = percent(cost["split_share"])
    lines.append(f"computed in {cost['measured_s']:.3g} s, {share} of the work for the error split")
    aim = summary["aim"]
    if aim is not None:
        lines.append(f"aim {'met' if aim['met'] else 'MISSED'}: {aim['reason']}")
    lines += [f"warning: {warning}" for warning in summary["warnings"]]
    return lines


def _aligned(rows: Sequence[tuple[str, ...]], bars: Sequence[str] | None, indent: str = "") -> list[str]:
    """Columns padded to their widest cell, two spaces apart; bars stand before the last column."""
    widths = [max(len(row[column]) for row in rows) for column in range(len(rows[0]) - 1)]
    lines = []
    for number, row in enumerate(rows):
        cells = [cell.ljust(width) for cell, width in zip(row, widths, strict=False)]
        if bars is not None:
            cells.append(" " * _BAR if number == 0 else bars[number - 1])
        lines.append((indent + "  ".join([*cells, row[-1]])).rstrip())
    return lines


def _bar(found: Finding) -> str:
    """The shares as coloured blocks, `_BAR` wide."""
    shares = found.shares()
    if not shares:
        return " " * _BAR
    text, reached, drawn = "", 0.0, 0
    for part in PARTS:
        reached += shares.get(part, 0.0)
        blocks = round(_BAR * reached) - drawn
        drawn += blocks
        text += _painted(part, "\N{FULL BLOCK}" * blocks)
    return text + " " * (_BAR - drawn)


def _painted(part: Part, text: str) -> str:
    return f"\x1b[{_COLOURS[part.key]}m{text}\x1b[0m" if text else ""
