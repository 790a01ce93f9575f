"""Indices of fields: maps over nodes and times, and one number for the whole."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.sensitivity.ratios import Indices, Ratios


@dataclass(frozen=True, eq=False)
class FieldIndices:
    """Indices of a field, or of a quantity at several times.

    Attributes
    ----------
    value, low, high : float arrays (k, *shape)
        Maps; NaN where nothing is stated, as where the field does not vary.
    aggregated : Indices
        (k, 1), the whole field: every place weighted by its variance and by its share of the domain.
    """

    value: FloatArray
    low: FloatArray
    high: FloatArray
    aggregated: Indices


def field_indices(
    ratios: Ratios, shape: tuple[int, ...], weights: FloatArray, confidence: float
) -> FieldIndices:
    """Maps and the aggregated index from data at hand or from an exchange.

    Parameters
    ----------
    ratios : Ratios
        With prod(shape) outputs in C order, as (times, nodes).
    shape : tuple of int
    weights : float array that broadcasts to shape
        Of a quadrature rule over the nodes (and of the times).
    confidence : float in (0, 1)
    """
    every = ratios.indices(confidence)
    weight = np.ascontiguousarray(np.broadcast_to(weights, shape)).reshape(-1)
    whole = ratios.aggregated(weight).indices(confidence)

    def as_map(values: FloatArray) -> FloatArray:
        return values.reshape(-1, *shape)

    return FieldIndices(as_map(every.value), as_map(every.low), as_map(every.high), whole)


def aggregated_index(index: FloatArray, variance: FloatArray, weights: FloatArray) -> FloatArray:
    """The aggregated index where indices are known without blocks, as from an expansion.

    sum of weights variance index over sum of weights variance.

    Parameters
    ----------
    index : float array (k, o)
    variance, weights : float arrays (o,)

    Returns
    -------
    float array (k,)
        NaN where no output varies.
    """
    by_variance = weights * variance
    total = by_variance.sum()
    if not total > 0.0:
        return np.full(len(index), np.nan)
    aggregated: FloatArray = np.where(by_variance > 0.0, index, 0.0) @ by_variance / total
    return aggregated
