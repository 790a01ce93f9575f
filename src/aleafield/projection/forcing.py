"""Noise in X_n: the modes projected once for a level, and what a batch's increments do to its unknowns."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray, batch_product
from aleafield.field.noise import Noise, mode_functions
from aleafield.field.parameter import Bound, per_sample
from aleafield.projection.orthogonal import projected_modes
from aleafield.projection.restriction import Restriction
from aleafield.spaces import Space


class Forcing:
    """(sigma / tau) P_n dW of a batch, from increments of the modes' Wiener processes.

    Parameters
    ----------
    amplitude : float array (m,) or (S, m)
        (sigma / tau) sqrt(q_j), units of activity times the root of a length over that of a time.
    matrix : float array (m, n)
        Unknowns of the projected modes.
    """

    def __init__(self, amplitude: FloatArray, matrix: FloatArray) -> None:
        self._amplitude, self._matrix = amplitude, matrix

    def apply(self, increments: FloatArray) -> FloatArray:
        """Increments (S, n) of the unknowns from those of the modes (S, m); a row's bits are its own."""
        return batch_product(increments * self._amplitude, self._matrix)

    def along(self, functional: FloatArray) -> FloatArray:
        """Weights (m,) or (S, m): a linear functional (n,) of `apply(dW)` is (dW * weights).sum(-1)."""
        return np.asarray(self._amplitude * (self._matrix * functional).sum(axis=-1))


class NoiseProjection:
    """The modes of a level, projected.

    A covariance that is a function is projected like the drive: sampled at the test points, which is
    interpolation or the discrete inner products of the method.  White noise has no values at points; its modes
    are projected orthogonally in L2 whatever the method.

    Parameters
    ----------
    space : Space
    test_points : float array (T,)
    restriction : Restriction
    modes : int
    length : float
        Of the ring whose modes they are, units of length.
    white : bool

    Attributes
    ----------
    matrix : float array (modes, n)
        Unknowns of P_n of each mode.
    """

    def __init__(
        self,
        space: Space,
        test_points: FloatArray,
        restriction: Restriction,
        modes: int,
        length: float,
        white: bool,
    ) -> None:
        self.modes, self.length = modes, length
        if white:
            matrix = projected_modes(space, modes, length)
        else:
            matrix = restriction.apply(mode_functions(test_points, modes, length))
        self.matrix = np.ascontiguousarray(matrix)

    def forcing(self, noise: Noise, time_constant: Bound) -> Forcing:
        """The forcing of a batch.

        Parameters
        ----------
        noise : Noise
            Bound.
        time_constant : float or array (S,)
        """
        amplitude = noise.amplitudes(self.modes, self.length) / per_sample(time_constant, 1)
        return Forcing(np.asarray(amplitude), self.matrix)
