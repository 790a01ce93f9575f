"""Noise given in full: one impulse at a time, or paths that a reference solution follows too."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.randomness.wiener import WienerPaths


class Impulses:
    """One realization for every step and mode, in which that increment is 1 and all others are 0.

    The end of a linear field from rest is a sum over independent increments of variance `step`, so that its covariance
    is the sum of products of these responses, times the step: no sampling noise enters.
    """

    def increments(self, steps: int, modes: int, duration: float) -> FloatArray:
        """Shape (steps, steps * modes, modes)."""
        return np.eye(steps * modes).reshape(steps, modes, -1).transpose(0, 2, 1).copy()

    def observed(self, fields: FloatArray, step: float) -> FloatArray:
        """Covariance (1, P) of the values at all points with that at the first one."""
        return np.asarray(step * (fields * fields[:, :1]).sum(axis=0, keepdims=True))


@dataclass(frozen=True)
class CosinePaths:
    """Wiener paths of the cosine of wave number 1 alone; the same whatever the number of steps.

    Parameters
    ----------
    realizations : int
    depth : int
        The run has 2^depth increments.
    seed : int
    """

    realizations: int
    depth: int
    seed: int

    def path(self, duration: float) -> FloatArray:
        """Its increments, (2^depth, realizations)."""
        numbers = np.arange(self.realizations)
        one = np.zeros_like(numbers)
        paths = WienerPaths(self.seed, numbers, one, 1, np.array([duration]), self.depth)
        return paths.base_step(0)[:, :, 0]

    def increments(self, steps: int, modes: int, duration: float) -> FloatArray:
        """Shape (2^depth, realizations, modes)."""
        found = np.zeros((2**self.depth, self.realizations, modes))
        found[:, :, 1] = self.path(duration)
        return found

    def observed(self, fields: FloatArray, step: float) -> FloatArray:
        """The fields themselves."""
        return fields
