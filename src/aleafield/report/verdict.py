"""Findings in sentences: the answer, its spread, and where its error comes from."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from aleafield.accounting.split import RESOLUTION
from aleafield.report.data import Summary
from aleafield.report.findings import Finding, QuantityFindings, with_units
from aleafield.report.rounding import DASH, percent, short, typographic


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


def half_width_text(found: Finding) -> str:
    """The half-width, "open above" or "open below" where an end is open, or a dash."""
    if found.open_side is not None:
        return f"open {found.open_side}"
    half_width = found.rounded.half_width
    return DASH if half_width is None else typographic(half_width)


def value_text(found: Finding) -> str:
    """The value to the digits it earned, with its unit; a dash where it is not determined."""
    if found.value is None:
        return DASH
    return with_units(typographic(found.rounded.value), found.units)


def listed(names: Sequence[str], most: int = 6) -> str:
    """Names in running text.

    >>> listed(["h", "s", "tau"]), listed(["h", "s", "tau"], 1)
    ('h, s and tau', 'h and 2 others')
    """
    if len(names) > most + 1:
        names = [*names[:most], f"{len(names) - most} others"]
    if len(names) == 1:
        return names[0]
    return f"{', '.join(names[:-1])} and {names[-1]}"


def from_surrogate(findings: Iterable[Finding]) -> list[Finding]:
    """Those of some findings that a surrogate gave."""
    return [one for one in findings if one.error.get("surrogate") is not None]


def surrogate_note(findings: QuantityFindings) -> str:
    """Which statistics of a quantity come from a surrogate; empty without one."""
    names = [one.name for one in from_surrogate(findings.all())]
    if not names:
        return ""
    return (
        f"Of {findings.name}, {listed(names, 20)} come from a surrogate of the solver (polynomial chaos); quantiles "
        "and probabilities are read off it by sampling it. What it may be wrong by is a part of their intervals."
    )


METHODS = {"monte carlo": "Monte Carlo", "quasi-monte carlo": "quasi-Monte Carlo"}
"""Sampling methods as running text writes them."""


def confidence_text(summary: Summary) -> str:
    """The confidence of all intervals, as in "95 %"."""
    return f"{100 * summary['confidence']:g} %"


def runs_name(summary: Summary) -> str:
    """What single runs are called: samples, or realizations where samples have several noise paths."""
    sampling = summary["sampling"]
    return "samples" if sampling is None or sampling["noise_repeats"] == 1 else "realizations"


def failed_text(summary: Summary) -> str:
    """How many runs failed, as in "2 samples failed"."""
    count, name = summary["failed"]["count"], runs_name(summary)
    return f"{count} {name.removesuffix('s') if count == 1 else name} failed"


def realizations_text(summary: Summary, times: str) -> str:
    """How many runs a sampled study has, as in "2048 samples x 4 noise paths".

    Parameters
    ----------
    summary : as in summary.json, with a sampling
    times : the sign between the numbers
    """
    sampling = summary["sampling"]
    samples, repeats = sampling["samples"], sampling["noise_repeats"]
    return f"{samples} samples" if repeats == 1 else f"{samples} samples {times} {repeats} noise paths"


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
    sentences, each = [], "sample" if findings.variance is None else "run"
    if findings.sd.value is not None:
        sentences.append(
            f"From {each} to {each} it varies with a standard deviation of {value_text(findings.sd)}."
        )
    known = [(float(key), found) for key, found in findings.quantiles.items() if found.value is not None]
    if len(known) > 1:
        (low, least), (high, most) = min(known, key=lambda k: k[0]), max(known, key=lambda k: k[0])
        sentences.append(
            f"{percent(high - low)} of {each}s lie between {value_text(least)} and {value_text(most)}."
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
    if found.open_side is not None:
        size = with_units(short(found.reach, 2), found.units)
        return (
            f"The {found.name} of {quantity} is bounded on one side only: nothing bounds how far "
            f"{found.open_side} {value_text(found)} the truth lies. {percent(share)} of the other "
            f"side ({typographic(size)}) comes from {part.name}."
        )
    verb = "comes" if share > 0.5 else "comes, as the largest share,"
    half_width = found.rounded.half_width
    assert half_width is not None
    size = with_units(typographic(half_width), found.units)
    whole = f"the half-width ({size}) of the {found.name} of {quantity}"
    return f"{percent(share)} of {whole} {verb} from {part.name}."


OPEN_END = (
    "what the path does between the ends of its steps is not seen, and no order bounds what is missed; a "
    "smaller time_step misses less. Maxima, minima and first passages of a value, a mean or an integral follow "
    "the exact law inside the steps and have both ends"
)
"""What can be done about an open end."""


def remedies(found: Finding) -> list[str]:
    """What would shrink the error of a finding: an open end first, then by part, largest share first.

    Parts below a tenth are left out.
    """
    shares = sorted(found.shares().items(), key=lambda item: -item[1])
    large = [
        f"{part.name} ({percent(share)}): {part.remedy}" for part, share in shares if share >= RESOLUTION
    ]
    return large if found.open_side is None else [f"open {found.open_side}: {OPEN_END}", *large]


def main_parts(found: Finding) -> str:
    """The parts that make a tenth of the half-width or more, as in "sampling 54 %, space 34 %".

    An open end comes first, as in "open above; below: sampling 54 %, space 34 %".
    """
    shares = sorted(found.shares().items(), key=lambda item: -item[1])
    large = [f"{part.name} {percent(share)}" for part, share in shares if share >= RESOLUTION]
    if found.open_side is not None:
        other = "below" if found.open_side == "above" else "above"
        return f"open {found.open_side}; {other}: {', '.join(large) or 'no error part applies'}"
    if large:
        return ", ".join(large)
    return "no error part applies" if found.total == 0 else DASH
