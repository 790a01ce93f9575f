"""Building ensemble.nc from chunks, one chunk in memory at a time."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import Any, Protocol

from aleafield.archive.attributes import set_attributes
from aleafield.archive.chunks import Chunk
from aleafield.archive.description import Description
from aleafield.archive.durable import commit, partial, remove, storing, write_bytes
from aleafield.archive.ensemble_reader import EnsembleReader
from aleafield.archive.ensemble_variables import EnsembleVariables
from aleafield.archive.field_state import PATHS, FieldState, encode_state
from aleafield.archive.layout import Layout
from aleafield.archive.names import netcdf_name
from aleafield.archive.statistic_variables import add_statistics
from aleafield.ensemble.level import Level
from aleafield.randomness.families import Family

Summary = dict[str, Any]
"""The document summary.json."""


class ChunkSource(Protocol):
    """Where an ensemble's chunks come from, in the order of their realizations."""

    def chunks(self, level: Level, family: Family = "main") -> Iterator[Chunk]:
        """The chunks of a family at a level, without gaps, from realization 0 on."""
        ...


def build(
    layout: Layout,
    description: Description,
    source: ChunkSource,
    summarise: Callable[[EnsembleReader], Summary],
    held_state: str | None = None,
) -> Summary:
    """Write ensemble.nc, atomically, with the statistics of its summary; give the summary back.

    Parameters
    ----------
    layout : Layout
    description : Description
    source : ChunkSource
    summarise : from the columns of the ensemble to the summary
    held_state : hash of the field state that is in place, where the main sample does not grow and it stays: until
        the new ensemble is in place, the old one needs it to the byte

    Raises
    ------
    Interrupted
        When the disk fails; the chunks are untouched.
    """
    import netCDF4

    path = layout.ensemble
    with storing(path), netcdf_failures(path), netCDF4.Dataset(partial(path), "w") as dataset:
        variables = EnsembleVariables(dataset, description)
        state = _stream_main(variables, description, source)
        for level in description.extra_levels:
            _put_all(variables, source.chunks(level), level.label)
        for family in description.families:
            _put_all(variables, source.chunks(description.level, family), netcdf_name(family))
        new_state = None if state is None or held_state is not None else encode_state(state)
        digest = held_state if new_state is None else hashlib.sha256(new_state).hexdigest()
        attributes = {**description.attributes, "field_state_sha256": digest}
        set_attributes(dataset, {"Conventions": "CF-1.11", **attributes})
        summary = summarise(EnsembleReader(dataset))
        add_statistics(dataset, variables.names, summary["quantities"])
    state_path = layout.field_state(description.realizations)
    if new_state is not None:
        write_bytes(state_path, new_state)
    commit(path)
    for old in layout.field_states():
        if old != state_path:
            remove(old)
    return summary


def _stream_main(
    variables: EnsembleVariables, description: Description, source: ChunkSource
) -> FieldState | None:
    """Put the main sample in place; what it leaves of its fields, None without fields."""
    state: FieldState | None = None
    for chunk in source.chunks(description.level):
        records = chunk.records
        for path, column in records.inputs.items():
            variables.found["input", path, ""][chunk.first : chunk.last] = column
        variables.found["failed_at", "", ""][chunk.first : chunk.last] = records.failed_at
        _put_values(variables, chunk, "")
        if chunk.state is not None:
            state = chunk.state if state is None else state + chunk.state
        if chunk.kept is not None and description.kept:
            variables.found["field", "", ""][chunk.first : chunk.first + len(chunk.kept)] = chunk.kept
    if state is None:
        return None
    variables.found["field_mean", "", ""][:] = state.moments.mean
    variables.found["field_sd", "", ""][:] = state.moments.sd
    variables.found["field_band", "", ""][:] = state.quantiles()
    variables.make_histories(tuple(state.histories))
    for name, history in state.histories.items():
        variables.found["fan", name, ""][:] = state.fan(name)
        variables.found["paths", name, ""][:] = history[:PATHS]
    return state


def _put_all(variables: EnsembleVariables, chunks: Iterator[Chunk], label: str) -> None:
    for chunk in chunks:
        _put_values(variables, chunk, label)


def _put_values(variables: EnsembleVariables, chunk: Chunk, label: str) -> None:
    along = slice(chunk.first, chunk.last)
    variables.found["failed", "", label][along] = chunk.records.failed
    groups: Mapping[str, Mapping[str, Any]] = {"value": chunk.records.values, "margin": chunk.records.margins}
    for role, columns in groups.items():
        for name, column in columns.items():
            variables.found[role, name, label][along] = column


@contextmanager
def netcdf_failures(path: Path) -> Iterator[None]:
    """The netCDF library reports a full disk as RuntimeError: turn that into the OSError that it is."""
    try:
        yield
    except RuntimeError as error:
        if "NetCDF" not in str(error):
            raise
        raise OSError(f"{error} while writing; is the disk full?") from error
