"""The variance of a quantity, parted into parameters and noise, with the parts of its error."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Literal

import numpy as np

from aleafield.accounting.bias import Bias, Unmeasured, bias_of, mean_and_half_width, sd_influence
from aleafield.accounting.measured import MeasuredPart, PairedValues
from aleafield.accounting.order import Order
from aleafield.accounting.split import Biases, state
from aleafield.accounting.statement import Statement, no_statement
from aleafield.accounting.statistic import SD
from aleafield.arrays import BoolArray, FloatArray, IntArray
from aleafield.ensemble.level import Side
from aleafield.estimates import Estimate, Sample, estimate_sd, estimate_variance_parts
from aleafield.estimates.variance_parts import LEAST_REPEATS

Member = Literal["parameters", "noise", "share", "total"]


@dataclass(frozen=True, eq=False)
class Clusters:
    """Which realizations share their parameter sample.

    Attributes
    ----------
    cluster : int array (S,)
        Parameter sample of each realization, >= 0.
    repeats : int
        Noise paths of each parameter sample.
    parameters : bool
        Whether there are uncertain inputs.
    """

    cluster: IntArray
    repeats: int
    parameters: bool


@dataclass(frozen=True)
class VarianceStatements:
    """The variance of a noisy quantity, given that it occurs, and its parts.

    Attributes
    ----------
    parameters : Statement or None
        Variance of the mean over noise, in the square of the units of the quantity; None without inputs.
    noise : Statement
        Mean over parameters of the variance over noise.
    share : Statement or None
        Of the parameters in the total, within [0, 1]; None without inputs.
    total : Statement
    """

    parameters: Statement | None
    noise: Statement
    share: Statement | None
    total: Statement

    def as_json(self) -> dict[str, object]:
        """The statements in the shape of summary.json."""
        return {
            "parameters": None if self.parameters is None else self.parameters.as_json(),
            "noise": self.noise.as_json(),
            "share": None if self.share is None else self.share.as_json(),
            "total": self.total.as_json(),
        }


def variance_statements(
    sample: Sample, measured: Sequence[MeasuredPart], clusters: Clusters, confidence: float
) -> VarianceStatements:
    """Statements of the parts of the variance.

    Parameters
    ----------
    sample : Sample
        All realizations; independent of each other where there are no uncertain inputs.
    measured : sequence of MeasuredPart
    clusters : Clusters
    confidence : float in (0, 1)

    Returns
    -------
    VarianceStatements
        Values and sampling intervals as in `estimate_variance_parts`.  The bias of each part of the
        discretisation is F |mean psi| with the noise of the mean over clusters of probes, put together as
        `split_error` says.  With w_a the variance within cluster a, Q the run, Q - D the finer level, m the
        mean, psi is for

        - noise: w_a at the run less w_a at the finer level;
        - total: the mean over the cluster of (Q - m)^2 - (Q - D - m + mean D)^2, see `sd_influence`;
        - parameters: total less noise, which is the difference of the squared deviations of cluster means less
          w_a / R;
        - share: (psi of parameters - share psi of total) / total.

        Where the quantity does not always occur each value counts where it does, in units of the mean count.
        With one noise path a parameter sample nothing is determined.
    """
    with np.errstate(over="ignore", invalid="ignore"):
        if not clusters.parameters:
            total = _squared(estimate_sd(sample, confidence))
            found = _stated(
                "total", total, _Variance(sample, clusters, total.value, 0.0, confidence), measured
            )
            return VarianceStatements(None, found, None, found)
        if clusters.repeats < LEAST_REPEATS:
            nothing = no_statement(
                f"not determined with noise_repeats = {clusters.repeats}: one noise path a parameter sample does "
                "not tell noise from parameters; ask for noise_repeats = 2 or more"
            )
            return VarianceStatements(nothing, nothing, nothing, nothing)
        parts = estimate_variance_parts(sample, clusters.cluster, clusters.repeats, confidence)
        variance = _Variance(sample, clusters, parts.total.value, parts.noise.value, confidence)
        estimates: dict[Member, Estimate] = {
            "parameters": parts.parameters,
            "noise": parts.noise,
            "share": parts.share,
            "total": parts.total,
        }
        members = {
            name: _stated(name, estimate, variance, measured, parts.notes)
            for name, estimate in estimates.items()
        }
    return VarianceStatements(**members)


def _squared(sd: Estimate) -> Estimate:
    if sd.value is None or sd.low is None or sd.high is None:
        return sd
    return Estimate(sd.value**2, sd.low**2, sd.high**2)


def _stated(
    member: Member,
    estimate: Estimate,
    variance: _Variance,
    measured: Sequence[MeasuredPart],
    notes: tuple[str, ...] = (),
) -> Statement:
    found = state(estimate, variance.sample, measured, _Part(member, variance))
    return replace(found, notes=(*notes, *found.notes))


@dataclass(frozen=True, eq=False)
class _Variance:
    """What the biases of all members need.

    Attributes
    ----------
    sample : Sample
    clusters : Clusters
    total, noise : float or None
        Values of the parts; None where nothing is stated.
    confidence : float
    """

    sample: Sample
    clusters: Clusters
    total: float | None
    noise: float | None
    confidence: float

    @cached_property
    def count(self) -> float:
        """Mean over clusters of the realizations that show noise: n_a where that is 2 or more."""
        cluster = self.clusters.cluster
        times = np.bincount(cluster[self.sample.occurs], minlength=int(cluster.max()) + 1)
        return float(times[times >= LEAST_REPEATS].sum() / len(np.unique(cluster[self.sample.valid])))

    def whole(self, pair: PairedValues) -> BoolArray:
        """Probes (k,) whose parameter sample failed on none of its paths."""
        cluster = self.clusters.cluster[pair.at]
        times: BoolArray = np.bincount(cluster)[cluster] == self.clusters.repeats
        return times

    def noise_influence(self, pair: PairedValues) -> FloatArray:
        """By what each probe (k,) changes V_W between two levels; alike within a cluster.

        n_a (w_a - V_W) at one level less the same at the other, over the mean of n_a, where n_a >= 2.
        """
        cluster = self.clusters.cluster[pair.at]
        upper = self._within(pair.upper, pair.in_upper, cluster)
        return (upper - self._within(pair.lower, pair.in_lower, cluster)) / self.count

    def _within(self, values: FloatArray, occurs: BoolArray, cluster: IntArray) -> FloatArray:
        """n_a (w_a - V_W), 0 where n_a < 2, for each probe (k,)."""
        assert self.noise is not None
        length, at = int(cluster.max()) + 1, cluster[occurs]
        times = np.bincount(at, minlength=length)
        mean = np.bincount(at, values[occurs], length) / np.maximum(times, 1)
        square = np.bincount(at, (values[occurs] - mean[at]) ** 2, length)
        within = square / np.maximum(times - 1, 1)
        weighed: FloatArray = np.where(times >= LEAST_REPEATS, times * (within - self.noise), 0.0)[cluster]
        return weighed


@dataclass(frozen=True, eq=False)
class _Part:
    """A member of the variance as the subject of a statement."""

    member: Member
    variance: _Variance

    @property
    def limits(self) -> tuple[float, float]:
        return 0.0, 1.0 if self.member == "share" else math.inf

    @property
    def corrected(self) -> bool:
        return False

    def order(self, measured: MeasuredPart) -> Order:
        return measured.conditional_order

    def open_sides(self, measured: MeasuredPart) -> frozenset[Side]:
        return measured.open_sides(SD)

    def biases(self, measured: Sequence[MeasuredPart], value: float) -> Biases:
        return Biases.of({m.part.name: self._bias(m) for m in measured})

    def _bias(self, measured: MeasuredPart) -> Bias | Unmeasured:
        """F |mean psi| and its noise; for the total what the sd says, which also knows of a shifted sample.

        Where the quantity may not occur the shifted sample may show more than the probes do of samples that
        cease or come to occur; all members are widened by that excess.
        """
        variance = self.variance
        assert variance.total is not None
        sd = math.sqrt(variance.total)
        of_sd = bias_of(measured, SD, sd, variance.confidence)
        if isinstance(of_sd, Unmeasured):
            return of_sd
        total = Bias(2.0 * sd * of_sd.size, 2.0 * sd * of_sd.noise)
        if sd == 0.0:
            total = Bias(of_sd.size**2, of_sd.noise**2)
        if self.member == "total":
            return total
        pairs = [p for p in measured.candidates if variance.whole(p).any()]
        if not pairs:
            name = measured.part.name
            return Unmeasured(
                f"the {name} part cannot be measured: no parameter sample without a failed probe"
            )
        found = [self._measured(measured, pair) for pair in pairs]
        seen = max(abs(mean) for mean, _ in found)
        rounding = 2.0 * sd * measured.round_off
        scale = 1.0 / variance.total if self.member == "share" else 1.0
        factor = measured.conditional_order.factor
        excess = 0.0
        if variance.sample.margin is not None:
            by_probes = max(abs(float(self._total(pair, sd).mean())) for pair in pairs)
            excess = max(0.0, total.size - factor * by_probes - rounding)
        noise = max(half_width for _, half_width in found)
        return Bias(factor * seen + scale * (rounding + excess), factor * noise)

    def _measured(self, measured: MeasuredPart, pair: PairedValues) -> tuple[float, float]:
        """Mean psi over clusters of probes without a failure, and its half-width."""
        variance = self.variance
        kept = variance.whole(pair)
        psi = self._influence(pair)[kept]
        return mean_and_half_width(measured, psi, pair.block[kept], variance.confidence)

    def _influence(self, pair: PairedValues) -> FloatArray:
        variance = self.variance
        assert variance.total is not None
        assert variance.noise is not None
        by_noise = variance.noise_influence(pair)
        if self.member == "noise":
            return by_noise
        by_total = self._total(pair, math.sqrt(variance.total))
        if self.member == "parameters":
            return by_total - by_noise
        # (psi_B - share psi_T) / V
        return (by_total * (variance.noise / variance.total) - by_noise) / variance.total

    def _total(self, pair: PairedValues, sd: float) -> FloatArray:
        given = self.variance.sample.given
        share = len(given) / self.variance.sample.n_valid
        return 2.0 * sd * sd_influence(pair, float(given.mean()), sd, share)
