"""Kernel matrices: one for the whole batch, or one for every sample."""

from __future__ import annotations

from typing import ClassVar

import numpy as np

from aleafield.arrays import FloatArray, batch_product
from aleafield.operators.operator import UNIT_ROUNDING, KernelOperator


class SharedDenseOperator(KernelOperator):
    """One matrix for all samples: a product of two matrices.

    Parameters
    ----------
    matrix : float array (T, Q)
    """

    name: ClassVar[str] = "shared dense"

    def __init__(self, matrix: FloatArray) -> None:
        self._transposed = np.ascontiguousarray(matrix.T)

    @staticmethod
    def rounding(points: int) -> float:
        """Sum of `points` products in any order."""
        return points * UNIT_ROUNDING

    def apply(self, source: FloatArray) -> FloatArray:
        """Rows of the source times the transposed matrix."""
        return batch_product(source, self._transposed)


class SampleDenseOperator(KernelOperator):
    """A matrix for every sample: a batch of products of a matrix and a vector.

    Parameters
    ----------
    matrices : float array (S, T, Q)
    """

    name: ClassVar[str] = "dense per sample"

    def __init__(self, matrices: FloatArray) -> None:
        self._matrices = np.ascontiguousarray(matrices)

    @staticmethod
    def rounding(points: int) -> float:
        """Sum of `points` products in any order."""
        return points * UNIT_ROUNDING

    def apply(self, source: FloatArray) -> FloatArray:
        """Each matrix times its own source."""
        return np.asarray(np.matmul(self._matrices, source[:, :, None]))[:, :, 0]
