"""Where the elements of a batch cross a level, between the nodes, by the projector's own interpolant."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import BoolArray, FloatArray, IntArray
from aleafield.geometry import Domain
from aleafield.quantities.peaks import highest_of, local_maxima, refined_summits, resolution
from aleafield.quantities.roots import bracketed_roots
from aleafield.spaces import Space, SpectralSpace


@dataclass(frozen=True)
class Crossings:
    """The level crossings of a batch of S elements, M in all; a value equal to the level is not above it.

    Attributes
    ----------
    sample : int array (M,)
    position : float array (M,)
        Units of length; on a ring not wrapped, within one cell of [low, high].
    rising : bool array (M,)
        Whether the element is above the level to the right of the crossing.
    above_left, above_right : bool array (S,)
        Whether it is above at the left and right end of the domain; on a ring, at the first grid point.
    highest : float array (S,)
        Largest value of the interpolant: above the level exactly where a part of the element is.
    right_end, left_end : float array (S,)
        Values at the ends of the domain.
    """

    sample: IntArray
    position: FloatArray
    rising: BoolArray
    above_left: BoolArray
    above_right: BoolArray
    highest: FloatArray
    left_end: FloatArray
    right_end: FloatArray

    def width(self, domain: Domain) -> FloatArray:
        """Length of the set above the level, all patches together, (S,): falling less rising positions."""
        ends = np.where(self.above_right, domain.high, 0.0) - np.where(self.above_left, domain.low, 0.0)
        patches = np.bincount(self.sample, np.where(self.rising, -self.position, self.position), len(ends))
        return np.asarray(np.clip(patches + ends, 0.0, domain.length))

    def last_fall(self) -> FloatArray:
        """Largest position with the element above the level to its left, -inf where there is none; (S,)."""
        falls = ~self.rising
        return highest_of(self.sample[falls], self.position[falls], np.full(len(self.highest), -np.inf))

    def first_rise(self) -> FloatArray:
        """Smallest position with the element above the level to its right, inf where there is none; (S,)."""
        rises = self.rising
        return -highest_of(self.sample[rises], -self.position[rises], np.full(len(self.highest), -np.inf))


def level_crossings(space: Space, u: FloatArray, level: float | FloatArray) -> Crossings:
    """All crossings of a level by the elements u (S, n), finite.

    Piecewise linear: exact inside the elements.  Spectral: bracketed by the search grid and by every local
    extremum between its points that passes the level, then refined to near rounding.

    Parameters
    ----------
    level : float or array (S,)
    """
    column = np.broadcast_to(np.asarray(level, dtype=np.float64), (u.shape[0],))[:, None]
    if isinstance(space, SpectralSpace):
        return _smooth(space, u, column)
    return _piecewise_linear(space, np.take(u, space.display_order, axis=1), column)


def _closed(grid: FloatArray, values: FloatArray, domain: Domain) -> tuple[FloatArray, FloatArray]:
    """Grid and values with, on a ring, the first point repeated after the last."""
    if not domain.periodic:
        return grid, values
    return np.append(grid, grid[0] + domain.length), np.concatenate((values, values[:, :1]), axis=1)


def _on_chord(
    grid: FloatArray, values: FloatArray, column: FloatArray, sample: IntArray, cell: IntArray
) -> FloatArray:
    """Where the straight line over a cell of the grid meets the level, (M,)."""
    left, right = values[sample, cell], values[sample, cell + 1]
    share = (column[sample, 0] - left) / (right - left)
    return np.asarray(grid[cell] + share * (grid[cell + 1] - grid[cell]))


def _piecewise_linear(space: Space, nodal: FloatArray, column: FloatArray) -> Crossings:
    grid, values = _closed(space.search_grid, nodal, space.domain)
    above = values > column
    sample, cell = np.nonzero(above[:, :-1] != above[:, 1:])
    return Crossings(
        sample,
        _on_chord(grid, values, column, sample, cell),
        above[sample, cell + 1],
        above[:, 0],
        above[:, -1],
        nodal.max(axis=1),
        values[:, 0],
        values[:, -1],
    )


def _smooth(space: SpectralSpace, u: FloatArray, column: FloatArray) -> Crossings:
    domain = space.domain
    on_grid = space.evaluate(u, space.search_grid)
    grid, values = _closed(space.search_grid, on_grid, domain)
    above = values > column
    sample, cell = np.nonzero(above[:, :-1] != above[:, 1:])
    rising = above[sample, cell + 1]
    higher, lower = grid[cell + rising], grid[cell + ~rising]
    chord = _on_chord(grid, values, column, sample, cell)

    largest = on_grid.max(axis=1)
    top, bound = local_maxima(on_grid, domain.periodic)
    top &= (bound >= largest[:, None]) | ((on_grid <= column) & (bound >= column))
    tops = refined_summits(space, u, on_grid, top)
    pit, depth = local_maxima(-on_grid, domain.periodic)
    pits = refined_summits(space, u, -on_grid, pit & (on_grid > column) & (depth >= -column), -1.0)

    # a maximum above the level between two grid points that are not, and a minimum the other way round
    level_of_top, level_of_pit = column[tops.sample, 0], column[pits.sample, 0]
    emerged = (tops.grid_height <= level_of_top) & (tops.height > level_of_top)
    drowned = pits.height >= -level_of_pit
    owner = np.concatenate((sample, np.repeat(tops.sample[emerged], 2), np.repeat(pits.sample[drowned], 2)))
    tops_at, pits_at = np.repeat(tops.position[emerged], 2), np.repeat(pits.position[drowned], 2)
    cells_of_tops = np.stack((tops.cell_left[emerged], tops.cell_right[emerged]), axis=1).ravel()
    cells_of_pits = np.stack((pits.cell_left[drowned], pits.cell_right[drowned]), axis=1).ravel()
    over = np.concatenate((higher, tops_at, cells_of_pits))
    under = np.concatenate((lower, cells_of_tops, pits_at))
    level = column[owner, 0]
    jets = space.jets(u[owner])

    def above_level(which: IntArray, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        value, slope, _ = jets(which, x)
        return value - level[which], slope

    start = np.concatenate((chord, 0.5 * (over + under)[len(chord) :]))
    position = bracketed_roots(above_level, over, under, start, resolution(domain))
    return Crossings(
        owner,
        position,
        under < over,
        above[:, 0],
        above[:, -1],
        highest_of(tops.sample, tops.height, largest),
        values[:, 0],
        values[:, -1],
    )
