"""The protocol of a forward model: the one seam between solver and statistics."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Protocol

from aleafield.arrays import FloatArray, IntArray
from aleafield.ensemble.level import Level, PathPart
from aleafield.ensemble.records import Records
from aleafield.randomness.inputs import Input


class ForwardModel(Protocol):
    """Whatever can be evaluated at a level on sample indices.

    Monte Carlo, quasi-Monte Carlo, the error split, pilots, resumption and workers are built on `evaluate`
    alone; none of them knows of kernels, meshes or time steppers.  An implementation must be picklable, and the
    values of a sample must not depend on the other samples of the batch.
    """

    @property
    def inputs(self) -> Sequence[Input]:
        """The uncertain inputs, in the order of the sampling dimensions."""
        ...

    def evaluate(self, level: Level, samples: IntArray, times: Sequence[float] = ()) -> Records:
        """Quantities (and the fields at `times`) of the samples at a level.

        Parameters
        ----------
        level : Level
        samples : int array (S,), S a multiple of 8 where equality to the bit is wanted
        times : model times at which the fields are wanted, increasing
        """
        ...

    def path(self, level: Level) -> tuple[PathPart, ...]:
        """The parts of the discretisation error of a level, each with the levels that measure it."""
        ...

    def operations(self, level: Level) -> float:
        """Floating-point operations for one sample at a level: counted, never timed."""
        ...

    def points(self, level: Level) -> FloatArray:
        """Points at which `Records.fields` stands, increasing, shape (n,)."""
        ...
