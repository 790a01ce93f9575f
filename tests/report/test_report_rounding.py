"""Digits that a half-width leaves, and their rounding: by hand and by decimal arithmetic."""

from __future__ import annotations

from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from aleafield.report.rounding import DASH, earned, percent, short, typographic


@pytest.mark.parametrize(
    ("value", "interval", "total", "shown"),
    [
        # two digits of the half-width decide the last place (JCGM 100:2008, 7.2.6)
        (3.14159, (3.1205, 3.1629), 0.0213, ("3.142", "3.120", "3.163", "0.022")),
        (3.14159, (3.04, 3.24), 0.099, ("3.142", "3.040", "3.240", "0.099")),
        (12345.678, (12000.0, 12700.0), 350.0, ("12350", "12000", "12700", "350")),
        (0.00034, (0.0001, 0.0007), 0.00036, ("0.00034", "0.00010", "0.00070", "0.00036")),
        (0.5, (0.45, 0.55), 0.05, ("0.500", "0.450", "0.550", "0.050")),
        (-2.0004, (-2.1, -1.9), 0.1, ("-2.00", "-2.10", "-1.90", "0.10")),
        (-0.001, (-0.2, 0.2), 0.2, ("0.00", "-0.20", "0.20", "0.20")),
        # a value that its error swamps keeps the error's place
        (0.003, (-0.5, 0.5), 0.5, ("0.00", "-0.50", "0.50", "0.50")),
        # large and small numbers by powers of ten, one for value and ends
        (1234567.0, (1.2e6, 1.3e6), 65433.0, ("1.235e+06", "1.200e+06", "1.300e+06", "66000")),
        (1.2345e-7, (1.217e-7, 1.252e-7), 1.7e-9, ("1.234e-07", "1.217e-07", "1.252e-07", "1.7e-09")),
        # nothing to earn: certain, or nothing known of the error
        (0.125, (0.125, 0.125), 0.0, ("0.125", "0.125", "0.125", "0")),
        (1 / 3, (1 / 3, 1 / 3), 0.0, ("0.333333", "0.333333", "0.333334", "0")),
        (0.0, (0.0, 0.0), 0.0, ("0", "0", "0", "0")),
        (3.14159, (None, None), None, ("3.1", None, None, None)),
        # one-sided
        (3.14159, (3.12, None), None, ("3.142", "3.120", None, None)),
        (3.14159, (None, 3.2), None, ("3.142", None, "3.200", None)),
        (None, (None, None), None, (DASH, None, None, None)),
    ],
)
def test_digits_by_hand(
    value: float | None,
    interval: tuple[float | None, float | None],
    total: float | None,
    shown: tuple[str | None, ...],
) -> None:
    found = earned(value, interval, total)
    assert (found.value, found.low, found.high, found.half_width) == shown


NUMBERS = st.floats(-1e9, 1e9, allow_nan=False)
WIDTHS = st.floats(1e-6, 1e6)


def last_place(total: float, largest: float) -> Decimal:
    """The place of the second digit of the half-width, or of the tenth digit of the largest number."""
    second = Decimal(repr(total)).adjusted() - 1
    return Decimal(1).scaleb(max(second, Decimal(repr(largest)).adjusted() - 9))


@given(NUMBERS, WIDTHS, WIDTHS)
def test_what_is_printed_holds_wherever_the_statement_does(value: float, left: float, right: float) -> None:
    """The printed interval contains the exact one and exceeds it by less than one unit of its last place."""
    ends, total = (value - left, value + right), max(left, right)
    found = earned(value, ends, total)
    assert found.low is not None
    assert found.high is not None
    assert found.half_width is not None
    unit = last_place(total, max(abs(v) for v in (value, *ends, total)))
    low, high, half_width = Decimal(found.low), Decimal(found.high), Decimal(found.half_width)
    assert low <= Decimal(repr(ends[0])) < low + unit
    assert high - unit < Decimal(repr(ends[1])) <= high
    assert abs(Decimal(found.value) - Decimal(repr(value))) <= unit / 2
    assert Decimal(repr(total)) <= half_width <= Decimal(repr(total)) * Decimal("1.1")
    assert all(number % unit == 0 for number in (Decimal(found.value), low, high))


def test_numbers_for_reading() -> None:
    assert short(float("nan")) == DASH
    assert short(12345.678, 3) == "1.23e+04"
    assert typographic("-3.50e+04") == "\N{MINUS SIGN}3.50 \N{MULTIPLICATION SIGN} 10⁴"
    assert [percent(share) for share in (0.0, 0.001, 0.5, 1.0)] == ["0 %", "below 1 %", "50 %", "100 %"]
