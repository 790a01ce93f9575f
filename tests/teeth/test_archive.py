"""Faults in the archive that its tests must see."""

from __future__ import annotations

from collections.abc import Callable
from contextlib import nullcontext
from dataclasses import replace
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

import numpy as np

from aleafield.archive.chunk_store import ChunkStore
from aleafield.archive.durable import append_line
from aleafield.archive.field_state import FieldState
from aleafield.archive.lock import locked
from aleafield.archive.manifest import Manifest
from aleafield.ensemble.moments import FieldMoments
from aleafield.ensemble.pairs import two_sum
from aleafield.runs.execution import tasks_of
from aleafield.runs.folder import claimed_plan
from aleafield.runs.plan_file import read_plan
from aleafield.runs.run import run
from tests.archive import test_chunks, test_repeats, test_run
from tests.archive.small_runs import assert_same_values, extend, small_run
from tests.archive.studies import linear_ring
from tests.teeth.biting import Check, Tooth, assert_bites, everywhere, member, teeth


def in_a_folder(test: Callable[..., None], *more: Any) -> Check:
    """A test that takes a folder of its own."""

    def check() -> None:
        with TemporaryDirectory() as folder:
            test(Path(folder), *more)

    return check


def widths_agree(folder: Path) -> None:
    """Chunks of 16 and of 40 samples give one ensemble."""
    for width in (16, 40):
        small_run(folder / str(width), 64, width)
    assert_same_values(folder / "40", folder / "16")


def extension_agrees(folder: Path) -> None:
    """A run of 32 samples, extended, is a run of 64; Monte Carlo, so that any count is kept."""
    small_run(folder / "short", 32, 16, method="monte carlo")
    extend(folder / "short", 64)
    small_run(folder / "long", 64, 16, method="monte carlo")
    assert_same_values(folder / "short", folder / "long")


def fans_agree(folder: Path) -> None:
    """The suite's test of fans on a run of its own."""
    small_run(folder, 128, 16, repeats=test_repeats.REPEATS)
    test_repeats.test_fans_and_single_paths(folder)


def refused_where_changed(folder: Path) -> None:
    """The suite's test on a finished run of its own."""
    run(linear_ring(64), folder / "out", workers=1)
    test_run.test_a_changed_study_is_refused(folder / "out")


def unverified(self: ChunkStore, task: Any) -> bytes | None:
    """What lies there is taken as it is."""
    path = self._layout.parts / task.name
    return path.read_bytes() if path.exists() else None


def glued(path: Path, line: str) -> None:
    """A line is appended whatever stands before it."""
    with path.open("a") as file:
        file.write(line + "\n")


def first_tasks_again(plan: Any, stored: Any) -> Any:
    """What an extension needs is solved from the first sample on: old and new are counted twice."""
    return [
        replace(task, first=task.first - stored.realizations) if task.level == plan.level else task
        for task in tasks_of(plan, stored)
    ]


@teeth(
    Tooth(
        "a chunk whose hash is not compared",
        member(ChunkStore, "_verified", unverified),
        in_a_folder(test_chunks.test_a_damaged_chunk_is_noticed, -1),
    ),
    Tooth(
        "a chunk that need not be there",
        member(ChunkStore, "holds", lambda self, task: task.name in self._manifest.entries),
        in_a_folder(test_chunks.test_a_missing_chunk_is_noticed),
    ),
    Tooth(
        "a line glued to a torn one",
        everywhere(append_line, glued),
        in_a_folder(test_chunks.test_every_torn_last_line_of_the_manifest_is_passed_over),
    ),
    Tooth(
        "a torn manifest taken for an empty one",
        member(
            Manifest,
            "__init__",
            lambda self, path, real=Manifest.__init__: (
                real(self, path)
                if not path.exists() or path.read_bytes().endswith(b"\n")
                else real(self, path.with_suffix(".none"))
            ),
        ),
        in_a_folder(test_chunks.test_every_torn_last_line_of_the_manifest_is_passed_over),
    ),
    Tooth(
        "wall time of the last start only",
        member(Manifest, "wall_seconds", property(lambda self: list(self.entries.values())[-1].elapsed)),
        in_a_folder(test_chunks.test_wall_time_counts_every_start_of_the_run),
    ),
    Tooth(
        "sums that round by the chunk",
        everywhere(two_sum, lambda a, b: (a + b, np.zeros_like(a + b))),
        in_a_folder(widths_agree),
    ),
    Tooth(
        "moments of the last chunk alone",
        member(FieldMoments, "__add__", lambda self, other: other),
        in_a_folder(widths_agree),
    ),
    Tooth(
        "fans of the first chunk alone",
        member(
            FieldState,
            "__add__",
            lambda self, other, real=FieldState.__add__: replace(real(self, other), histories=self.histories),
        ),
        in_a_folder(fans_agree),
    ),
    Tooth(
        "an extension that begins again",
        everywhere(tasks_of, first_tasks_again),
        in_a_folder(extension_agrees),
    ),
    Tooth(
        "a lock that holds nobody back",
        everywhere(locked, lambda layout: nullcontext()),
        in_a_folder(test_run.test_lock_of_a_living_process),
    ),
    Tooth(
        "a changed study in a used folder",
        everywhere(claimed_plan, lambda layout, study: read_plan(layout) if layout.plan.exists() else None),
        in_a_folder(refused_where_changed),
    ),
)
def test_storage(tooth: Tooth) -> None:
    assert_bites(tooth)
