"""Statistics in ensemble.nc: a scalar each, with its error parts and interval as ancillary variables."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from aleafield.archive.attributes import set_attributes
from aleafield.archive.names import Names


def add_statistics(dataset: Any, names: Names, quantities: Mapping[str, Mapping[str, Any]]) -> None:
    """Add the statistics of a summary to an open netCDF dataset.

    Quantiles and probabilities have no cell method in the conventions (CF 1.11, appendix E).

    Parameters
    ----------
    dataset : open netCDF dataset
    names : Names
        Names that are taken.
    quantities : mapping
        The entry "quantities" of the summary.
    """
    for quantity, entries in quantities.items():
        for one in _statistics(entries):
            if one.statement["value"] is not None:
                _add(dataset, names, quantity, one)


@dataclass(frozen=True)
class _Named:
    """A statement with the words for its variable."""

    stem: str
    words: str
    units: str
    method: str | None
    statement: Mapping[str, Any]


def _statistics(entries: Mapping[str, Any]) -> Iterator[_Named]:
    units = entries["units"]
    yield _Named("mean", "mean", units, "realization: mean", entries["mean"])
    yield _Named("sd", "standard deviation", units, "realization: standard_deviation", entries["sd"])
    for key, statement in entries["quantiles"].items():
        yield _Named(f"quantile_{key}", f"{key} quantile", units, None, statement)
    for key, statement in entries["exceed"].items():
        yield _Named(f"exceed_{key}", f"probability of lying above {key}", "1", None, statement)
    if entries["occurs"] is not None:
        yield _Named("occurs", "probability of occurrence", "1", None, entries["occurs"])


def _add(dataset: Any, names: Names, quantity: str, one: _Named) -> None:
    stem, words = f"{quantity}_{one.stem}", f"{one.words} of {quantity}"
    low, high = one.statement["interval"] or (None, None)
    numbers = [
        (f"error_{part}", f"{part.replace('_', ' ')} error", size)
        for part, size in one.statement["error"].items()
    ]
    numbers += [("lower", "lower end of the interval", low), ("upper", "upper end of the interval", high)]
    ancillary = []
    for suffix, about, number in numbers:
        if number is not None:
            name = names.take(f"{stem}_{suffix}")
            _scalar(dataset, name, number, {"long_name": f"{about} of the {words}", "units": one.units})
            ancillary.append(name)
    attributes = {
        "long_name": words,
        "units": one.units,
        "cell_methods": one.method,
        "ancillary_variables": " ".join(ancillary) or None,
    }
    _scalar(dataset, names.take(stem), one.statement["value"], attributes)


def _scalar(dataset: Any, name: str, value: float, attributes: Mapping[str, Any]) -> None:
    variable = dataset.createVariable(name, "f8", (), fill_value=np.nan)
    set_attributes(variable, attributes)
    variable[...] = value
