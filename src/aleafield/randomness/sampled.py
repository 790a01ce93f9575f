"""The law of measured numbers: the empirical distribution of one column of a file."""

from __future__ import annotations

import csv
import json
import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.errors import InputError
from aleafield.formula import nearest_name
from aleafield.randomness.law import Law


@dataclass(frozen=True)
class Sampled(Law):
    """The empirical law of one column of a file: every row alike, nothing between the measured values.

    Parameters
    ----------
    path : str
        The file, comma-separated with the names of its columns in the first line.
    column : str
        Name of the column.
    values : sequence of float, optional
        Its numbers in the order of the rows; read from the file (relative to the working directory) when left
        out, so that a pickled law needs the file no more.

    Raises
    ------
    InputError
        File or column missing, a cell that holds no finite number (with its line), or no rows.
    """

    name = "sampled"
    arguments = ('"file.csv"', '"column"')
    continuous = False
    path: str
    column: str
    values: Sequence[float] = ()

    def _convert(self) -> None:
        object.__setattr__(self, "path", str(self.path))
        numbers = (
            tuple(self._finite(f"values[{i}]", value) for i, value in enumerate(self.values))
            if len(self.values)
            else read_column(Path(self.path), self.column, self.path)
        )
        object.__setattr__(self, "values", numbers)

    def _check(self) -> None:
        """Any finite numbers are a law."""

    @property
    def text(self) -> str:
        quoted = (json.dumps(word, ensure_ascii=False) for word in (self.path, self.column))
        return f"{self.name}({', '.join(quoted)})"

    @cached_property
    def sorted_values(self) -> FloatArray:
        """The values in increasing order."""
        return np.sort(np.array(self.values))

    @property
    def mean(self) -> float:
        return math.fsum(self.values) / len(self.values)

    @property
    def sd(self) -> float:
        return math.sqrt(math.fsum((np.array(self.values) - self.mean) ** 2) / len(self.values))

    @property
    def support(self) -> tuple[float, float]:
        return min(self.values), max(self.values)

    def rank(self, probability: FloatArray) -> IntArray:
        """Which of the sorted values, counted from 0, each probability selects."""
        n = len(self.values)
        return np.clip(np.ceil(np.asarray(probability) * n).astype(np.int64) - 1, 0, n - 1)

    def ppf(self, probability: FloatArray) -> FloatArray:
        return self.sorted_values[self.rank(probability)]

    def cdf(self, x: float | FloatArray) -> FloatArray:
        return np.searchsorted(self.sorted_values, np.asarray(x), side="right") / len(self.values)

    def probability_below(self, x: float) -> float:
        return float(np.searchsorted(self.sorted_values, x, side="left") / len(self.values))


def read_column(file: Path, column: str, shown_path: str) -> tuple[float, ...]:
    """The numbers of one column of a comma-separated file with a header line.

    Parameters
    ----------
    file : Path
        Where it is.
    column : str
        Name in the header line, white space around it ignored.
    shown_path : str
        What errors call the file.

    Raises
    ------
    InputError
        As `Sampled` says; its key is empty.
    """
    rows = _rows(file, shown_path)
    if not rows:
        needed = "its first line names the columns, the next ones hold numbers"
        raise InputError("", f"{shown_path} is empty", needed)
    header = [cell.strip() for cell in rows[0][1]]
    if header.count(column) != 1:
        if header.count(column) > 1:
            found = f"{shown_path} has {header.count(column)} columns named {column!r}"
            raise InputError("", found, "give each its own name")
        needed = "its columns are " + ", ".join(repr(name) for name in header)
        if len(header) == 1 and (";" in header[0] or "\t" in header[0]):
            needed = "cells are separated by commas, numbers written with a decimal point"
        raise InputError(
            "", f"{shown_path} has no column {column!r}", needed, nearest=nearest_name(column, header)
        )
    place = header.index(column)
    numbers = []
    for line, cells in rows[1:]:
        cell = cells[place].strip() if place < len(cells) else ""
        try:
            number = float("nan" if "_" in cell else cell)
        except ValueError:
            number = math.nan
        if not math.isfinite(number):
            raise InputError(
                "",
                f"{shown_path} has {cell!r} in column {column!r}, line {line}",
                "every row needs a finite number there, written with a decimal point",
            )
        numbers.append(number)
    if not numbers:
        raise InputError("", f"{shown_path} has no rows below its header", "one row at least is needed")
    return tuple(numbers)


def _rows(file: Path, shown_path: str) -> list[tuple[int, list[str]]]:
    """The lines that are not blank, each with its number in the file."""
    try:
        with file.open(encoding="utf-8-sig", newline="") as stream:
            reader = csv.reader(stream, strict=True)
            return [(reader.line_num, cells) for cells in reader if any(cell.strip() for cell in cells)]
    except FileNotFoundError:
        siblings = [str(Path(shown_path).with_name(path.name)) for path in _siblings(file)]
        raise InputError(
            "",
            f"{shown_path} does not exist",
            "the path is relative to the study file",
            nearest=nearest_name(shown_path, siblings),
        ) from None
    except (OSError, ValueError, csv.Error) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        raise InputError(
            "", f"{shown_path} cannot be read ({reason})", "a text file of comma-separated values is needed"
        ) from None


def _siblings(file: Path) -> list[Path]:
    return sorted(file.parent.glob("*.csv")) if file.parent.is_dir() else []
