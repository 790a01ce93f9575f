"""The variance parted into that of the parameters and that of the noise."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from scipy.special import fdtri, gammaincinv

from aleafield.arrays import BoolArray, FloatArray, IntArray
from aleafield.estimates.estimate import Estimate, exact, nothing_given, undetermined
from aleafield.estimates.positive import log_interval
from aleafield.estimates.sample import Sample
from aleafield.estimates.sd import LEAST_SAMPLES, estimate_sd

LEAST_REPEATS = 2
"""One noise path a parameter sample does not tell noise from parameters."""


@dataclass(frozen=True)
class VarianceParts:
    """The parts of the variance of a quantity, given that it occurs.

    Attributes
    ----------
    parameters : Estimate
        Variance of the mean over noise, in the square of the units of the quantity.
    noise : Estimate
        Mean over parameters of the variance over noise.
    share : Estimate
        Of the parameters in the total.
    total : Estimate
    notes : tuple of str
        What a reader must know of them.
    """

    parameters: Estimate
    noise: Estimate
    share: Estimate
    total: Estimate
    notes: tuple[str, ...] = ()


def estimate_variance_parts(
    sample: Sample, cluster: IntArray, repeats: int, confidence: float
) -> VarianceParts:
    """Analysis of variance of A clusters (parameter samples) of R repeats (noise paths).

    With w_a the variance within cluster a (divisor R - 1): noise part V_W = mean w_a, total V the square of
    `estimate_sd`, parameter part V_B = V - V_W, which for plain Monte Carlo is Var(cluster means) - V_W / R
    (Searle, Casella and McCulloch 1992); under quasi-Monte Carlo the divisor of Var is A and the squared standard
    error of the mean is added, because scrambled points know the mean better.  A negative V_B stands as 0.

    Intervals: V that of the sd, squared; V_W that of the jackknife of ln V_W over clusters (scramblings),
    raised for skewness at its upper end.  Plain Monte Carlo, with MSB = R Var(cluster means), F_q and chi2_q
    quantiles for nu_B and nu_W degrees of freedom, h and l the probabilities of the upper and lower one:

        V_B in [nu_B (MSB - F_h V_W) / (R chi2_h), nu_B (max(MSB, V_W) - F_l V_W) / (R chi2_l)]

    (Williams 1962) and share / (1 - share) in [(MSB / V_W / F_h - 1) / R, (max(MSB / V_W, 1) / F_l - 1) / R]
    (Burdick and Graybill 1992), both cut at 0.  The maxima are our own: without them few clusters that happen
    to scatter less than their noise would give an upper limit of 0.  Normal theory has nu_B = A - 1 and
    nu_W = A (R - 1); heavier tails are met by nu = 2 / (relative standard error)^2 where that is less, the
    standard error being that of a mean over clusters (after Satterthwaite 1946).  Measured over 1500 samples
    of 64 x 4 to 512 x 2 with nu as in normal theory and as it is: lognormal parameters .78 to .84 and .89 to
    .97, skew noise .95 to .97 and .97 to 1.0, else .95 and .95 to .98; the interval of V_B is then 8 per cent wider
    where all is nearly normal.  (Sources from memory.)

    Quasi-Monte Carlo: jackknife over scramblings.  V_B: below t SE, above M (exp(u SE / M) - 1) with
    M = V_B + V_W / R the variance of cluster means, u = t raised for skewness; share = 1 - V_W / V through
    ln(V / V_W), both ends raised for skewness.  Measured over 800 samples of 64 x 2 to 512 x 4: .93 to .99,
    symmetric lengths .89 to .99.

    Where the quantity does not occur in some realizations: V_W = sum n_a w_a / sum n_a over the clusters in
    which it occurs n_a >= 2 times, and the jackknife over clusters (scramblings) for all parts.

    Parameters
    ----------
    sample : Sample
        Clustered, or scrambled with whole clusters in each scrambling.
    cluster : int array (S,)
        Parameter sample of each realization, >= 0.
    repeats : int
        R >= 2, realizations of a cluster.
    confidence : float in (0, 1)

    Returns
    -------
    VarianceParts
        Clusters with failed realizations are left out whole.  Not determined by fewer than 64 clusters, where the
        sd is not, and where all values are equal.
    """
    whole = _whole_clusters(sample, cluster)
    notes = []
    if not whole.valid.all():
        lost = len(np.unique(cluster[~whole.valid]))
        notes.append(f"{lost} parameter samples with failed realizations are left out with all their repeats")
    if len(whole.given) == 0:
        return _all(nothing_given(whole.n_valid))
    table = _Table.of(whole, cluster)
    if table.parted < LEAST_SAMPLES:
        needed = f"parting the variance needs {LEAST_SAMPLES} parameter samples with repeats that count"
        return _all(undetermined(table.parted, needed))
    sd = estimate_sd(whole, confidence)
    if sd.value is None or sd.low is None or sd.high is None:
        return _all(sd)
    if sd.value == 0.0:
        return _all(undetermined(table.parted, "all values are equal, there is no variance to part"))
    total = Estimate(sd.value**2, sd.low**2, sd.high**2)
    noise = table.noise(confidence)
    if noise.value is None:
        return _all(noise)
    balanced = bool(whole.occurs.sum() == whole.n_valid)
    if not balanced:
        notes.append(
            "it does not occur in all realizations: the noise part is weighted by how often it occurs in a "
            "parameter sample, and the intervals rest on the jackknife"
        )
    if sd.value**2 < noise.value:
        notes.append("the parameter part is estimated below 0 and stands as 0")
    if balanced and whole.clustered:
        parameters, share = table.by_williams(repeats, sd.value**2, noise.value, confidence)
    else:
        parameters, share = table.by_jackknife(repeats, sd.value**2, noise.value, confidence)
    return VarianceParts(parameters, noise, share, total, tuple(notes))


def _all(estimate: Estimate) -> VarianceParts:
    return VarianceParts(estimate, estimate, estimate, estimate)


def _whole_clusters(sample: Sample, cluster: IntArray) -> Sample:
    """The sample without the clusters in which a realization failed."""
    failed = np.bincount(cluster, weights=~sample.valid) > 0.0
    if not failed.any():
        return sample
    kept = ~failed[cluster]
    return replace(sample, valid=sample.valid & kept, occurs=sample.occurs & kept)


@dataclass(frozen=True, eq=False)
class _Table:
    """Clusters in which the quantity occurs, and the blocks that the jackknife leaves out.

    Attributes
    ----------
    count : float array (A,)
        Realizations n_a of each cluster in which it occurs.
    mean, within : float arrays (A,)
        Mean of each cluster about the mean of all, and its variance; 0 where n_a = 1.
    block : int array (A,)
        0 .. blocks - 1: the cluster itself or its scrambling.
    """

    count: FloatArray
    mean: FloatArray
    within: FloatArray
    block: IntArray

    @staticmethod
    def of(sample: Sample, cluster: IntArray) -> _Table:
        """The table of a sample; clusters in which the quantity does not occur are left out."""
        at = cluster[sample.occurs]
        centred = sample.given - sample.given.mean()
        count = np.bincount(at)
        held = count > 0
        mean = np.bincount(at, centred) / np.maximum(count, 1)
        square = np.bincount(at, (centred - mean[at]) ** 2)
        within = square / np.maximum(count - 1, 1)
        block = np.zeros(len(count), dtype=np.int64)
        block[at] = sample.given_block
        _, block = np.unique(block[held], return_inverse=True)
        return _Table(count[held].astype(np.float64), mean[held], within[held], block)

    @property
    def paired(self) -> BoolArray:
        """Clusters that show noise, (A,)."""
        return self.count >= LEAST_REPEATS

    @property
    def parted(self) -> int:
        """Number of clusters that show noise."""
        return int(self.paired.sum())

    def _sum(self, values: FloatArray) -> FloatArray:
        """Sums over the clusters of each block, (blocks,)."""
        return np.bincount(self.block, values).astype(np.float64)

    @cached_property
    def noise_without(self) -> FloatArray:
        """V_W without each block in turn, (blocks,)."""
        weight = np.where(self.paired, self.count, 0.0)
        top, bottom = self._sum(weight * self.within), self._sum(weight)
        without: FloatArray = (top.sum() - top) / (bottom.sum() - bottom)
        return without

    def total_without(self, total: float) -> FloatArray:
        """V without each block in turn, up to the divisor, which is that of all, (blocks,)."""
        square = self.count * self.mean**2 + (self.count - 1.0) * self.within
        n, first, second = self._sum(self.count), self._sum(self.count * self.mean), self._sum(square)
        n, first, second = n.sum() - n, first.sum() - first, second.sum() - second
        # `mean` is about the mean of all: the mean of everything is 0
        without: FloatArray = (second / n - (first / n) ** 2) * (total * self.count.sum() / square.sum())
        return without

    def noise(self, confidence: float) -> Estimate:
        """V_W with its interval."""
        weight = np.where(self.paired, self.count, 0.0)
        value = float(weight @ self.within / weight.sum())
        if value == 0.0:
            return exact(0.0)
        if not (self.noise_without > 1e-12 * value).all():
            return undetermined(self.parted, "the noise shows in one of them alone")
        return log_interval(value, np.log(self.noise_without), confidence)

    def by_williams(
        self, repeats: int, total: float, noise: float, confidence: float
    ) -> tuple[Estimate, Estimate]:
        """Parameter part and share from the F law, for balanced independent clusters."""
        clusters = len(self.count)
        between = float(self.mean.var(ddof=1)) * repeats
        nu_between = _degrees((self.mean - self.mean.mean()) ** 2, clusters - 1.0)
        nu_within = _degrees(self.within, clusters * (repeats - 1.0))
        low, high = 0.5 * (1.0 - confidence), 0.5 * (1.0 + confidence)
        above = between - float(fdtri(nu_between, nu_within, high)) * noise
        f_low = float(fdtri(nu_between, nu_within, low)) * noise
        below = max(between, noise) - f_low
        ends = (
            nu_between * above / (repeats * 2.0 * float(gammaincinv(0.5 * nu_between, high))),
            nu_between * below / (repeats * 2.0 * float(gammaincinv(0.5 * nu_between, low))),
        )
        shares = (above / (above + repeats * (between - above)), below / (below + repeats * f_low))
        return _estimates(total, noise, ends, shares)

    def by_jackknife(
        self, repeats: int, total: float, noise: float, confidence: float
    ) -> tuple[Estimate, Estimate]:
        """Parameter part and share from the jackknife over blocks."""
        without = self.total_without(total)
        value = total - noise
        scale = max(value, 0.0) + noise / repeats
        around = log_interval(1.0, (without - self.noise_without) / scale, confidence)
        assert around.low is not None
        assert around.high is not None
        ends = (value + scale * math.log(around.low), max(value, 0.0) + scale * (around.high - 1.0))
        if noise == 0.0:
            return _estimates(total, noise, ends, (1.0, 1.0))
        logarithm = np.log(without / self.noise_without)
        down, up = log_interval(1.0, -logarithm, confidence), log_interval(1.0, logarithm, confidence)
        assert down.high is not None
        assert up.high is not None
        shares = (1.0 - noise / total * down.high, 1.0 - min(noise / total, 1.0) / up.high)
        return _estimates(total, noise, ends, shares)


def _degrees(square: FloatArray, most: float) -> float:
    """Degrees of freedom of a mean of squares (n,), at most what normal theory says."""
    mean = float(square.mean())
    if mean == 0.0:
        return most
    relative = float(square.var(ddof=1)) / len(square) / mean**2
    return min(most, 2.0 / relative) if relative > 0.0 else most


def _estimates(
    total: float, noise: float, ends: tuple[float, float], shares: tuple[float, float]
) -> tuple[Estimate, Estimate]:
    """Parameter part and share with what lies below 0 cut."""
    value = max(total - noise, 0.0)
    parameters = Estimate(value, min(max(ends[0], 0.0), value), max(ends[1], value))
    share = value / total
    return parameters, Estimate(share, min(max(shares[0], 0.0), share), max(min(shares[1], 1.0), share))
