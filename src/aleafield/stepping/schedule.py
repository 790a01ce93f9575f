"""Schedules: the steps of a study, fixed once and shared by all samples."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from itertools import pairwise
from typing import Self

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError

_SAME = 1e-12
"""Times closer than this share of the duration are one."""
_WHOLE = 1e-9
"""Share of a double step by which a span may exceed a whole number of them: 0.6 / 0.2 is 3, not 4."""


@dataclass(frozen=True)
class Schedule:
    """Equal steps between fixed times.

    Attributes
    ----------
    fixed : tuple of float
        Increasing, from 0 to the duration: times of quantities and switches, units of time.
    counts : tuple of int
        Steps of each span between neighbouring fixed times.
    """

    fixed: tuple[float, ...]
    counts: tuple[int, ...]

    @classmethod
    def through(cls, times: Iterable[float], time_step: float, duration: float) -> Self:
        """The schedule of level 0: each span has 2 ceil(span / (2 time_step)) equal steps.

        The count is even, so that the doubled step is a level too.

        Parameters
        ----------
        times : fixed times within [0, duration], any order; 0 and the duration are added
        time_step : largest step, units of time, positive
        duration : positive

        Raises
        ------
        InputError
            Where the step or the duration is not positive, or a time lies outside the run.
        """
        for key, value in (("scheme.time_step", time_step), ("dynamics.duration", duration)):
            if not (math.isfinite(value) and value > 0):
                raise InputError(key, f"{value}", "a positive finite number is needed")
        fixed = [0.0]
        for time in sorted(times):
            if not 0 <= time <= duration * (1 + _SAME):
                raise InputError("time", f"{time}", f"a time between 0 and the duration {duration} is needed")
            if time - fixed[-1] > _SAME * duration and duration - time > _SAME * duration:
                fixed.append(float(time))
        fixed.append(float(duration))
        counts = tuple(
            2 * max(1, math.ceil((end - start) / (2 * time_step) - _WHOLE)) for start, end in pairwise(fixed)
        )
        return cls(tuple(fixed), counts)

    def refined(self, halvings: int) -> Self:
        """Every step halved that often; -1 joins two steps into one.

        Raises
        ------
        InputError
            For halvings below -1, or -1 of a schedule with an odd count.
        """
        if halvings >= 0:
            return type(self)(self.fixed, tuple(count * 2**halvings for count in self.counts))
        if halvings < -1 or any(count % 2 for count in self.counts):
            raise InputError(
                "scheme.time_step", f"{-halvings} doublings of the step", "only one doubling is a level"
            )
        return type(self)(self.fixed, tuple(count // 2 for count in self.counts))

    def __len__(self) -> int:
        """Number of steps."""
        return sum(self.counts)

    @property
    def times(self) -> FloatArray:
        """All times, increasing, shape (steps + 1,); the fixed ones to the bit."""
        spans = [
            start + (end - start) * (np.arange(count) / count)
            for start, end, count in zip(self.fixed, self.fixed[1:], self.counts, strict=False)
        ]
        return np.concatenate([*spans, [self.fixed[-1]]])

    @property
    def base_lengths(self) -> FloatArray:
        """Lengths of the doubled steps of this schedule of level 0, in time order: noise paths are built on them."""
        doubled = self.refined(-1)
        spans = np.diff(np.asarray(doubled.fixed))
        return np.repeat(spans / doubled.counts, doubled.counts)

    @property
    def longest(self) -> float:
        """Length of the longest step."""
        spans = zip(self.fixed, self.fixed[1:], self.counts, strict=False)
        return max((end - start) / count for start, end, count in spans)
