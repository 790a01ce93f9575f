"""Findings in sentences: the answer, its spread, and where its error comes from."""

from __future__ import annotations

from aleafield.accounting.split import RESOLUTION
from aleafield.report.data import Summary
from aleafield.report.findings import Finding, QuantityFindings, with_units
from aleafield.report.rounding import DASH, percent, typographic


def interval_text(found: Finding) -> str:
    """The interval in words, as in "3.11 to 3.17 mm", "at least 3.11 mm", or a dash."""
    rounded = found.rounded
    if rounded.low is not None and rounded.high is not None:
        return with_units(f"{typographic(rounded.low)} to {typographic(rounded.high)}", found.units)
    if rounded.low is not None:
        return f"at least {with_units(typographic(rounded.low), found.units)}"
    if rounded.high is not None:
        return f"at most {with_units(typographic(rounded.high), found.units)}"
    return DASH


def value_text(found: Finding) -> str:
    """The value to the digits it earned, with its unit; a dash where it is not determined."""
    if found.value is None:
        return DASH
    return with_units(typographic(found.rounded.value), found.units)


METHODS = {"monte carlo": "Monte Carlo", "quasi-monte carlo": "quasi-Monte Carlo"}
"""Sampling methods as running text writes them."""


def confidence_text(summary: Summary) -> str:
    """The confidence of all intervals, as in "95 %"."""
    return f"{100 * summary['confidence']:g} %"


def answer(findings: QuantityFindings, confidence: str) -> str:
    """The mean with its interval and units, in one sentence."""
    mean = findings.mean
    condition = "" if findings.occurs is None else ", where it occurs,"
    if mean.value is None:
        return (
            f"The mean of {findings.name}{condition} is not determined: {mean.reason or 'no reason given'}."
        )
    value = value_text(mean)
    return (
        f"The mean of {findings.name}{condition} is {value}; with {confidence} confidence it {_within(mean)}."
    )


def _within(found: Finding) -> str:
    rounded = found.rounded
    if rounded.low is not None and rounded.high is not None:
        between = f"{typographic(rounded.low)} and {typographic(rounded.high)}"
        return f"lies between {with_units(between, found.units)}"
    return f"is {interval_text(found)}"


def spread(findings: QuantityFindings) -> str:
    """How far samples differ: standard deviation and the outermost quantiles; empty where there is nothing to say."""
    if findings.sd.value == 0.0:
        return ""
    sentences = []
    if findings.sd.value is not None:
        sentences.append(
            f"From sample to sample it varies with a standard deviation of {value_text(findings.sd)}."
        )
    known = [(float(key), found) for key, found in findings.quantiles.items() if found.value is not None]
    if len(known) > 1:
        (low, least), (high, most) = min(known, key=lambda k: k[0]), max(known, key=lambda k: k[0])
        sentences.append(
            f"{percent(high - low)} of samples lie between {value_text(least)} and {value_text(most)}."
        )
    return " ".join(sentences)


def exceedance(findings: QuantityFindings) -> str:
    """How likely each level that was asked for is exceeded; empty where none was."""
    found = [one for one in findings.exceed.values() if one.value is not None]
    return " ".join(f"{one.name} is {value_text(one)} ({interval_text(one)})." for one in found)


def occurrence(findings: QuantityFindings) -> str:
    """How likely the quantity has a value at all; empty for one that always has."""
    found = findings.occurs
    if found is None:
        return ""
    if found.value is None:
        return f"The probability that it occurs is not determined: {found.reason}."
    return f"It occurs with probability {value_text(found)} ({interval_text(found)})."


def cause(quantity: str, found: Finding) -> str:
    """Which part rules the error of a finding."""
    main = found.main_part()
    if main is None:
        if found.total == 0:
            return f"The {found.name} of {quantity} carries no error: no part of the split applies."
        return f"The error of the {found.name} of {quantity} is not determined: {found.reason or 'no total'}."
    part, share = main
    verb = "comes" if share > 0.5 else "comes, as the largest share,"
    half_width = found.rounded.half_width
    assert half_width is not None
    size = with_units(typographic(half_width), found.units)
    whole = f"the half-width ({size}) of the {found.name} of {quantity}"
    return f"{percent(share)} of {whole} {verb} from {part.name}."


def remedies(found: Finding) -> list[str]:
    """What would shrink the error of a finding, by part, largest share first; parts below a tenth are left "
    "out."""
    shares = sorted(found.shares().items(), key=lambda item: -item[1])
    return [f"{part.name} ({percent(share)}): {part.remedy}" for part, share in shares if share >= RESOLUTION]


def main_parts(found: Finding) -> str:
    """The parts that make a tenth of the half-width or more, as in "sampling 54 %, space 34 %"."""
    shares = sorted(found.shares().items(), key=lambda item: -item[1])
    large = [f"{part.name} {percent(share)}" for part, share in shares if share >= RESOLUTION]
    if large:
        return ", ".join(large)
    return "no error part applies" if found.total == 0 else DASH
