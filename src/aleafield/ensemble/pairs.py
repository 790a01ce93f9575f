"""Numbers as unevaluated sums of two floats, about 106 binary digits.

Error-free transformations: Dekker 1971 ("A floating-point technique for extending the available precision"),
Knuth 1969 (The Art of Computer Programming 2, section 4.2.2).
"""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray

Pair = tuple[FloatArray, FloatArray]
"""(high, low): the number is their sum, and low is below the rounding of high."""

_SPLITTER = float(2**27 + 1)


def two_sum(a: FloatArray, b: FloatArray) -> Pair:
    """Sum and its rounding error, exactly (Knuth)."""
    total = a + b
    part = total - a
    return total, (a - (total - part)) + (b - part)


def two_product(a: FloatArray, b: FloatArray) -> Pair:
    """Product and its rounding error, exactly where neither overflows nor underflows (Veltkamp, Dekker)."""
    product = a * b
    (a_high, a_low), (b_high, b_low) = _halves(a), _halves(b)
    return product, a_low * b_low - (((product - a_high * b_high) - a_low * b_high) - a_high * b_low)


def _halves(a: FloatArray) -> Pair:
    """Upper and lower 26 digits (Veltkamp)."""
    scaled = _SPLITTER * a
    high = scaled - (scaled - a)
    return high, a - high


def pair_sum(a: Pair, b: Pair) -> Pair:
    """Sum of two pairs."""
    total, error = two_sum(a[0], b[0])
    tail, tail_error = two_sum(a[1], b[1])
    total, error = two_sum(total, error + tail)
    return two_sum(total, error + tail_error)


def pair_product(a: Pair, b: Pair) -> Pair:
    """Product of two pairs."""
    product, error = two_product(a[0], b[0])
    return two_sum(product, error + (a[0] * b[1] + a[1] * b[0]))


def pair_square(a: Pair) -> Pair:
    """Square of a pair."""
    square = a[0] * a[0]
    high, low = _halves(a[0])
    cross = 2.0 * high
    cross *= low
    error = low * low - ((square - high * high) - cross)
    return two_sum(square, error + 2.0 * a[0] * a[1])


def pair_quotient(a: Pair, count: int) -> Pair:
    """A pair divided by a whole number below 2^53."""
    divisor = np.float64(count)
    high = a[0] / divisor
    product, error = two_product(high, np.full_like(high, divisor))
    low = ((a[0] - product) - error + a[1]) / divisor
    return two_sum(high, low)


def sum_of(values: Pair) -> Pair:
    """Sum of pairs over the first axis, by a tree."""
    high, low = values
    while len(high) > 1:
        if len(high) % 2:
            pad = np.zeros((1, *high.shape[1:]))
            high, low = np.concatenate([high, pad]), np.concatenate([low, pad])
        high, error = two_sum(high[0::2], high[1::2])
        error += low[0::2]
        error += low[1::2]
        low = error
    return two_sum(high[0], low[0])
