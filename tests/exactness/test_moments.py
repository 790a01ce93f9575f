"""Running sums of fields, against exact arithmetic with fractions."""

from __future__ import annotations

from fractions import Fraction
from functools import reduce
from math import sqrt
from operator import add

import numpy as np
import pytest

from aleafield.ensemble.moments import FieldMoments
from aleafield.ensemble.pairs import Pair, pair_product, pair_quotient, pair_square, pair_sum, two_product

ROUNDING = 2.0**-52
DRAWS = np.random.default_rng(3).normal(size=(1000, 1, 3))
PAIR_ERROR = Fraction(1, 2**100)
"""Pairs hold 106 digits; a few operations lose a few of them."""


def moments_in_chunks(fields: np.ndarray, width: int, valid: np.ndarray | None = None) -> FieldMoments:
    """Moments of chunks of a width, added in order."""
    valid = np.ones(len(fields), dtype=bool) if valid is None else valid
    cuts = range(0, len(fields), width)
    return reduce(add, (FieldMoments.of(fields[i : i + width], valid[i : i + width]) for i in cuts))


def exact(fields: np.ndarray) -> tuple[float, float]:
    """Mean and standard deviation of (S,), rounded once."""
    values = [Fraction(float(one)) for one in fields]
    mean = sum(values) / len(values)
    variance = sum((one - mean) ** 2 for one in values) / (len(values) - 1)
    return float(mean), sqrt(variance)


@pytest.mark.parametrize("width", [1000, 8, 256])
def test_equal_fields_have_no_spread(width: int) -> None:
    found = moments_in_chunks(np.full((1000, 1, 3), 0.3), width)
    assert (found.sd == 0.0).all()
    assert (found.mean == 0.3).all()


@pytest.mark.parametrize("spread", [1.0, 1e-6, 1e-9, 1e-14])
@pytest.mark.parametrize("width", [1000, 24])
def test_a_spread_far_below_the_field(spread: float, width: int) -> None:
    """Mean and sd are right to a few roundings of themselves, however small the sd."""
    fields = 1.1 + spread * DRAWS
    found = moments_in_chunks(fields, width)
    for at in range(3):
        mean, sd = exact(fields[:, 0, at])
        assert found.mean[0, at] == pytest.approx(mean, rel=ROUNDING)
        assert found.sd[0, at] == pytest.approx(sd, rel=4 * ROUNDING)


def test_no_bit_depends_on_the_chunks() -> None:
    fields = 1.1 + 1e-9 * DRAWS
    valid = np.random.default_rng(4).uniform(size=1000) > 0.2
    valid[:16] = False
    fields[~valid] = np.nan
    whole = moments_in_chunks(fields, 1000, valid)
    assert whole.count == valid.sum()
    for width in (8, 64, 264):
        found = moments_in_chunks(fields, width, valid)
        assert found.count == whole.count
        assert found.mean.tobytes() == whole.mean.tobytes()
        assert found.sd.tobytes() == whole.sd.tobytes()


def test_none_and_one_sample() -> None:
    fields = np.full((2, 1, 3), 0.7)
    none = FieldMoments.of(fields, np.zeros(2, dtype=bool))
    assert np.isnan(none.mean).all()
    one = none + FieldMoments.of(fields, np.array([False, True]))
    assert (one.mean == 0.7).all()
    assert (one.sd == 0.0).all()


def fractions(pair: Pair) -> list[Fraction]:
    """The numbers that a pair stands for."""
    return [Fraction(float(h)) + Fraction(float(low)) for h, low in zip(*pair, strict=True)]


def test_products_are_exact() -> None:
    a, b = np.random.default_rng(5).normal(size=(2, 50))
    found = fractions(two_product(a, b))
    assert found == [Fraction(float(x)) * Fraction(float(y)) for x, y in zip(a, b, strict=True)]


def test_arithmetic_of_pairs() -> None:
    high = np.random.default_rng(6).normal(size=(2, 50))
    low = 2.0**-54 * high * np.random.default_rng(7).uniform(-1.0, 1.0, size=(2, 50))
    a, b = (high[0], low[0]), (high[1], low[1])
    for found, operation in (
        (pair_product(a, b), lambda x, y: x * y),
        (pair_square(a), lambda x, y: x * x),
        (pair_quotient(a, 7), lambda x, y: x / 7),
    ):
        for one, x, y in zip(fractions(found), fractions(a), fractions(b), strict=True):
            assert abs(one - operation(x, y)) <= PAIR_ERROR * abs(operation(x, y))
    for one, x, y in zip(fractions(pair_sum(a, b)), fractions(a), fractions(b), strict=True):
        assert abs(one - (x + y)) <= PAIR_ERROR * (abs(x) + abs(y))
