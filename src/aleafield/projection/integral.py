"""The integral term: unknowns of a batch -> unknowns of P_n of the integral of w f(u)."""

from __future__ import annotations

from abc import ABC, abstractmethod

import numpy as np

from aleafield.arrays import FloatArray, batch_product
from aleafield.field.kernels import Connectivity, CosineKernel
from aleafield.field.parameter import bound, per_sample
from aleafield.field.rates import Rate, StepRate
from aleafield.geometry import Domain
from aleafield.operators import KernelOperator, cosine_orders
from aleafield.projection.restriction import Restriction
from aleafield.quadrature import Rule, active_moments, crossing_weights
from aleafield.spaces import Prolongation


class Sources(ABC):
    """Weighted sources at the quadrature points from the field's values there."""

    @abstractmethod
    def of(self, values: FloatArray) -> FloatArray:
        """Sources (S, Q) of values (S, Q), which stay as they are."""


class RateSources(Sources):
    """The rate times the weights of a rule."""

    def __init__(self, rate: Rate, weights: FloatArray) -> None:
        self._rate, self._weights = rate, weights

    def of(self, values: FloatArray) -> FloatArray:
        """weight_j f(u_j)."""
        sources = self._rate(values)
        sources *= self._weights
        return sources


class CrossingSources(Sources):
    """A step rate: weights that integrate over the active set, its crossings resolved between the points."""

    def __init__(self, rate: StepRate, spacing: float, periodic: bool) -> None:
        self._rate, self._spacing, self._periodic = rate, spacing, periodic

    def of(self, values: FloatArray) -> FloatArray:
        """The rule of the active set times the maximum rate."""
        threshold = bound(self._rate.threshold)
        sources = crossing_weights(values, threshold, self._spacing, self._periodic)
        sources *= per_sample(self._rate.maximum, 1)
        return sources


class IntegralTerm(ABC):
    """P_n of the integral of w(x, y) f(u(y)) dy for a batch."""

    @abstractmethod
    def of(self, u: FloatArray) -> FloatArray:
        """A fresh array (S, n) for the unknowns u (S, n)."""


class SampledIntegral(IntegralTerm):
    """Values at the points, sources, kernel operator, projection.

    Parameters
    ----------
    prolongation : from unknowns to values at the quadrature points
    sources : Sources
    operator : KernelOperator
    restriction : Restriction or None
        None where the operator's matrix holds the projection already.
    """

    def __init__(
        self,
        prolongation: Prolongation,
        sources: Sources,
        operator: KernelOperator,
        restriction: Restriction | None,
    ) -> None:
        self._prolongation = prolongation
        self._sources = sources
        self._operator = operator
        self._restriction = restriction

    def of(self, u: FloatArray) -> FloatArray:
        """One application of the operator."""
        values = self._operator.apply(self._sources.of(self._prolongation.apply(u)))
        return values if self._restriction is None else self._restriction.apply(values)


class ClosedIntegral(IntegralTerm):
    """Step rate under cosine kernels: the integral between the threshold crossings is a difference of sines.

    Parameters
    ----------
    prolongation : from unknowns to values at the points between which crossings are sought
    rule : Rule
        Those points, equally spaced.
    rate : StepRate
    kernel : Connectivity
        Bound; all parts are CosineKernel.
    domain : Interval or Ring
    test_points : float array (T,)
    restriction : Restriction
    """

    def __init__(
        self,
        prolongation: Prolongation,
        rule: Rule,
        rate: StepRate,
        kernel: Connectivity,
        domain: Domain,
        test_points: FloatArray,
        restriction: Restriction,
    ) -> None:
        assert rule.spacing is not None
        self._prolongation, self._rule, self._rate, self._domain = prolongation, rule, rate, domain
        self._spacing = rule.spacing
        orders = cosine_orders(kernel)
        self._wavenumbers = np.asarray(2 * np.pi / domain.length * np.arange(orders), dtype=np.float64)
        self._coefficients = [_coefficient(kernel, k) for k in range(orders)]
        phases = self._wavenumbers[:, None] * test_points
        self._waves = restriction.apply(np.concatenate((np.cos(phases), np.sin(phases))))

    def of(self, u: FloatArray) -> FloatArray:
        """Moments of the active set, times the coefficients, times the waves."""
        values = self._prolongation.apply(u)
        threshold = bound(self._rate.threshold)
        moments = active_moments(
            values, self._rule.points, threshold, self._spacing, self._domain, self._wavenumbers
        )
        orders = len(self._wavenumbers)
        amplitudes = np.concatenate(moments, axis=1)
        for k, coefficient in enumerate(self._coefficients):
            amplitudes[:, k] *= coefficient
            amplitudes[:, orders + k] *= coefficient
        amplitudes *= per_sample(self._rate.maximum, 1)
        return batch_product(amplitudes, self._waves)


def _coefficient(kernel: Connectivity, k: int) -> float | FloatArray:
    """Sum over the parts of the coefficient of cos(2 pi k (x - y) / length); float or (S,)."""
    total: float | FloatArray = 0.0
    for part in kernel.parts.values():
        assert isinstance(part, CosineKernel)
        if k < len(part.coefficients):
            total = total + bound(part.coefficients[k])
    return total
