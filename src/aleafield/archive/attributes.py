"""Attributes of netCDF files: the values that the format holds, and what becomes of others."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

import numpy as np


def encoded(value: Any) -> Any:
    """A value as netCDF holds it.

    bool -> 0 or 1; None -> None (absent); mappings and nested lists -> JSON text; numbers, text and flat
    lists of one kind stay.

    >>> int(encoded(True)), encoded(None), encoded({"a": 1})
    (1, None, '{"a": 1}')
    """
    if value is None or isinstance(value, (str, np.ndarray, np.generic)):
        return value
    if isinstance(value, bool):
        return np.int32(value)
    if isinstance(value, int):
        return np.int32(value) if -(2**31) <= value < 2**31 else np.int64(value)
    if isinstance(value, float):
        return value
    if isinstance(value, Mapping):
        return json.dumps(value, ensure_ascii=False)
    entries = list(value)
    if entries and all(isinstance(e, float) for e in entries):
        return np.array(entries)
    return json.dumps(entries, ensure_ascii=False)


def set_attributes(holder: Any, attributes: Mapping[str, Any]) -> None:
    """Give a netCDF dataset or variable its attributes; those that are None are left out."""
    for name, value in attributes.items():
        coded = encoded(value)
        if coded is not None:
            holder.setncattr(name, coded)
