"""Digits that were earned: a number is printed to two digits of its own total half-width."""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import ROUND_CEILING, ROUND_FLOOR, ROUND_HALF_EVEN, Context, Decimal

DASH = "\N{EN DASH}"
"""Stands where a part does not apply or a value is not determined."""

EARNED_DIGITS = 2
"""Digits of the half-width that are shown (JCGM 100:2008, section 7.2.6: at most two)."""

SURE_DIGITS = 6
"""Digits of a value whose half-width is 0."""

MOST_DIGITS = 10
"""No number is printed to more significant digits, however small its half-width."""

_LARGE, _SMALL = 6, -4


@dataclass(frozen=True)
class Earned:
    """A value and the ends of its interval to the same decimal place, and the half-width to two digits.

    The ends are rounded outwards and the half-width upwards, so that what is printed holds wherever the exact
    statement holds.  An open end is None, and so is the half-width then; a value that is not determined is a
    dash.
    """

    value: str
    low: str | None
    high: str | None
    half_width: str | None


def _exponent(value: float) -> int:
    return Decimal(repr(value)).adjusted() if value else -(10**6)


def _written(value: float, decimals: int, rounding: str, power: int) -> str:
    """`value` to `decimals` places; a power of ten other than 0 is written as ``e``."""
    wide = Context(prec=400)
    scaled = Decimal(repr(value)).scaleb(-power, wide)
    rounded = scaled.quantize(Decimal(1).scaleb(-(decimals + power)), rounding=rounding, context=wide)
    if rounded.is_zero():
        rounded = abs(rounded)
    text = f"{rounded:f}"
    return text if power == 0 else f"{text}e{power:+03d}"


def earned(
    value: float | None,
    interval: tuple[float | None, float | None] = (None, None),
    total: float | None = None,
) -> Earned:
    """Round a statement to the digits that its half-width leaves.

    Parameters
    ----------
    value : the value; None where it is not determined
    interval : (low, high), None where open
    total : half-width; None where there is none (an end is open): then the longer side that is known decides
        the digits.  A half-width of 0 leaves six digits; where nothing is known of the error the value has two

    Examples
    --------
    >>> earned(3.14159, (3.1205, 3.1629), 0.0213)
    Earned(value='3.142', low='3.120', high='3.163', half_width='0.022')
    >>> earned(1234567.0, (1200000.0, 1300000.0), 65433.0).value
    '1.235e+06'
    """
    if value is None:
        return Earned(DASH, None, None, None)
    low, high = interval
    sides = [abs(value - end) for end in (low, high) if end is not None]
    known = total is not None or bool(sides)
    reach = max(sides, default=0.0) if total is None else total
    largest = max(abs(v) for v in (value, low, high, reach) if v is not None)
    top = _exponent(largest)
    if reach > 0:
        decimals = min(EARNED_DIGITS - 1 - _exponent(reach), MOST_DIGITS - 1 - top)
    else:
        decimals = (SURE_DIGITS if known else EARNED_DIGITS) - 1 - top
    if largest == 0:
        decimals, top = 0, 0
    power = top if top >= _LARGE or top < _SMALL else 0
    if power == 0 and reach == 0:
        decimals = _without_trailing_zeros(value, decimals)
    return Earned(
        value=_written(value, decimals, ROUND_HALF_EVEN, power),
        low=None if low is None else _written(low, decimals, ROUND_FLOOR, power),
        high=None if high is None else _written(high, decimals, ROUND_CEILING, power),
        half_width=None if total is None else _half_width(total),
    )


def _half_width(total: float) -> str:
    top = _exponent(total) if total else 0
    power = top if total and (top >= _LARGE or top < _SMALL) else 0
    return _written(total, EARNED_DIGITS - 1 - top if total else 0, ROUND_CEILING, power)


def _without_trailing_zeros(value: float, decimals: int) -> int:
    text = _written(value, max(decimals, 0), ROUND_HALF_EVEN, 0)
    return len(text.rstrip("0").partition(".")[2])


def short(value: float | None, digits: int = 3) -> str:
    """A number for reading, to `digits` significant digits; a dash where there is none.

    >>> short(0.031415), short(2048.0, 6), short(None)
    ('0.0314', '2048', '–')
    """
    if value is None or not math.isfinite(value):
        return DASH
    return f"{value:.{digits}g}"


def typographic(text: str) -> str:
    """The same number as print shows it: a true minus, a power of ten raised.

    >>> typographic("-1.25e-07")
    '−1.25 × 10⁻⁷'
    """
    mantissa, mark, power = text.partition("e")
    mantissa = mantissa.replace("-", "\N{MINUS SIGN}")
    if not mark:
        return mantissa
    raised = str(int(power)).translate(str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹"))
    return f"{mantissa} \N{MULTIPLICATION SIGN} 10{raised}"


def percent(share: float) -> str:
    """A share in whole per cent; a positive one that rounds to 0 says so.

    >>> percent(0.616), percent(0.0004)
    ('62 %', 'below 1 %')
    """
    if 0 < share < 0.005:
        return "below 1 %"
    return f"{100 * share:.0f} %"
