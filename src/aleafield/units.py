"""Unit labels of a study and the units derived from them."""

from __future__ import annotations

from dataclasses import dataclass

Dimension = tuple[int, int, int]
"""Exponents of (activity, length, time)."""

DIMENSIONLESS: Dimension = (0, 0, 0)
ACTIVITY: Dimension = (1, 0, 0)
LENGTH: Dimension = (0, 1, 0)
TIME: Dimension = (0, 0, 1)
PER_ACTIVITY: Dimension = (-1, 0, 0)
ACTIVITY_PER_LENGTH: Dimension = (1, -1, 0)
SPEED: Dimension = (0, 1, -1)


@dataclass(frozen=True)
class Units:
    """Labels for length, time and activity; "1" where a study gives none."""

    length: str = "1"
    time: str = "1"
    activity: str = "1"

    def derived(self, dimension: Dimension) -> str:
        """The unit of a dimension in UDUNITS form, as in ``mm ms-1``; "1" without any label.

        >>> Units("mm", "ms", "mV").derived(SPEED)
        'mm ms-1'
        """
        parts = []
        for label, exponent in zip((self.activity, self.length, self.time), dimension, strict=True):
            if exponent == 0 or label == "1":
                continue
            # a compound label such as "mV s" must keep its exponent as a whole
            base = f"({label})" if exponent != 1 and not label.isalpha() else label
            parts.append(base if exponent == 1 else f"{base}{exponent}")
        return " ".join(parts) or "1"
