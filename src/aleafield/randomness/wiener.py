"""Paths of Wiener processes that every step size and every number of modes may ask: regenerated, never stored.

A path is given by its increments over base steps.  An increment B over a length L is cut in two halves,
B/2 + sqrt(L)/2 Z and B/2 - sqrt(L)/2 Z with a fresh normal number Z, again and again (Levy 1948, "Processus
stochastiques et mouvement brownien"; from memory).  So increments over long steps are the sums of those over
short ones, and what is known of a path does not change when more of it is asked for.

A number depends on the seed, the parameter sample, the repeat, the mode, the base step and the place inside it (and
on the number of base steps, which a study fixes): not on which other samples, repeats or modes are asked for, nor on
what was asked before.
"""

from __future__ import annotations

import math

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.randomness.streams import Places, uniforms

_BLOCK = 32
"""Numbers of a mode that one stream gives: large against the cost of going to a place (1 microsecond), small enough
for the memory of a batch.  The numbers depend on it."""


class WienerPaths:
    """Increments of m independent Wiener processes for each of S realizations.

    Parameters
    ----------
    seed : int
    samples, repeats : int arrays (S,)
        Parameter sample and number of the noise path of each realization.
    modes : int
        m; the first modes have the same paths whatever m.
    base_lengths : float array (K,)
        Lengths of the base steps, units of time.
    depth : int
        Every base step is halved so often: 2^depth sub-steps.

    Notes
    -----
    Memory: see `path_bytes`.
    """

    def __init__(
        self,
        seed: int,
        samples: IntArray,
        repeats: IntArray,
        modes: int,
        base_lengths: FloatArray,
        depth: int,
    ) -> None:
        self._lengths = base_lengths.tolist()
        places = Places(seed, "wiener paths")
        self._normals = [
            _Normals(places, samples, repeats, modes, len(self._lengths), generation)
            for generation in range(depth + 1)
        ]

    def base_step(self, k: int) -> FloatArray:
        """Increments over the sub-steps of base step k, in time order, a fresh array (2^depth, S, m).

        Independent normal numbers with mean 0 and variance base_lengths[k] / 2^depth.  Cheapest for
        k = 0, 1, 2 .. in order.
        """
        length = self._lengths[k]
        increments: FloatArray = math.sqrt(length) * self._normals[0].base_step(k)
        for normals in self._normals[1:]:
            shift = (0.5 * math.sqrt(length)) * normals.base_step(k)
            increments *= 0.5
            halves = np.empty((len(increments), 2, *increments.shape[1:]))
            np.add(increments, shift, out=halves[:, 0])
            np.subtract(increments, shift, out=halves[:, 1])
            increments = halves.reshape(-1, *increments.shape[1:])
            length *= 0.5
        return increments


def path_bytes(modes: int, depth: int) -> int:
    """Memory of one realization of `WienerPaths`: a block of numbers of each generation of halvings."""
    numbers = sum(max(_BLOCK, 1 << max(0, generation - 1)) for generation in range(depth + 1))
    return 8 * modes * numbers


class _Normals:
    """Standard normal numbers of one generation of halvings, a block of base steps at a time.

    Generation 0 has one number for each base step and mode, generation g > 0 has 2^(g-1).  A realization's
    numbers of a block come from one stream, mode after mode.  The last block holds what is left of the K base steps.
    """

    def __init__(
        self,
        places: Places,
        samples: IntArray,
        repeats: IntArray,
        modes: int,
        base_steps: int,
        generation: int,
    ) -> None:
        self._places = places
        self._realizations = list(zip(samples.tolist(), repeats.tolist(), strict=True))
        self._modes, self._base_steps, self._generation = modes, base_steps, generation
        self._per_step = 2 ** max(0, generation - 1)
        self._steps = max(1, _BLOCK // self._per_step)
        self._block = -1
        self._values = np.empty((0, len(samples), modes))

    def base_step(self, k: int) -> FloatArray:
        """Numbers (2^(g-1) or 1, S, m) of base step k: a view, overwritten when another block is asked for."""
        block, step = divmod(k, self._steps)
        if block != self._block:
            self._draw(block)
        return self._values[step * self._per_step : (step + 1) * self._per_step]

    def _draw(self, block: int) -> None:
        steps = min(self._steps, self._base_steps - block * self._steps)
        count = steps * self._per_step
        if len(self._values) != count:
            self._values = np.empty((count, *self._values.shape[1:]))
        of_one = np.empty((self._modes, count))
        normal = self._places.generator.standard_normal
        for row, (sample, repeat) in enumerate(self._realizations):
            self._places.go(self._generation, block, repeat, sample)
            normal(out=of_one)
            self._values[:, row] = of_one.T
        self._block = block


class PathUniforms:
    """Uniform numbers in (0, 1) beside the paths of S realizations, the same for every level of a study.

    Parameters
    ----------
    seed : int
    purpose : str
        Numbers of different purposes are independent, and all are independent of the paths.
    samples, repeats : int arrays (S,)
        Parameter sample and number of the noise path of each realization.
    """

    def __init__(self, seed: int, purpose: str, samples: IntArray, repeats: IntArray) -> None:
        self._places = Places(seed, f"beside the paths: {purpose}")
        self._realizations = list(zip(samples.tolist(), repeats.tolist(), strict=True))
        self._kept: tuple[int, int] = (-1, 0)
        self._values = np.empty((0, 0, 0))

    def base_step(self, k: int, count: int) -> FloatArray:
        """Numbers (count, S) of base step k; the first ones do not depend on the count."""
        block, step = divmod(k, _BLOCK)
        if self._kept != (block, count):
            self._kept = block, count
            self._values = self._draw(0, block, count * _BLOCK).reshape(count, _BLOCK, -1)
        return self._values[:, step]

    def once(self, count: int) -> FloatArray:
        """Numbers (count, S) that belong to no step; the first ones do not depend on the count."""
        return self._draw(1, 0, count)

    def _draw(self, lane: int, block: int, count: int) -> FloatArray:
        raw = np.empty((count, len(self._realizations)), dtype=np.uint64)
        for row, (sample, repeat) in enumerate(self._realizations):
            self._places.go(lane, block, repeat, sample)
            raw[:, row] = self._places.bits.random_raw(count)
        return uniforms(raw)
