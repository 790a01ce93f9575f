"""What every kernel operator promises."""

from __future__ import annotations

from abc import ABC, abstractmethod
from typing import ClassVar

import numpy as np

from aleafield.arrays import FloatArray

UNIT_ROUNDING = float(np.finfo(np.float64).eps) / 2
"""Largest relative error of one floating-point operation."""


class KernelOperator(ABC):
    """Takes weighted sources at Q points to the integral of the kernel at T points, for a whole batch.

    With source_j = weight_j f(u(y_j)) the value at the test point x_i is the sum over j of
    w(x_i, y_j) source_j.  Set-up (kernel values, transforms) is done once for a batch; `apply` is called at
    every stage of every step.

    To add an operator: a subclass with `name`, `rounding` and `apply`, a count of its operations and a branch
    in `choose_operator`; the agreement test of tests/properties compares it with the dense sum.
    """

    name: ClassVar[str]

    @staticmethod
    @abstractmethod
    def rounding(points: int) -> float:
        """Bound of the rounding error of one application.

        An application is wrong by at most this number times (sum of |w| over a row of the kernel matrix)
        times (Euclidean norm of the source).

        Parameters
        ----------
        points : int
            Length of the sums or of the transforms.
        """

    @abstractmethod
    def apply(self, source: FloatArray) -> FloatArray:
        """Values (S, T) of the sources (S, Q).

        A row's bits do not depend on the other rows, and a row that is not finite disturbs no other.
        """


def transform_rounding(length: int) -> float:
    """Bound, in the sense of `KernelOperator.rounding`, of a convolution by three Fourier transforms.

    A transform of length N is wrong by at most eta log2 N in the Euclidean norm, with eta below 7 unit
    roundings; the kernel's, the source's and the inverse transform contribute alike.

    References
    ----------
    Higham 2002, "Accuracy and Stability of Numerical Algorithms", section 24.1 (from memory).
    """
    return 3 * 7 * UNIT_ROUNDING * float(np.log2(max(length, 2)))


def transform_operations(length: int) -> float:
    """Floating-point operations of one real Fourier transform of that length, the usual 2.5 N log2 N."""
    return 2.5 * length * float(np.log2(max(length, 2)))
