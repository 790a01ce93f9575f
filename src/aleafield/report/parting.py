"""Noise or ignorance: the parting of a quantity's variance in sentences."""

from __future__ import annotations

import math
from decimal import Decimal

from aleafield.report.findings import Finding, QuantityFindings, with_units
from aleafield.report.rounding import DASH, earned, typographic
from aleafield.report.verdict import value_text


def parting(findings: QuantityFindings) -> str:
    """What of a quantity's variance comes from the parameters and what from noise; empty without noise."""
    variance, name = findings.variance, findings.name
    if variance is None:
        return ""
    if variance.share is None:
        whole = "" if variance.total.value is None else f" ({value_text(variance.total)})"
        return f"No input is uncertain: all of the variance of {name}{whole} is noise."
    if variance.share.value is None:
        return (
            f"How the variance of {name} divides into noise and ignorance of the parameters is not determined: "
            f"{variance.share.reason or 'no reason given'}."
        )
    high = _scaled(variance.share)[2]
    if variance.share.value == 0.0 and high is not None:
        return f"No variance of {name} is seen to come from the parameters, and at most {high} % of it can."
    return f"About {per_cent(variance.share)} of the variance of {name} comes from the parameters, the rest from noise."


def consequence(findings: QuantityFindings) -> str:
    """What measuring the parameters could remove, and what noise leaves; empty where that is not known."""
    variance = findings.variance
    if variance is None or variance.share is None or variance.share.value is None:
        return ""
    gain = "hardly narrows it" if variance.share.value == 0.0 else "can remove at most that much"
    left = _root(variance.noise, findings.units)
    rest = f"; noise alone leaves a standard deviation of {left}" if left else ""
    return f"Measuring the parameters better {gain}{rest}."


def per_cent(share: Finding) -> str:
    """A share with its interval, as in "62 % (51 % to 71 %)"; ends rounded outwards; a dash if unknown."""
    value, low, high = _scaled(share)
    if value is None:
        return DASH
    if low is None and high is None:
        return f"{value} %"
    if low is None or high is None:
        return f"{value} % ({f'at most {high}' if low is None else f'at least {low}'} %)"
    return f"{value} % ({low} % to {high} %)"


def _scaled(share: Finding) -> tuple[str | None, str | None, str | None]:
    """Value, low and high of a share in per cent, to the digits that they earned."""
    rounded = share.rounded
    texts = (None if share.value is None else rounded.value, rounded.low, rounded.high)
    value, low, high = (None if text is None else f"{Decimal(text).scaleb(2):f}" for text in texts)
    return value, low, high


def _root(variance: Finding, units: str) -> str:
    """The standard deviation of a variance with its unit; empty where it is not known."""
    if variance.value is None:
        return ""
    low, high = (None if end is None else math.sqrt(max(end, 0.0)) for end in variance.interval)
    rounded = earned(math.sqrt(variance.value), (low, high))
    return with_units(typographic(rounded.value), units)
