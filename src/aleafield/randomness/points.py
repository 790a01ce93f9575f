"""Uniform points in the unit cube by their index: plain Monte Carlo and scrambled Sobol' sequences.

A point depends on its index, the seed and the number of columns alone: not on the other points asked for,
their order, or what was asked before.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.randomness.streams import bit_generator, generator, uniforms

if TYPE_CHECKING:
    from scipy.stats.qmc import Sobol

SCRAMBLINGS = 16
"""Independent scramblings of the Sobol' sequence in a quasi-Monte Carlo design; errors are estimated by t over
them."""
_BITS = 32
"""Binary digits of a Sobol' coordinate; scipy skips ahead in the sequence only up to 32."""
_LARGEST_GAP = 256
"""Indices further apart than this are reached by skipping, nearer ones by drawing what lies between."""


class Points(ABC):
    """Uniform points in the unit cube by index."""

    @abstractmethod
    def at(self, indices: IntArray) -> FloatArray:
        """Points (S, columns), strictly inside the cube, of indices (S,) that are not negative."""


class PlainPoints(Points):
    """Point i takes the Philox counters from i times the counters per point.

    Parameters
    ----------
    columns, seed : int
    purpose : str
        Points of different purposes have nothing in common.
    """

    def __init__(self, columns: int, seed: int, purpose: str = "parameter samples") -> None:
        self._columns = columns
        self._seed = seed
        self._purpose = purpose

    def at(self, indices: IntArray) -> FloatArray:
        points = np.empty((len(indices), self._columns))
        counters = -(-self._columns // 4)
        for first, count, rows, offsets in _runs(indices):
            source = bit_generator(self._seed, self._purpose)
            source.advance(first * counters)
            raw = source.random_raw(count * counters * 4).reshape(count, counters * 4)[:, : self._columns]
            points[rows] = uniforms(raw)[offsets]
        return points


class SobolPoints(Points):
    """Sample i is point i // 16 of scrambling i mod 16.

    Scrambled nets: Owen 1995, "Randomly permuted (t,m,s)-nets"; the scrambling by random matrices and a
    digital shift that scipy has: Matousek 1998, "On the L2-discrepancy for anchored boxes" (both from
    memory).
    """

    def __init__(self, columns: int, seed: int) -> None:
        self._columns = columns
        self._seed = seed
        self._sequences: dict[int, Sobol] = {}

    def __getstate__(self) -> dict[str, object]:
        return {"_columns": self._columns, "_seed": self._seed, "_sequences": {}}

    def at(self, indices: IntArray) -> FloatArray:
        points = np.empty((len(indices), self._columns))
        if not self._columns:
            return points
        scramblings = indices % SCRAMBLINGS
        for scrambling in np.unique(scramblings):
            of_this = np.flatnonzero(scramblings == scrambling)
            sequence = self._sequence(int(scrambling))
            for first, count, rows, offsets in _runs(indices[of_this] // SCRAMBLINGS):
                sequence.reset()
                if first:
                    sequence.fast_forward(first)
                    drawn = sequence.random(count)
                else:
                    drawn = sequence.random(1 << (count - 1).bit_length())
                points[of_this[rows]] = drawn[offsets]
        # The middle of the cell: scrambled coordinates may be 0, and no law has a value there.
        return points + 2.0 ** -(_BITS + 1)

    def _sequence(self, scrambling: int) -> Sobol:
        if scrambling not in self._sequences:
            from scipy.stats.qmc import Sobol

            rng = generator(self._seed, "sobol scrambling", scrambling)
            self._sequences[scrambling] = Sobol(self._columns, scramble=True, bits=_BITS, rng=rng)
        return self._sequences[scrambling]


def _runs(indices: IntArray) -> Iterator[tuple[int, int, IntArray, IntArray]]:
    """Splits indices into stretches that are nearly contiguous.

    Yields the first index of a stretch, how many it spans, the rows that ask for one of them, and for each of
    these rows its offset from the first.
    """
    order = np.argsort(indices, kind="stable")
    increasing = indices[order]
    breaks = np.flatnonzero(np.diff(increasing) > _LARGEST_GAP) + 1
    for rows in np.split(order, breaks):
        if len(rows):
            offsets = indices[rows] - indices[rows[0]]
            yield int(indices[rows[0]]), int(offsets[-1]) + 1, rows, offsets
