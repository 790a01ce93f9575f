"""What observers of a noisy field may know of its noise."""

from __future__ import annotations

from typing import Protocol

from aleafield.arrays import FloatArray


class UniformSource(Protocol):
    """Uniform numbers in (0, 1) beside the paths of a batch: functions of path and place, the same at every level."""

    def base_step(self, k: int, count: int) -> FloatArray:
        """Those of base step k, (count, S): one for each of its finest sub-steps, in time order."""
        ...

    def once(self, count: int) -> FloatArray:
        """Numbers (count, S) drawn once for each path, independent of those of the steps."""
        ...


class NoisyPaths(Protocol):
    """The noise of a batch at a level.

    All levels share base steps, the doubled steps of a study.  Each is cut into `sub_steps` equal parts, the
    finest that any level of the error split sees, and into `steps_per_base` steps of this level.
    """

    @property
    def sub_steps(self) -> int:
        """Finest sub-steps of a base step."""
        ...

    @property
    def steps_per_base(self) -> int:
        """Steps of this level in a base step."""
        ...

    def along(self, functional: FloatArray) -> FloatArray:
        """Weights (m,) or (S, m) of the modes' increments in those of a linear functional (n,) of the field."""
        ...

    def uniforms(self, name: str) -> UniformSource:
        """The uniform numbers of that name, of a functional and a kind of extreme."""
        ...
