"""Axis ticks at round numbers."""

from __future__ import annotations

import itertools
import math

from aleafield.report.rounding import typographic


def round_step(span: float, wanted: int) -> float:
    """The step among 1, 2 and 5 times a power of ten that cuts `span` into nearly `wanted` pieces.

    Thresholds are the geometric means of neighbours (Heckbert 1990, Nice numbers for graph labels, in
    Graphics Gems; from memory).

    >>> round_step(1.0, 5), round_step(37.0, 6)
    (0.2, 5.0)
    """
    rough = span / wanted
    power = math.floor(math.log10(rough))
    lead = rough / 10.0**power
    for factor, limit in ((1, math.sqrt(2)), (2, math.sqrt(10)), (5, math.sqrt(50))):
        if lead < limit:
            return float(f"{factor}e{power}")
    return float(f"1e{power + 1}")


def ticks(low: float, high: float, wanted: int = 6) -> list[float]:
    """Multiples of a round step within [low, high].

    Each is the float nearest to its decimal, so that 0.3 is not 0.30000000000000004.

    >>> ticks(0.0, 1.0, 5)
    [0.0, 0.2, 0.4, 0.6, 0.8, 1.0]
    """
    step = round_step(high - low, wanted)
    slack = 1e-9 * (high - low) / step
    first, last = math.ceil(low / step - slack), math.floor(high / step + slack)
    mantissa, _, power = f"{step:e}".partition("e")
    factor = round(float(mantissa))
    return [float(f"{index * factor}e{power}") for index in range(first, last + 1)]


def tick_labels(values: list[float]) -> list[str]:
    """Labels with one number of decimals for all, in powers of ten where plain digits would be long.

    >>> tick_labels([0.0, 0.5, 1.0]), tick_labels([0.0, 2e-05])
    (['0.0', '0.5', '1.0'], ['0', '2 × 10⁻⁵'])
    """
    gaps = [b - a for a, b in itertools.pairwise(values) if b > a]
    largest = max((abs(v) for v in values), default=0.0)
    step = min(gaps, default=largest or 1.0)
    decimals = max(0, -math.floor(math.log10(step * (1 + 1e-9))))
    if decimals > 4 or largest >= 1e6:
        digits = max(0, math.floor(math.log10(largest)) - math.floor(math.log10(step * (1 + 1e-9))))
        return [typographic(f"{v:.{digits}e}") if v else "0" for v in values]
    return [typographic(f"{v:.{decimals}f}") for v in values]
