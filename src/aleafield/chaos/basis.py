"""Products of the inputs' orthonormal polynomials."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.chaos.germs import Germ


class Basis:
    """Orthonormal polynomials of several independent inputs.

    Parameters
    ----------
    germs : sequence of Germ
        One for each of d inputs.
    indices : int array (terms, d)
        Degrees of each product; the first one is the constant.

    Raises
    ------
    ValueError
        An index exceeds what a germ has, or the first one is not the constant.
    """

    def __init__(self, germs: Sequence[Germ], indices: IntArray) -> None:
        self.germs = tuple(germs)
        self.indices = indices
        if indices.shape[1] != len(self.germs) or indices[0].any():
            raise ValueError("a basis has one column for each germ and the constant as its first term")
        if (indices > [germ.highest for germ in self.germs]).any():
            raise ValueError("a multi-index exceeds the highest degree of a germ")

    def __len__(self) -> int:
        """Number of terms."""
        return len(self.indices)

    def evaluate(self, u: FloatArray) -> FloatArray:
        """All terms at points u (N, d) of the unit cube: (N, terms), stored column by column."""
        values = np.ones((len(self), len(u)))
        for column, germ in enumerate(self.germs):
            degrees = self.indices[:, column]
            used = np.flatnonzero(degrees)
            if len(used):
                table = germ.evaluate(u[:, column], int(degrees.max())).T
                values[used] *= table[degrees[used]]
        return values.T
