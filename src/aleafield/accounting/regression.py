"""The difference between two levels as a smooth function of the quantity."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from aleafield.accounting.order import root_mean_square
from aleafield.arrays import FloatArray

Shift = Callable[[FloatArray], FloatArray]
"""From values of a quantity or a margin (k,) to what is taken off them, value by value."""
LEAST_FOR_SQUARE = 8
LEAST_FOR_SLOPE = 5


@dataclass(frozen=True, eq=False)
class DifferenceFit:
    """D regressed on 1, z, z^2 with z = (Q - centre) / scale.

    Attributes
    ----------
    coefficients : float array (1 to 3,)
    centre, scale : float
        Mean and standard deviation of the quantity over the whole sample; scale 1 where that is 0.
    residual : float
        Standard deviation of what the regression leaves, in the units of the quantity.
    """

    coefficients: FloatArray
    centre: float
    scale: float
    residual: float

    def __call__(self, quantity: FloatArray) -> FloatArray:
        """The expected difference at values of the quantity (S,)."""
        z = (quantity - self.centre) / self.scale
        fit = np.full_like(z, self.coefficients[-1])
        for coefficient in self.coefficients[-2::-1]:
            fit *= z
            fit += coefficient
        return fit


def fit_differences(
    quantity: FloatArray, difference: FloatArray, centre: float, scale: float, everything: bool
) -> DifferenceFit:
    """Least squares of the difference on the quantity.

    Parameters
    ----------
    quantity, difference : float arrays (k,), k >= 1
        Values of the run and differences on the probes.
    centre, scale : float
    everything : bool
        The probes are all there is (a certain quantity): a fit through them leaves nothing unknown.

    Returns
    -------
    DifferenceFit
        Quadratic from 8 probes, linear from 5, else constant.  With no degree of freedom left the residual is
        the root mean square of the differences.
    """
    scale = scale if scale > 0.0 else 1.0
    k = len(quantity)
    degree = 2 if k >= LEAST_FOR_SQUARE else 1 if k >= LEAST_FOR_SLOPE else 0
    powers = np.vander((quantity - centre) / scale, degree + 1, increasing=True)
    solution, _, rank, _ = np.linalg.lstsq(powers, difference, rcond=None)
    coefficients = np.asarray(solution, dtype=np.float64)
    left = difference - powers @ coefficients
    if k > rank:
        residual = float(np.sqrt(left @ left / (k - rank)))
    else:
        residual = 0.0 if everything else root_mean_square(difference)
    return DifferenceFit(coefficients, centre, scale, residual)
