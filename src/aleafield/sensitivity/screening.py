"""Screening of many inputs by elementary effects, before indices are computed for those that matter."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import BoolArray, FloatArray
from aleafield.randomness.trajectories import STEP

FIRST_TRAJECTORIES = 3
"""Trajectories before anything is dropped."""
NEGLIGIBLE = 0.05
"""An input is dropped where its mean effect is below this share of the largest."""
AGREE = 2
"""The kept set must come out unchanged this often in a row."""
GROUP_TOTAL = 0.02
"""Upper limit that the total index of all dropped inputs, as one group, must stay below."""


class Screening:
    """Elementary effects as trajectories come in, and the inputs that they keep.

    The mean size of an effect (Campolongo, Cariboni and Saltelli 2007; from memory) is taken per step of the unit
    cube and so carries the law's own spread.  Kept is an input whose mean exceeds NEGLIGIBLE of the largest for any
    output.  Measures that see one input at a time by association (correlations, ranks) miss interactions; they
    never screen.

    Parameters
    ----------
    n_inputs, n_outputs : int
    """

    def __init__(self, n_inputs: int, n_outputs: int) -> None:
        self._sum = np.zeros((n_inputs, n_outputs))
        self._count = np.zeros((n_inputs, n_outputs))
        self._history: list[BoolArray] = []

    def add(self, points: FloatArray, values: FloatArray) -> None:
        """Adds one or more trajectories and notes which inputs are kept with each.

        Parameters
        ----------
        points : float array (r, d + 1, d)
        values : float array (r, d + 1, o)
            NaN where a run gives no value: both steps at that point are left out.
        """
        for walk, outputs in zip(points, values, strict=True):
            changed = np.argmax(np.abs(np.diff(walk, axis=0)), axis=1)
            effect = np.abs(np.diff(outputs, axis=0)) / STEP
            given = np.isfinite(effect)
            self._sum[changed] += np.where(given, effect, 0.0)
            self._count[changed] += given
            self._history.append(self._above())

    def _above(self) -> BoolArray:
        mean = self.mean_effect
        known = np.isfinite(mean)
        largest = np.max(np.where(known, mean, 0.0), axis=0)
        # an input without a single effect cannot be called negligible
        above: BoolArray = (~known | ((mean >= NEGLIGIBLE * largest) & (largest > 0.0))).any(axis=1)
        return above

    @property
    def mean_effect(self) -> FloatArray:
        """Mean of |change of the output| per unit of the coordinate, (d, o); NaN where no effect is known."""
        with np.errstate(invalid="ignore", divide="ignore"):
            mean: FloatArray = self._sum / self._count
        return mean

    @property
    def kept(self) -> BoolArray:
        """Inputs that are not dropped, (d,): kept with any of the last AGREE counts of trajectories."""
        recent = self._history[FIRST_TRAJECTORIES - 1 :][-AGREE:]
        if len(recent) < AGREE:
            return np.ones(len(self._sum), dtype=np.bool_)
        kept: BoolArray = np.logical_or.reduce(recent)
        return kept

    @property
    def settled(self) -> bool:
        """Whether the kept set stayed the same AGREE times in a row, from FIRST_TRAJECTORIES on."""
        recent = self._history[FIRST_TRAJECTORIES - 1 :][-AGREE - 1 :]
        return len(recent) > AGREE and all((one == recent[0]).all() for one in recent)
