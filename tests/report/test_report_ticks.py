"""Ticks: round, inside, evenly spaced, about as many as wanted."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from aleafield.report.ticks import round_step, tick_labels, ticks


@pytest.mark.parametrize(
    ("low", "high", "wanted", "expected"),
    [
        (0.0, 1.0, 5, [0.0, 0.2, 0.4, 0.6, 0.8, 1.0]),
        (-10.0, 10.0, 5, [-10.0, -5.0, 0.0, 5.0, 10.0]),
        (0.13, 0.31, 4, [0.15, 0.2, 0.25, 0.3]),
        (1e6, 3e6, 2, [1e6, 2e6, 3e6]),
        (2e-8, 9e-8, 3, [2e-8, 4e-8, 6e-8, 8e-8]),
    ],
)
def test_ticks_by_hand(low: float, high: float, wanted: int, expected: list[float]) -> None:
    assert ticks(low, high, wanted) == expected


@given(st.floats(-1e6, 1e6), st.floats(1e-3, 1e6), st.integers(2, 12))
def test_ticks_are_round_and_inside(low: float, span: float, wanted: int) -> None:
    """Exact rational arithmetic: multiples of one step of 1, 2 or 5 times a power of ten."""
    high = low + span
    found = ticks(low, high, wanted)
    step = Fraction(str(round_step(high - low, wanted)))
    digits = str(step.numerator * 10**12 // step.denominator).rstrip("0")
    assert digits in ("1", "2", "5")
    slack = 1e-6 * span
    assert all(low - slack <= value <= high + slack for value in found)
    assert all(Fraction(repr(value)) % step == 0 for value in found)
    # a step off by at most the square root of 5/2 from the one wanted, and one tick at the end
    assert wanted / 1.6 - 1 <= len(found) <= wanted * 1.6 + 1


def test_labels_have_one_number_of_decimals() -> None:
    assert tick_labels([0.0, 0.05, 0.1]) == ["0.00", "0.05", "0.10"]
    assert tick_labels([-5.0, 0.0, 5.0]) == ["\N{MINUS SIGN}5", "0", "5"]
    assert tick_labels([1e6, 1.5e6, 2e6]) == [
        f"{m} \N{MULTIPLICATION SIGN} 10⁶" for m in ("1.0", "1.5", "2.0")
    ]
