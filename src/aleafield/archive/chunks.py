"""A chunk: the records of one task, as they lie in memory and in one small netCDF file."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from aleafield.archive.field_state import FieldState, get_state, put_state
from aleafield.archive.names import netcdf_name
from aleafield.arrays import FloatArray, IntArray
from aleafield.ensemble.level import Level
from aleafield.ensemble.records import Records
from aleafield.randomness.families import Family

LANE = 8
"""Batches are padded to a multiple of this, so that a realization's values do not depend on the cut."""


@dataclass(frozen=True, order=True)
class Task:
    """Realizations first .. first + count - 1 of a family at one level: whole samples, with all their noise paths."""

    level: Level
    first: int
    count: int
    family: Family = "main"

    @property
    def name(self) -> str:
        """File name of the chunk that the task gives."""
        family = "" if self.family == "main" else f"_{netcdf_name(self.family)}"
        return f"{self.level.label}{family}_{self.first:09d}_{self.count}.nc"

    @property
    def last(self) -> int:
        """One past the last realization."""
        return self.first + self.count

    @property
    def indices(self) -> IntArray:
        """Indices of the realizations, the last one repeated up to a multiple of 8, shape (S,)."""
        padded = -(-self.count // LANE) * LANE
        return np.minimum(np.arange(self.first, self.first + padded, dtype=np.int64), self.last - 1)


def cut(level: Level, first: int, last: int, width: int, family: Family = "main") -> Iterator[Task]:
    """Tasks for realizations first .. last - 1 of a family, cut at the multiples of `width`."""
    start = first
    while start < last:
        stop = min(last, (start // width + 1) * width)
        yield Task(level, start, stop - start, family)
        start = stop


@dataclass(frozen=True)
class Chunk:
    """What one task gives.

    Attributes
    ----------
    first : int
        Index of the first realization.
    records : Records
        Of the realizations of the task, without fields and histories.
    state : FieldState or None
        What fields and histories at the moment times add to the ensemble; None at the extra levels, in other
        families and without fields.
    kept : float array (k, K, n) or None
        Fields at the kept times of the first k realizations of the chunk.
    seconds : float
        Processor time that it took.
    """

    first: int
    records: Records
    state: FieldState | None = None
    kept: FloatArray | None = None
    seconds: float = 0.0

    @property
    def last(self) -> int:
        """One past the last realization."""
        return self.first + len(self.records)


def encode(chunk: Chunk) -> bytes:
    """A chunk as the bytes of a netCDF file."""
    import netCDF4

    records = chunk.records
    dataset = netCDF4.Dataset("chunk.nc", "w", memory=1 << 16)
    dataset.setncattr("first", np.int64(chunk.first))
    dataset.setncattr("seconds", chunk.seconds)
    _put(dataset, "realizations", ("realization",), records.realizations)
    _put(dataset, "failed", ("realization",), records.failed)
    _put(dataset, "failed_at", ("realization",), records.failed_at)
    for group in ("inputs", "values", "margins"):
        columns: Mapping[str, FloatArray] = getattr(records, group)
        dataset.setncattr(group, json.dumps(list(columns)))
        if columns:
            _put(dataset, group, (f"n_{group}", "realization"), np.stack(list(columns.values())))
    if chunk.state is not None:
        put_state(dataset, chunk.state)
    if chunk.kept is not None and len(chunk.kept):
        _put(dataset, "kept", ("kept_realization", "kept_time", "x"), chunk.kept)
    return bytes(dataset.close())


def decode(data: bytes) -> Chunk:
    """The chunk that `encode` turned into bytes; their hash is to be verified before."""
    import netCDF4

    with netCDF4.Dataset("chunk.nc", memory=data) as dataset:
        dataset.set_auto_mask(False)
        records = Records(
            realizations=dataset["realizations"][:],
            failed=dataset["failed"][:],
            failed_at=dataset["failed_at"][:],
            inputs=_columns(dataset, "inputs"),
            values=_columns(dataset, "values"),
            margins=_columns(dataset, "margins"),
        )
        kept = dataset["kept"][:] if "kept" in dataset.variables else None
        first, seconds = int(dataset.getncattr("first")), float(dataset.getncattr("seconds"))
        return Chunk(first, records, get_state(dataset), kept, seconds)


def _columns(dataset: Any, group: str) -> dict[str, FloatArray]:
    return {name: dataset[group][row] for row, name in enumerate(json.loads(dataset.getncattr(group)))}


def _put(dataset: Any, name: str, dimensions: Sequence[str], values: FloatArray | IntArray) -> None:
    for dimension, length in zip(dimensions, values.shape, strict=True):
        if dimension not in dataset.dimensions:
            dataset.createDimension(dimension, length)
    variable = dataset.createVariable(name, values.dtype, dimensions, contiguous=True)
    variable[:] = values
