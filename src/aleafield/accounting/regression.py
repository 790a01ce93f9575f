"""The difference between two levels as a smooth function of the quantity."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from aleafield.accounting.order import root_mean_square
from aleafield.arrays import FloatArray
from aleafield.estimates.blocks import BlockArray, normal, student

Shift = Callable[[FloatArray], FloatArray]
"""From values of a quantity or a margin (k,) to what is taken off them, value by value."""
LEAST_FOR_SQUARE = 8
LEAST_FOR_SLOPE = 5
USUAL_CONFIDENCE = 0.95
"""Residual standard deviations stand for the noise of a regression up to this confidence, as measured."""


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
    covariance : float array (k, k) or None
        Of the coefficients, from the residuals of each block together (Liang and Zeger 1986, from memory); None
        where it is not asked for, or blocks are too few to give it.
    degrees : int
        Degrees of freedom of `covariance`.
    """

    coefficients: FloatArray
    centre: float
    scale: float
    residual: float
    covariance: FloatArray | None = None
    degrees: int = 0

    def __call__(self, quantity: FloatArray) -> FloatArray:
        """The expected difference at values of the quantity (S,)."""
        z = (quantity - self.centre) / self.scale
        fit = np.full_like(z, self.coefficients[-1])
        for coefficient in self.coefficients[-2::-1]:
            fit *= z
            fit += coefficient
        return fit

    def half_width(self, confidence: float, finite: float) -> Shift:
        """What the fit may be off by either way, as a function of the quantity.

        With a covariance t standard errors of the regression mean, times `finite` for probes that are much of the
        sample; otherwise the residual standard deviation, which stands for the noise of a regression at
        confidences up to USUAL_CONFIDENCE (as measured), in proportion to the normal quantile above.
        """
        covariance = self.covariance
        if covariance is None:
            constant = self.residual * max(1.0, normal(confidence) / normal(USUAL_CONFIDENCE))
            return lambda values: np.full(values.shape, constant)
        width = student(confidence, self.degrees) * finite

        def at(values: FloatArray) -> FloatArray:
            powers = np.vander((values - self.centre) / self.scale, len(covariance), increasing=True)
            square = np.einsum("ij,jk,ik->i", powers, covariance, powers)
            error: FloatArray = width * np.sqrt(np.maximum(square, 0.0))
            return error

        return at


def fit_differences(
    quantity: FloatArray,
    difference: FloatArray,
    centre: float,
    scale: float,
    everything: bool,
    *,
    independent: int | None = None,
    block: BlockArray | None = None,
) -> DifferenceFit:
    """Least squares of the difference on the quantity.

    Parameters
    ----------
    quantity, difference : float arrays (k,), k >= 1
        Values of the run and differences on the probes.
    centre, scale : float
    everything : bool
        The probes are all there is (a certain quantity): a fit through them leaves nothing unknown.
    independent : int or None
        How many of the probes count; None for all of them.
    block : int array (k,) or None
        Independent block of each probe; given where the covariance is asked for.

    Returns
    -------
    DifferenceFit
        Quadratic from 8 probes that count, linear from 5, else constant.  With no degree of freedom left the
        residual is the root mean square of the differences; it is infinite where double precision overflows.
    """
    scale = scale if scale > 0.0 else 1.0
    k = len(quantity)
    count = k if independent is None else independent
    degree = 2 if count >= LEAST_FOR_SQUARE else 1 if count >= LEAST_FOR_SLOPE else 0
    with np.errstate(all="ignore"):
        powers = np.vander((quantity - centre) / scale, degree + 1, increasing=True)
    if not (np.isfinite(powers).all() and np.isfinite(difference).all()):
        return DifferenceFit(np.zeros(1), 0.0, 1.0, np.inf)
    solution, _, rank, _ = np.linalg.lstsq(powers, difference, rcond=None)
    coefficients = np.asarray(solution, dtype=np.float64)
    left = difference - powers @ coefficients
    if k > rank:
        residual = float(np.sqrt(left @ left / (k - rank)))
    else:
        residual = 0.0 if everything else root_mean_square(difference)
    covariance, degrees = None, 0
    if block is not None and not everything:
        covariance, degrees = _covariance(powers, left, block, int(rank))
    return DifferenceFit(coefficients, centre, scale, residual, covariance, degrees)


def _covariance(
    powers: FloatArray, left: FloatArray, block: BlockArray, rank: int
) -> tuple[FloatArray | None, int]:
    """Covariance of least-squares coefficients from residuals that depend on each other within blocks."""
    blocks, index = np.unique(block, return_inverse=True)
    n, k = len(blocks), len(left)
    if n <= rank or k <= rank:
        return None, 0
    score = np.zeros((n, powers.shape[1]))
    np.add.at(score, index, powers * left[:, None])
    bread = np.linalg.pinv(powers.T @ powers)
    correction = n / (n - 1) * (k - 1) / (k - rank)
    return correction * (bread @ (score.T @ score) @ bread), n - rank
