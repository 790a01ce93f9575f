"""[domain]: where the field lives."""

from __future__ import annotations

import math

from aleafield.errors import InputError
from aleafield.geometry import Domain, Interval, Ring
from aleafield.study.reading.table import Table

_LATER = "use an interval (from, to) or a ring (length) for now"
UNBUILT_SHAPES = dict.fromkeys(("rectangle", "torus", "sphere", "surface"), _LATER)


def read_domain(table: Table) -> Domain:
    """An interval or a ring.

    Raises
    ------
    InputError
        For a shape that is unknown or not built yet, and for ends or a length that make no domain.
    """
    shape = table.choice("shape", ("interval", "ring"), unbuilt=UNBUILT_SHAPES)
    if shape == "ring":
        table.only(("shape", "length"), "a ring")
        return Ring(table.constant("length", needed="a ring needs its length"))
    table.only(("shape", "from", "to"), "an interval")
    low = table.constant("from", needed="an interval needs both ends")
    high = table.constant("to", needed="an interval needs both ends")
    domain = Interval(low, high)
    if not math.isfinite(domain.length):
        raise InputError(table.key("to"), f"a length of {domain.length}", "a finite length is needed")
    return domain
