"""The noise of a batch: its paths, and what quantities may know of them."""

from __future__ import annotations

from aleafield.arrays import FloatArray, IntArray
from aleafield.projection.forcing import Forcing
from aleafield.randomness.wiener import PathUniforms, WienerPaths
from aleafield.stepping.schedule import Schedule


class BatchNoise:
    """Paths of a batch at a level, and the uniform numbers that bridges inside their steps need.

    Parameters
    ----------
    forcing : Forcing
        From increments of the modes to those of the unknowns.
    seed : int
    samples, repeats : int arrays (S,)
        Parameter sample and number of the noise path of each realization.
    modes : int
    schedule : Schedule
        Of the study, not halved; the steps that its doubled step has are the base of every path.
    halvings : int
        Of the level.
    depth : int
        How often the paths halve a base step: as often as the finest level that sees the same bridges.

    Attributes
    ----------
    paths : WienerPaths
    sub_steps, steps_per_base : int
        Of a base step: the finest parts of the paths, and the steps of this level.
    """

    def __init__(
        self,
        forcing: Forcing,
        seed: int,
        samples: IntArray,
        repeats: IntArray,
        modes: int,
        schedule: Schedule,
        halvings: int,
        depth: int,
    ) -> None:
        self._forcing = forcing
        self._seed, self._samples, self._repeats = seed, samples, repeats
        self.sub_steps = 2**depth
        self.steps_per_base = 2 ** (halvings + 1)
        self.paths = WienerPaths(seed, samples, repeats, modes, schedule.base_lengths, depth)

    def along(self, functional: FloatArray) -> FloatArray:
        """Weights (m,) or (S, m) of the modes' increments in those of a linear functional (n,) of the field."""
        return self._forcing.along(functional)

    def uniforms(self, name: str) -> PathUniforms:
        """The uniform numbers of a functional and a kind of extreme, the same at every level."""
        return PathUniforms(self._seed, f"bridges: {name}", self._samples, self._repeats)
