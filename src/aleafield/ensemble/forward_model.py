"""The protocol of a forward model: the one seam between solver and statistics."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Protocol

from aleafield.arrays import FloatArray, IntArray
from aleafield.ensemble.level import Level, PathPart
from aleafield.ensemble.records import Records
from aleafield.randomness.families import Family
from aleafield.randomness.inputs import Input


class ForwardModel(Protocol):
    """Whatever can be evaluated at a level on realizations.

    A realization is a parameter sample with one noise path: number j is path j mod R of sample j // R, R the
    number of `repeats`.  Without repeats realizations and samples are the same.

    Besides the main sample there are families of further runs, numbered by themselves.  Under noise there is only
    the main one.

    Monte Carlo, quasi-Monte Carlo, the error split, pilots, resumption and workers are built on `evaluate`
    alone; none of them knows of kernels, meshes or time steppers.  An implementation must be picklable, and the
    values of a realization must not depend on the others of the batch.  Noise paths are shared by all levels.
    """

    @property
    def inputs(self) -> Sequence[Input]:
        """The uncertain inputs, in the order of the sampling dimensions."""
        ...

    @property
    def repeats(self) -> int:
        """Noise paths of each parameter sample; 1 without repeats, and without noise."""
        ...

    def evaluate(
        self, level: Level, realizations: IntArray, times: Sequence[float] = (), family: Family = "main"
    ) -> Records:
        """Quantities (and fields and histories at `times`) of the realizations at a level.

        Parameters
        ----------
        level : Level
        realizations : int array (S,), S a multiple of 8 where equality to the bit is wanted
        times : model times at which fields and histories are wanted, increasing
        family : the family whose numbers the realizations are
        """
        ...

    def path(self, level: Level) -> tuple[PathPart, ...]:
        """The parts of the discretisation error of a level, each with the levels that measure it."""
        ...

    def operations(self, level: Level) -> float:
        """Floating-point operations for one realization at a level: counted, never timed."""
        ...

    def points(self, level: Level) -> FloatArray:
        """Points at which `Records.fields` stands, increasing, shape (n,)."""
        ...
