"""The highest point of an element, located between the nodes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import BoolArray, FloatArray, IntArray
from aleafield.geometry import Domain
from aleafield.quantities.roots import bracketed_roots
from aleafield.spaces import Space, SpectralSpace

_AGREEMENT = 4.0
"""Second differences whose ratio is at most this agree: those of a smooth peak differ by O(h) of themselves."""


@dataclass(frozen=True)
class Peak:
    """Position (S,), a coordinate of the domain, and height (S,) of the highest point of each sample."""

    position: FloatArray
    height: FloatArray


@dataclass(frozen=True)
class Summits:
    """Local maxima of a batch, M in all, in the order of the samples.

    Attributes
    ----------
    sample : int array (M,)
    cell_left, cell_right : float array (M,)
        Ends of the cell of the search grid that holds the maximum; on a ring the left end may lie one cell
        below the domain, never wrapped.
    position, height : float array (M,)
    grid_height : float array (M,)
        Value at the neighbouring point of the search grid.
    """

    sample: IntArray
    cell_left: FloatArray
    cell_right: FloatArray
    position: FloatArray
    height: FloatArray
    grid_height: FloatArray


def parabolic_peak(values: FloatArray, points: FloatArray, domain: Domain) -> Peak:
    """Highest vertex of the parabolas through three neighbouring points.

    A piecewise-linear function peaks at a node, so that the position of its own peak has an error of half an
    element, a sawtooth that never falls faster than h.  The parabola through three nodes gives the position
    with error h^2 and the height of a function known at the nodes with error h^3.

    A vertex counts where it lies within half a spacing of its middle node; on an interval, beyond that as far
    as the end of the domain for the first and last three points.  Else the nodal value counts.

    It counts only where the second differences of both neighbouring triples (of the one there is, for the
    first and last triple of an interval) have its sign and agree with its own within a factor of 4.  At a
    jump, a kink or the edge of a plateau they do not, and a parabola would overshoot by a share of the jump
    that no refinement makes smaller; where they do, the rise above the node is bounded by a multiple of a second
    difference beside it, as for a smooth peak.  A Gaussian bump counts as smooth from about two spacings per
    standard deviation on.  A triple without a neighbour is not confirmed.

    Parameters
    ----------
    values : float array (S, P), finite
    points : float array (P,)
        Equally spaced, ascending; both ends of an interval, or all the way round a ring.
    domain : Interval or Ring
    """
    left, right = np.roll(values, 1, axis=1), np.roll(values, -1, axis=1)
    n_points = len(points)
    reach_left, reach_right = np.full(n_points, -0.5), np.full(n_points, 0.5)
    spacing = domain.length / n_points
    if not domain.periodic:
        spacing = domain.length / (n_points - 1)
        reach_left[1], reach_right[-2] = -1.0, 1.0
        reach_left[[0, -1]] = np.inf  # no parabola is centred at an end
    slope, curvature = 0.5 * (right - left), left - 2 * values + right
    with np.errstate(all="ignore"):
        vertex = -slope / curvature
        inside = (vertex >= reach_left) & (vertex <= reach_right) & _confirmed(curvature, domain.periodic)
        vertex = np.where(inside, vertex, 0.0)
    heights = values + np.where(inside, 0.5 * slope * vertex, 0.0)
    best = heights.argmax(axis=1)[:, None]
    position = points[best[:, 0]] + spacing * np.take_along_axis(vertex, best, axis=1)[:, 0]
    position = domain.wrap(position) if domain.periodic else np.clip(position, domain.low, domain.high)
    return Peak(position, np.take_along_axis(heights, best, axis=1)[:, 0])


def _confirmed(curvature: FloatArray, periodic: bool) -> BoolArray:
    """Where a second difference (S, P) is negative and its neighbours agree with it; (S, P)."""
    ratio_left, ratio_right = (np.roll(curvature, shift, axis=1) / curvature for shift in (1, -1))
    if not periodic:  # the triples centred at an end do not exist
        ratio_left[:, 1] = ratio_right[:, -2] = 1.0 if curvature.shape[1] > 3 else np.nan
    agree = [(ratio >= 1 / _AGREEMENT) & (ratio <= _AGREEMENT) for ratio in (ratio_left, ratio_right)]
    return np.asarray((curvature < 0) & agree[0] & agree[1])


def local_maxima(values: FloatArray, periodic: bool) -> tuple[BoolArray, FloatArray]:
    """Which grid values are local maxima, and how high the function may rise near each; both (S, P).

    Of equal neighbours the first counts; an end of an interval counts where its neighbour is lower.  A
    parabola rises above its highest grid point by at most an eighth of the second difference; the bound given
    here is a whole second difference above it.
    """
    rise = np.empty((values.shape[0], values.shape[1] + 1))
    np.subtract(values[:, 1:], values[:, :-1], out=rise[:, 1:-1])
    rise[:, 0] = rise[:, -1] = values[:, 0] - values[:, -1] if periodic else 0.0
    before, after = rise[:, :-1], rise[:, 1:]
    higher_than_left = before > 0
    if not periodic:
        higher_than_left[:, 0] = True
    return higher_than_left & (after <= 0), values + (before - after)


def refined_summits(
    space: SpectralSpace, u: FloatArray, values: FloatArray, eligible: BoolArray, sign: float = 1.0
) -> Summits:
    """Local maxima of sign * u beside the chosen points of the search grid, to near rounding.

    The sign of the slope at a grid point tells the cell; there the slope's root is found by safeguarded
    Newton. At an end of an interval where the function falls inwards the maximum is the end itself.

    Parameters
    ----------
    space : SpectralSpace
    u : float array (S, n), finite
    values : float array (S, P)
        sign * u on the search grid.
    eligible : bool array (S, P)
        Local maxima of the values that are to be refined.
    sign : float
        1 for maxima, -1 for minima.
    """
    grid = space.search_grid
    before, after = np.roll(grid, 1), np.roll(grid, -1)
    if space.domain.periodic:
        before[0] -= space.domain.length
        after[-1] += space.domain.length
    else:
        before[0], after[-1] = grid[0], grid[-1]
    sample, point = np.nonzero(eligible)
    jets, every = space.jets(u[sample]), np.arange(len(sample))
    at = grid[point]
    rising = sign * jets(every, at)[1] > 0
    left, right = np.where(rising, at, before[point]), np.where(rising, after[point], at)

    grid_height = values[sample, point]
    found = grid_height.copy()

    def slope(which: IntArray, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        value, first, second = jets(which, x)
        found[which] = sign * value  # in the end that of the last place: so near the root it is the same
        return sign * first, sign * second

    start = _vertex(
        before[point] - at,
        values[sample, point - 1] - grid_height,
        after[point] - at,
        values[sample, (point + 1) % len(grid)] - grid_height,
    )
    start = np.where(np.isfinite(start), np.clip(at + start, left, right), 0.5 * (left + right))
    position = bracketed_roots(slope, left, right, start, resolution(space.domain))
    better = found > grid_height  # rounding, or a slope with several roots in the cell
    height, position = np.where(better, found, grid_height), np.where(better, position, at)
    return Summits(sample, left, right, position, height, grid_height)


def _vertex(x: FloatArray, v: FloatArray, y: FloatArray, w: FloatArray) -> FloatArray:
    """Vertex of the parabola through (x, v), (0, 0) and (y, w); NaN where two places are one."""
    with np.errstate(all="ignore"):
        return np.asarray(0.5 * (x * x * w - y * y * v) / (x * w - y * v))


def resolution(domain: Domain) -> float:
    """Coordinates that differ by less are one to rounding, units of length."""
    return 4 * float(np.finfo(np.float64).eps) * max(domain.length, abs(domain.low), abs(domain.high))


def highest_of(samples: IntArray, heights: FloatArray, least: FloatArray) -> FloatArray:
    """For each sample the largest of `least` (S,) and its heights (M,)."""
    result = least.copy()
    np.maximum.at(result, samples, heights)
    return result


def peak(space: Space, u: FloatArray) -> Peak:
    """The highest point of each element u (S, n), finite.

    Piecewise linear: `parabolic_peak` of the nodal values.  Spectral: the element's own maximum; every local
    maximum of the search grid that may rise above the highest grid value is refined, so that of two nearly
    equal peaks the higher one is found.
    """
    if not isinstance(space, SpectralSpace):
        return parabolic_peak(np.take(u, space.display_order, axis=1), space.search_grid, space.domain)
    grid = space.search_grid
    values = space.evaluate(u, grid)
    summit, bound = local_maxima(values, space.domain.periodic)
    on_grid = values.max(axis=1)
    summits = refined_summits(space, u, values, summit & (bound >= on_grid[:, None]))
    height = highest_of(summits.sample, summits.height, on_grid)
    position = grid[values.argmax(axis=1)]
    # among equals the first is set last, and stays
    of_height = np.flatnonzero(summits.height == height[summits.sample])[::-1]
    position[summits.sample[of_height]] = space.domain.wrap(summits.position[of_height])
    return Peak(position, height)
