"""Variance and correlation length of a field over realizations, from sums over groups of them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.estimates.estimate import Estimate, exact, nothing_given, undetermined
from aleafield.estimates.positive import log_interval

GROUPS = 64
"""Clusters are joined in so many groups at most, each of which the jackknife leaves out in turn."""
LEAST_GROUPS = 8
"""With fewer, the jackknife of a variance is not trusted."""
FALL = float(np.exp(-1.0))
"""The correlation at the correlation length."""


@dataclass(frozen=True)
class FieldStatistics:
    """Variance of a field, averaged over its domain, and its correlation length, at one time.

    Attributes
    ----------
    variance : Estimate
        Square of the units of the field.
    correlation_length : Estimate
        Units of length.
    """

    variance: Estimate
    correlation_length: Estimate


class FieldSums:
    """Sums over realizations of a field u on equally spaced points at K times, group by group.

    Groups are independent of one another: scramblings, or as many parameter samples with all their noise paths
    as make at most `GROUPS` groups.

    The covariance at the distance r is averaged over all pairs of points that lie so far apart; on an interval
    each pair has the weight (w_i w_j)^(1/2), w the trapezoid rule, so that at r = 0 the average is that over the
    domain.  It is the mean product of fluctuations about the mean field, plus the square of that mean's
    standard error, which the groups show: so it is unbiased also where realizations depend on each other.

    The correlation length is the distance at which the correlation C(r) / C(0) first falls to 1/e, between
    points by the straight line: for exp(-r / l) that is l, for exp(-r^2 / (2 l^2)) it is sqrt(2) l.

    Parameters
    ----------
    reference : float array (K, n)
        Any realization: products are summed about it, since the spread may be far below the field.
    groups : int
    spacing : float
        Between neighbouring points, units of length.
    periodic : bool
        Whether the points close to a ring; otherwise the first and the last are the ends of an interval.
    """

    def __init__(self, reference: FloatArray, groups: int, spacing: float, periodic: bool) -> None:
        self._reference = reference
        self._spacing = spacing
        n = reference.shape[1]
        self._padded = n if periodic else 2 * n
        self._lags = n // 2 + 1 if periodic else n
        weights = np.ones(n)
        if not periodic:
            weights[[0, -1]] = 0.5
        self._root = np.sqrt(weights)
        self._pairs = self._products(np.ones((1, n)))[0]
        self._count = np.zeros(groups)
        self._first = np.zeros((groups, *reference.shape))
        self._second = np.zeros((groups, len(reference), self._lags))

    def add(self, fields: FloatArray, group: IntArray) -> None:
        """Take in the fields (S, K, n) of realizations that did not fail, and the group (S,) of each."""
        np.add.at(self._count, group, 1.0)
        with np.errstate(all="ignore"):  # what overflows is left undetermined
            difference = fields - self._reference
            np.add.at(self._first, group, difference)
            np.add.at(self._second, group, self._average(difference))

    def statistics(self, index: int, confidence: float) -> FieldStatistics:
        """Variance and correlation length at the time of that index, with jackknife intervals over groups."""
        held = self._count > 0
        count, groups = self._count[held], int(held.sum())
        n = int(count.sum())
        if n == 0:
            return FieldStatistics(nothing_given(0), nothing_given(0))
        if groups < LEAST_GROUPS:
            nothing = undetermined(n, f"{LEAST_GROUPS} independent groups of them are needed")
            return FieldStatistics(nothing, nothing)
        first, second = self._first[held, index], self._second[held, index]
        rest = (n - count)[:, None]
        with np.errstate(all="ignore"):
            means = (first.sum(axis=0) - first) / rest
            left_out = (second.sum(axis=0) - second) / rest - self._average(means)
            apart = self._average(means - means.mean(axis=0)).sum(axis=0) * (groups - 1) / groups
            whole = second.sum(axis=0) / n - self._average(first.sum(axis=0)[None] / n)[0] + apart
        return self._estimates(whole, left_out, n, confidence)

    def _estimates(
        self, whole: FloatArray, left_out: FloatArray, n: int, confidence: float
    ) -> FieldStatistics:
        rounding = 1e-12 * abs(whole[0])
        if whole[0] <= 0.0 and not left_out.any():
            still = Estimate(None, None, None, "not determined: the field does not vary")
            return FieldStatistics(exact(0.0), still)
        if not (
            np.isfinite(whole).all() and np.isfinite(left_out).all() and (left_out[:, 0] > rounding).all()
        ):
            nothing = undetermined(n, "the spread of the field comes from too few of them")
            return FieldStatistics(nothing, nothing)
        variance = log_interval(float(whole[0]), np.log(left_out[:, 0]), confidence)
        lengths = self._fall(np.concatenate([whole[None], left_out]))
        if np.isnan(lengths).any():
            reach = "not determined: the correlation does not fall to 1/e within the domain"
            return FieldStatistics(variance, Estimate(None, None, None, reach))
        return FieldStatistics(variance, log_interval(float(lengths[0]), np.log(lengths[1:]), confidence))

    def _fall(self, covariances: FloatArray) -> FloatArray:
        """Distance at which each row (lags,) first falls to 1/e of its first entry; NaN where it never does."""
        correlation = covariances / covariances[:, :1]
        below = correlation <= FALL
        lag = below.argmax(axis=1)
        rows = np.arange(len(lag))
        before, after = correlation[rows, lag - 1], correlation[rows, lag]
        with np.errstate(all="ignore"):
            distance = self._spacing * (lag - 1 + (before - FALL) / (before - after))
        return np.where(below.any(axis=1), distance, np.nan)

    def _average(self, fields: FloatArray) -> FloatArray:
        """Products of fields (.., n) averaged over all pairs of points at each distance, (.., lags)."""
        averages: FloatArray = self._products(fields) / self._pairs
        return averages

    def _products(self, fields: FloatArray) -> FloatArray:
        spectrum = np.fft.rfft(fields * self._root, self._padded)
        power = spectrum.real**2 + spectrum.imag**2
        products: FloatArray = np.fft.irfft(power, self._padded)
        return products[..., : self._lags]
