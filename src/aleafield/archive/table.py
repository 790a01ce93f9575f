"""Inputs and quantities of an ensemble as comma-separated text."""

from __future__ import annotations

import csv
import os

from aleafield.archive.durable import commit, partial, storing
from aleafield.archive.ensemble_reader import EnsembleReader
from aleafield.archive.layout import Layout

ROWS = 4096
"""Rows that are in memory at a time."""


def write_table(layout: Layout, reader: EnsembleReader) -> None:
    """Write ensemble.csv: one row a realization, empty cells where a quantity has no value.

    Numbers are written with all the digits that tell them from their neighbours.
    """
    path = layout.table
    with storing(path), open(partial(path), "w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["sample", "repeat", "replicate", "failed", *reader.inputs, *reader.quantities])
        for first in range(0, len(reader), ROWS):
            last = min(first + ROWS, len(reader))
            records = reader.rows(first, last)
            numbers = [reader.numbers(name, first, last) for name in ("sample", "repeat", "replicate")]
            columns = [*(column.tolist() for column in numbers), records.failed.tolist()]
            columns += [records.inputs[path].tolist() for path in reader.inputs]
            columns += [_cells(records.values[name].tolist()) for name in reader.quantities]
            writer.writerows(zip(*columns, strict=True))
        file.flush()
        os.fsync(file.fileno())
    commit(path)


def _cells(values: list[float]) -> list[float | str]:
    return ["" if value != value else value for value in values]
