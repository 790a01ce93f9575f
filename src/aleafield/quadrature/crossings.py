"""Integrals over the set where a sampled function lies above a threshold.

Between neighbouring points the function is linear and crosses the threshold at most once; values equal to the
threshold are inactive.  Nodal sampling of a step would be of order 1 and pin the crossings to the grid.
"""

from __future__ import annotations

import numpy as np

from aleafield.arrays import BoolArray, FloatArray
from aleafield.geometry import Domain


def _column(threshold: float | FloatArray) -> FloatArray:
    return np.asarray(threshold, dtype=np.float64).reshape(-1, 1)


def _segment_ends(values: FloatArray, periodic: bool) -> tuple[FloatArray, FloatArray]:
    """Values at both ends of each segment; on a ring the last segment goes back to the first point."""
    if periodic:
        return values, np.concatenate((values[:, 1:], values[:, :1]), axis=1)
    return values[:, :-1], values[:, 1:]


def _crossing_fraction(left: FloatArray, right: FloatArray, threshold: FloatArray) -> FloatArray:
    with np.errstate(all="ignore"):
        return (threshold - left) / (right - left)


def crossing_weights(
    values: FloatArray, threshold: float | FloatArray, spacing: float, periodic: bool
) -> FloatArray:
    """Source weights of a step rate: the integral of w over the active set is the sum of weights * w(points).

    On each segment the kernel w is interpolated linearly and integrated over the active part [a, b] of the
    unit segment exactly: the right end receives (b^2 - a^2)/2 and the left end b - a minus that, times the
    spacing.  Order 2 in the spacing; exact for a linear function under a linear kernel.

    Parameters
    ----------
    values : float array (S, Q)
        The function at equally spaced points, on a ring in the order of going round.
    threshold : float or array (S,)
        In the units of the values.
    spacing : float
        Distance between neighbouring points, units of length.
    periodic : bool
        Whether a segment joins the last point to the first.

    Returns
    -------
    float array (S, Q), units of length; each row sums to the active length.
    """
    column = _column(threshold)
    left, right = _segment_ends(values, periodic)
    active_left, active_right = left > column, right > column
    fraction = _crossing_fraction(left, right, column)
    begin = np.where(active_left, 0.0, np.where(active_right, fraction, 0.0))
    end = np.where(active_right, 1.0, np.where(active_left, fraction, 0.0))
    part = (end - begin) * spacing
    to_right = 0.5 * (end + begin) * part
    to_left = part - to_right
    weights = np.zeros_like(values)
    if periodic:
        weights += to_left
        weights[:, 1:] += to_right[:, :-1]
        weights[:, 0] += to_right[:, -1]
    else:
        weights[:, :-1] += to_left
        weights[:, 1:] += to_right
    return weights


def active_moments(
    values: FloatArray,
    points: FloatArray,
    threshold: float | FloatArray,
    spacing: float,
    domain: Domain,
    wavenumbers: FloatArray,
) -> tuple[FloatArray, FloatArray]:
    """Integrals of cos(kappa y) and sin(kappa y) over the active set, closed between the crossings.

    Only the positions of the crossings carry an error (order 2 in the spacing); the integral between them is
    the difference of antiderivatives.  This is the drive of a cosine kernel under a step rate.

    Parameters
    ----------
    values : float array (S, Q)
        The function at the points.
    points : float array (Q,)
        Equally spaced; on an interval ascending with both ends, on a ring in the order of going round.
    threshold : float or array (S,)
        In the units of the values.
    spacing : float
        Distance between neighbouring points, units of length.
    domain : Interval or Ring
        On a ring every kappa must be a multiple of 2 pi / length.
    wavenumbers : float array (K,)
        kappa in radians per length, not negative; 0 gives the active length and 0.

    Returns
    -------
    two float arrays (S, K), units of length.  A sample with a crossing that is not finite gets NaN.
    """
    n_samples = values.shape[0]
    column = _column(threshold)
    left, right = _segment_ends(values, domain.periodic)
    active = left > column, right > column
    crossing: BoolArray = active[0] != active[1]
    sample, segment = np.nonzero(crossing)
    fraction = _crossing_fraction(
        left[sample, segment], right[sample, segment], np.broadcast_to(column, left.shape)[sample, segment]
    )
    falling = np.where(active[0][sample, segment], 1.0, -1.0)
    finite = np.isfinite(fraction)
    sign = np.where(finite, falling, np.nan)
    position = points[segment] + np.where(finite, fraction, 0.0) * spacing

    cosine = np.empty((n_samples, len(wavenumbers)))
    sine = np.empty_like(cosine)
    for k, kappa in enumerate(wavenumbers.tolist()):
        if kappa == 0.0:
            cosine[:, k] = crossing_weights(values, threshold, spacing, domain.periodic).sum(axis=-1)
            sine[:, k] = 0.0
            continue
        of_cosine = np.bincount(sample, sign * np.sin(kappa * position), n_samples)
        of_sine = np.bincount(sample, -sign * np.cos(kappa * position), n_samples)
        if not domain.periodic:
            first, last = values[:, 0] > column[:, 0], values[:, -1] > column[:, 0]
            of_cosine += last * np.sin(kappa * points[-1]) - first * np.sin(kappa * points[0])
            of_sine += first * np.cos(kappa * points[0]) - last * np.cos(kappa * points[-1])
        cosine[:, k] = of_cosine / kappa
        sine[:, k] = of_sine / kappa
    return cosine, sine
