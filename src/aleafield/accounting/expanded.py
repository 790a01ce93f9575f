"""Statements that come from an accepted surrogate: its error is one more part, those of the solver stay."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from aleafield.accounting.measured import MeasuredPart
from aleafield.accounting.shifted import range_of
from aleafield.accounting.split import Biases, OfStatistic, state
from aleafield.accounting.statement import Statement, representable
from aleafield.accounting.statistic import MEAN, Statistic
from aleafield.chaos import Surrogate, SurrogateStatistic
from aleafield.estimates import Sample

FROM_SAMPLES = "the surrogate is not accurate enough for quantiles and probabilities: from the samples"
READ_OFF = "read off the surrogate at many points, not off solver runs"


@dataclass(frozen=True, eq=False)
class Expanded:
    """What a quantity's statements are taken from instead of its samples.

    Attributes
    ----------
    surrogate : Surrogate
        Accepted, of runs all of which gave a value.
    for_quantiles : bool
        Whether it is accurate enough for quantiles and probabilities; else these come from the samples.
    """

    surrogate: Surrogate
    for_quantiles: bool


def expanded_statement(
    expanded: Expanded,
    sample: Sample,
    measured: Sequence[MeasuredPart],
    statistic: Statistic,
    confidence: float,
) -> Statement:
    """A statistic of the surrogate with the parts of its error.

    The discretisation parts come from the probes, as for samples: the surrogate stands for the solver at the run's
    level. With s the half-width that the surrogate brings, both sides of the interval and the total grow by s. The
    mean and the sd follow from coefficients and have no sampling error; quantiles and probabilities have that of the
    points at which the surrogate was evaluated.

    Parameters
    ----------
    expanded : Expanded
    sample : Sample
        All samples of the run.
    measured : the discretisation parts
    statistic : Statistic
        Mean, sd, quantile or exceed; the latter two need `Expanded.for_quantiles`.
    confidence : float in (0, 1)
    """
    surrogate = expanded.surrogate
    match statistic.kind:
        case "mean":
            found = surrogate.mean(confidence)
        case "sd":
            found = surrogate.sd(confidence)
        case "quantile":
            found = surrogate.quantile(statistic.at, confidence)
        case "exceed":
            found = surrogate.exceedance(statistic.at, confidence)
        case "occurs":
            raise ValueError("a surrogate stands for a quantity that always occurs")
    stated = _stated(found, sample, measured, statistic, confidence)
    if statistic == MEAN and stated.corrected is not None:
        better = surrogate.corrected_mean(confidence)
        corrected = _stated(better, sample, measured, statistic, confidence).corrected
        stated = replace(stated, corrected=corrected)
    if not statistic.has_influence:
        stated = replace(stated, notes=(READ_OFF, *stated.notes))
    return stated


@dataclass(frozen=True)
class _OfSurrogate(OfStatistic):
    """A statistic of a surrogate: what the discretisation does to it is seen on the samples."""

    def biases(self, measured: Sequence[MeasuredPart], value: float) -> Biases:
        """Biases of the samples' own statistic, whatever the surrogate's `value`."""
        if measured:
            own = range_of(self.statistic, measured[0].sample, np.zeros_like, None)
            value = value if own is None else own[0]
        return super().biases(measured, value)


def _stated(
    found: SurrogateStatistic,
    sample: Sample,
    measured: Sequence[MeasuredPart],
    statistic: Statistic,
    confidence: float,
) -> Statement:
    """The statement of an estimate that a surrogate gave, with the error that the surrogate brings."""
    subject = _OfSurrogate(statistic, confidence)
    with np.errstate(over="ignore", invalid="ignore"):
        plain = state(found.estimate, sample, measured, subject)
    exact = found.estimate.low == found.estimate.high
    widened = _widened(plain, found.surrogate, statistic.limits, exact)
    if plain.corrected is None:
        return widened
    return replace(widened, corrected=_widened(plain.corrected, found.surrogate, statistic.limits, exact))


def _widened(plain: Statement, half: float, limits: tuple[float, float], exact: bool) -> Statement:
    """The statement with a surrogate part; cut to what is possible, the total uncut."""
    error = dict(plain.error) | {"surrogate": half}
    if exact:
        error["sampling"] = None
    if error["total"] is not None:
        error["total"] += half
    interval = plain.interval
    if interval is not None:
        low, high = interval
        interval = (
            None if low is None else max(low - half, limits[0]),
            None if high is None else min(high + half, limits[1]),
        )
    return representable(replace(plain, error=error, interval=interval))
