"""A statement: a number, the parts of its error, an interval."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

from aleafield.accounting.order import Order
from aleafield.accounting.records import PART_NAMES

ERROR_KEYS = (*PART_NAMES, "bias_noise", "sampling", "surrogate", "total")
"""Members of `Statement.error`, in the order of the summary."""


@dataclass(frozen=True)
class Statement:
    """What a study says of one statistic of one quantity.

    Attributes
    ----------
    value : float or None
        In the units of the statistic; None where it, or a part of its error, is not determined.
    error : mapping of ERROR_KEYS to float or None
        Bounds on biases (space, quadrature, time, noise_modes, surrogate), half-widths (bias_noise, sampling)
        and their total, in the units of the statistic; None where a part does not apply or is not determined.
    interval : (low, high) or None
        An end is None where it is open.
    corrected : Statement or None
        The same with the estimated biases taken off (means only).
    reason : str or None
        Why something is not determined.
    notes : tuple of str
        What a reader must know of the parts.
    orders : mapping of part to Order
        Observed and expected order and the factor of each part that was measured.
    """

    value: float | None
    error: Mapping[str, float | None]
    interval: tuple[float | None, float | None] | None
    corrected: Statement | None = None
    reason: str | None = None
    notes: tuple[str, ...] = ()
    orders: Mapping[str, Order] = field(default_factory=dict)

    def as_json(self) -> dict[str, object]:
        """The statement in the shape of summary.json; no NaN, no Infinity.

        Always: value, error, interval.  Where there is something to say: reason, corrected, orders (observed,
        expected, factor of each part), notes.
        """
        shape: dict[str, object] = {
            "value": self.value,
            "error": {key: self.error[key] for key in ERROR_KEYS},
            "interval": None if self.interval is None else list(self.interval),
        }
        if self.reason is not None:
            shape["reason"] = self.reason
        if self.corrected is not None:
            shape["corrected"] = self.corrected.as_json()
        if self.orders:
            shape["orders"] = {
                part: {"observed": order.observed, "expected": order.expected, "factor": order.factor}
                for part, order in self.orders.items()
            }
        if self.notes:
            shape["notes"] = list(self.notes)
        return shape


def no_statement(reason: str) -> Statement:
    """The statement that nothing is determined."""
    return Statement(None, dict.fromkeys(ERROR_KEYS), None, reason=reason)


def representable(statement: Statement) -> Statement:
    """The statement itself, or none where double precision overflowed on the way to it."""
    numbers = [statement.value, *statement.error.values(), *(statement.interval or ())]
    if all(number is None or math.isfinite(number) for number in numbers):
        return statement
    return no_statement("its error is beyond the range of double precision")
