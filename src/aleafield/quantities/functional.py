"""Linear functionals of the field."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray


class LinearFunctional:
    """u -> sum of weights times unknowns, with the same bits for a row in every batch.

    Unknowns of weight zero are not looked at.

    Parameters
    ----------
    weights : float array (n,)
    """

    def __init__(self, weights: FloatArray) -> None:
        self.weights = weights
        self._places = np.flatnonzero(weights)
        self._whole = len(self._places) == len(weights)
        self._some = weights[self._places]

    def __call__(self, u: FloatArray) -> FloatArray:
        """Values (S,) of the states u (S, n)."""
        seen = u if self._whole else np.take(u, self._places, axis=1)
        return np.asarray((seen * self._some).sum(axis=-1))
