"""Noise that is given in full, and fields that it drives by Euler-Maruyama: what bridged observers are shown."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.quantities import Quantity
from aleafield.spaces import Space
from aleafield.stepping.view import AnyStep, NoisyStep
from tests.exactness.trajectories import Result, show


@dataclass(frozen=True)
class GivenNoise:
    """Noise of S paths over K base steps, at one level.

    Attributes
    ----------
    increments : float array (K, P, S, m)
        Of the modes' Wiener processes over the P finest sub-steps of each base step.
    uniform : float array (K, P, S)
    draws : float array (2, S)
    modes : float array (m, n)
        What a unit increment of each mode adds to the unknowns.
    base_length : float
    steps_per_base : int
        Steps of the level in a base step.
    """

    increments: FloatArray
    uniform: FloatArray
    draws: FloatArray
    modes: FloatArray
    base_length: float
    steps_per_base: int = 1

    @classmethod
    def random(
        cls, seed: int, shape: tuple[int, int, int], modes: FloatArray, base_length: float
    ) -> GivenNoise:
        """Independent increments and uniform numbers; the shape is (K, P, S)."""
        rng = np.random.default_rng(seed)
        size = np.sqrt(base_length / shape[1])
        increments = size * rng.standard_normal((*shape, len(modes)))
        return cls(increments, rng.random(shape), rng.random((2, shape[2])), modes, base_length)

    @property
    def sub_steps(self) -> int:
        """P, finest sub-steps of a base step."""
        return self.increments.shape[1]

    def along(self, functional: FloatArray) -> FloatArray:
        """Weights of the modes in a functional of the unknowns."""
        return self.modes @ functional

    def uniforms(self, name: str) -> GivenNoise:
        """The uniform numbers, the same for all quantities."""
        return self

    def base_step(self, k: int, count: int) -> FloatArray:
        """Those of a base step."""
        assert count == self.sub_steps
        return self.uniform[k]

    def once(self, count: int) -> FloatArray:
        """Those drawn once."""
        return self.draws[:count]

    def of(self, rows: IntArray) -> GivenNoise:
        """The noise of a choice of paths."""
        return replace(
            self,
            increments=self.increments[:, :, rows],
            uniform=self.uniform[:, :, rows],
            draws=self.draws[:, rows],
        )

    def at_level(self, steps_per_base: int) -> GivenNoise:
        """The same noise with other steps."""
        return replace(self, steps_per_base=steps_per_base)

    def steps(self, start: FloatArray, drift: Callable[[FloatArray], FloatArray]) -> list[AnyStep]:
        """Euler-Maruyama steps from the unknowns start (S, n)."""
        parts, length = self.sub_steps // self.steps_per_base, self.base_length / self.steps_per_base
        states, steps = [start], []
        for index in range(len(self.increments) * self.steps_per_base):
            base, place = divmod(index, self.steps_per_base)
            increments = self.increments[base, place * parts : (place + 1) * parts]
            u = states[-1]
            noise = (increments.sum(axis=0)[:, :, None] * self.modes).sum(axis=1)
            states.append(u + length * drift(u) + noise)
            steps.append(NoisyStep(index * length, u, (index + 1) * length, states[-1], index, increments))
        return [*steps]


def under_noise(quantity: Quantity, space: Space, noise: GivenNoise, steps: list[AnyStep]) -> Result:
    """The result of a quantity that is told of the noise of the steps it is shown."""
    observer = quantity.observer(space, steps[-1].t1, noise)
    show([observer], steps)
    return observer.result()
