"""Where the chunks of an ensemble come from: an earlier ensemble, stored chunks, or one after the other."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from aleafield.archive.chunk_store import ChunkStore
from aleafield.archive.chunks import Chunk, Task
from aleafield.archive.description import MOST_KEPT
from aleafield.archive.ensemble_reader import EnsembleReader
from aleafield.archive.field_state import FieldState
from aleafield.archive.names import netcdf_name
from aleafield.ensemble.level import Level
from aleafield.randomness.families import Family

ROWS = 256
"""Realizations of an earlier ensemble that are in memory at a time."""


class StoredChunks:
    """The chunks that a run stored, in the order of their tasks.

    Parameters
    ----------
    store : ChunkStore
    tasks : sequence of Task
    """

    def __init__(self, store: ChunkStore, tasks: Sequence[Task]) -> None:
        self._store = store
        self._tasks = tasks

    def chunks(self, level: Level, family: Family = "main") -> Iterator[Chunk]:
        """The chunks of a family at a level."""
        return (self._store.get(t) for t in self._tasks if (t.level, t.family) == (level, family))


class EarlierEnsemble:
    """An ensemble that ended, as chunks again; the first one carries the field state of all.

    Parameters
    ----------
    reader : EnsembleReader
    level : Level
        The run's level.
    state : FieldState or None
        What it leaves of the fields at the moment times; None without fields.
    """

    def __init__(self, reader: EnsembleReader, level: Level, state: FieldState | None) -> None:
        self._reader = reader
        self._level = level
        self._state = state

    def chunks(self, level: Level, family: Family = "main") -> Iterator[Chunk]:
        """The chunks of a family at a level."""
        main = level == self._level and family == "main"
        if main:
            label, total = "", len(self._reader)
        elif family != "main":
            label, total = netcdf_name(family), self._reader.families.get(family, 0)
        else:
            label = level.label
            total = self._reader.probes if label in self._reader.levels else 0
        for first in range(0, total, ROWS):
            last = min(first + ROWS, total)
            kept = self._reader.fields(first, last) if main and first < MOST_KEPT else None
            state = self._state if main and first == 0 else None
            yield Chunk(first, self._reader.rows(first, last, label), state, kept)


class InTurn:
    """The chunks of one source after those of another."""

    def __init__(self, *sources: EarlierEnsemble | StoredChunks) -> None:
        self._sources = sources

    def chunks(self, level: Level, family: Family = "main") -> Iterator[Chunk]:
        """The chunks of a family at a level."""
        for source in self._sources:
            yield from source.chunks(level, family)
