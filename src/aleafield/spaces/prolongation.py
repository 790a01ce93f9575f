"""Values of a space's elements at fixed points: the set-up is done once, the batch passes many times."""

from __future__ import annotations

from abc import ABC, abstractmethod

import numpy as np

from aleafield.arrays import FloatArray, IntArray, batch_product


class Prolongation(ABC):
    """Linear map from the unknowns of a batch to values at fixed points.

    To add one: a subclass with `apply`, chosen in the space's `_prolongation_to`.

    Attributes
    ----------
    name : str
        How it works, for reports.
    """

    name: str

    @abstractmethod
    def apply(self, u: FloatArray) -> FloatArray:
        """Values at the points.

        Parameters
        ----------
        u : float array (S, n)
            Unknowns, one sample a row.  For a width S that is a multiple of 8 the bits of a row's values
            do not depend on the other rows.

        Returns
        -------
        float array (S, P)
        """


class IdentityProlongation(Prolongation):
    """The points are the nodes, the unknowns the values there; `apply` returns its argument, not a copy."""

    name = "identity"

    def apply(self, u: FloatArray) -> FloatArray:
        """The unknowns themselves."""
        return u


class DenseProlongation(Prolongation):
    """Product with an evaluation matrix (P, n)."""

    name = "dense"

    def __init__(self, matrix: FloatArray) -> None:
        self._transposed = np.ascontiguousarray(matrix.T)

    def apply(self, u: FloatArray) -> FloatArray:
        """Rows of u times the transposed matrix."""
        return batch_product(u, self._transposed)


class GatherProlongation(Prolongation):
    """Weighted mean of two unknowns for each point: linear interpolation.

    Parameters
    ----------
    left, right : int array (P,)
        Indices of the two unknowns.
    fraction : float array (P,)
        Weight of the right one, in [0, 1]; 0 and 1 reproduce an unknown to the bit.
    """

    name = "gather"

    def __init__(self, left: IntArray, right: IntArray, fraction: FloatArray) -> None:
        self._left, self._right = left, right
        self._of_left, self._of_right = 1.0 - fraction, fraction

    def apply(self, u: FloatArray) -> FloatArray:
        """Two gathers and their weighted sum."""
        values = np.take(u, self._left, axis=1)
        values *= self._of_left
        other = np.take(u, self._right, axis=1)
        other *= self._of_right
        values += other
        return values
