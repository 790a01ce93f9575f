"""A chunk read back is the chunk that was stored; a damaged one is noticed before it is opened."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from aleafield.archive.chunk_store import ChunkStore
from aleafield.archive.chunks import Chunk, Task, cut, decode, encode
from aleafield.archive.field_state import FieldState
from aleafield.archive.layout import Layout
from aleafield.archive.manifest import Manifest
from aleafield.ensemble.level import Level
from aleafield.ensemble.moments import FieldMoments
from aleafield.ensemble.records import Records
from aleafield.errors import Interrupted

LEVEL = Level(17, 33, -1)
DOUBLES = st.floats(width=64)
"""NaN, infinities, negative zero and subnormal numbers among them."""


@st.composite
def chunks(draw: st.DrawFn) -> Chunk:
    """Any chunk: names with spaces and dots, with and without inputs, margins, fields."""
    count = draw(st.integers(1, 9))
    first = draw(st.integers(0, 10**6))
    column = arrays(np.float64, count, elements=DOUBLES)
    inputs = st.dictionaries(st.sampled_from(["h", "rate.gain", "kernel.coefficients.1"]), column)
    values = st.dictionaries(st.sampled_from(["peak", "time of return", "width-1"]), column, min_size=1)
    records = Records(
        realizations=np.arange(first, first + count, dtype=np.int64),
        inputs=draw(inputs),
        values=draw(values),
        margins=draw(values) if draw(st.booleans()) else {},
        failed=draw(arrays(np.int64, count, elements=st.integers(0, 2))),
        failed_at=draw(column),
    )
    state = kept = None
    if draw(st.booleans()):
        sums = [draw(arrays(np.float64, (2, 3), elements=DOUBLES)) for _ in range(5)]
        band = draw(arrays(np.float64, (draw(st.integers(0, 2)), 2, 3), elements=DOUBLES))
        history = arrays(np.float64, (draw(st.integers(1, 3)), 2), elements=DOUBLES)
        histories = {name: draw(history) for name in draw(st.sampled_from([(), ("peak",), ("x.1", "a b")]))}
        state = FieldState(
            FieldMoments(count, sums[0], (sums[1], sums[2]), (sums[3], sums[4])), band, histories
        )
        kept = draw(arrays(np.float64, (count, 1, 3), elements=DOUBLES))
    return Chunk(first, records, state, kept, draw(st.floats(0, 1e6)))


def arrays_of(chunk: Chunk) -> list[tuple[str, bytes]]:
    """Everything in a chunk, named, to the bit."""
    records = chunk.records
    found: list[tuple[str, np.ndarray]] = [("realizations", records.realizations), ("failed", records.failed)]
    found.append(("failed_at", records.failed_at))
    for group in (records.inputs, records.values, records.margins):
        found += list(group.items())
    if chunk.state is not None:
        moments = chunk.state.moments
        found += [("sum", a) for a in (moments.reference, *moments.first, *moments.second)]
        found += [("band", chunk.state.band), ("count", np.array(chunk.state.moments.count))]
        found += list(chunk.state.histories.items())
    if chunk.kept is not None:
        found.append(("kept", chunk.kept))
    return [(name, array.tobytes()) for name, array in found]


@settings(deadline=None, max_examples=60, derandomize=True)
@given(chunks())
def test_round_trip(chunk: Chunk) -> None:
    back = decode(encode(chunk))
    assert arrays_of(back) == arrays_of(chunk)
    assert (back.first, back.seconds) == (chunk.first, chunk.seconds)


def a_chunk(task: Task) -> Chunk:
    """Some chunk of a task."""
    values = {"peak": np.arange(task.first, task.last, dtype=float)}
    numbers = np.zeros(task.count, dtype=np.int64)
    records = Records(np.arange(task.first, task.last), {}, values, {}, numbers, np.full(task.count, np.nan))
    return Chunk(task.first, records, seconds=1.5)


def test_tasks_cover_every_sample_once_and_are_cut_at_multiples_of_the_width() -> None:
    tasks = list(cut(LEVEL, 20, 100, 16))
    covered = np.concatenate([np.arange(task.first, task.last) for task in tasks])
    assert np.array_equal(covered, np.arange(20, 100))
    assert [task.first for task in tasks] == [20, 32, 48, 64, 80, 96]
    assert all(len(task.indices) % 8 == 0 for task in tasks)
    assert tasks[0].indices.tolist() == [*range(20, 32), 31, 31, 31, 31]


@pytest.mark.parametrize("place", [0, 100, -1])
def test_a_damaged_chunk_is_noticed(tmp_path: Path, place: int) -> None:
    store, task = ChunkStore(Layout(tmp_path)), Task(LEVEL, 0, 5)
    store.put(task, a_chunk(task))
    assert store.holds(task)
    path = tmp_path / "parts" / task.name
    data = bytearray(path.read_bytes())
    data[place] ^= 1
    path.write_bytes(data)
    assert not store.holds(task)
    with pytest.raises(Interrupted, match="damaged"):
        store.get(task)
    store.put(task, a_chunk(task))
    assert ChunkStore(Layout(tmp_path)).holds(task)


def test_a_missing_chunk_is_noticed(tmp_path: Path) -> None:
    store, task = ChunkStore(Layout(tmp_path)), Task(LEVEL, 0, 5)
    store.put(task, a_chunk(task))
    (tmp_path / "parts" / task.name).unlink()
    assert not store.holds(task)


def test_every_torn_last_line_of_the_manifest_is_passed_over(tmp_path: Path) -> None:
    """A crash may cut the manifest at any byte: earlier lines stay good, later ones are not glued on."""
    store = ChunkStore(Layout(tmp_path))
    tasks = list(cut(LEVEL, 0, 24, 8))
    for task in tasks:
        store.put(task, a_chunk(task))
    path = tmp_path / "parts" / "manifest.jsonl"
    whole = path.read_bytes()
    start = whole.rstrip(b"\n").rfind(b"\n") + 1
    for size in range(start, len(whole) - 1):
        path.write_bytes(whole[:size])
        again = ChunkStore(Layout(tmp_path))
        assert [again.holds(task) for task in tasks] == [True, True, False]
    again.put(tasks[2], a_chunk(tasks[2]))
    assert set(Manifest(path).entries) == {task.name for task in tasks}


@pytest.mark.parametrize(
    "line", ["[]", "{}", "nonsense", '{"file": 1}', "\x00\x00", '{"file": "a", "sha256": 3}']
)
def test_lines_that_say_nothing_are_passed_over(tmp_path: Path, line: str) -> None:
    store, task = ChunkStore(Layout(tmp_path)), Task(LEVEL, 0, 5)
    path = tmp_path / "parts" / "manifest.jsonl"
    path.write_text(line + "\n")
    store.put(task, a_chunk(task))
    assert ChunkStore(Layout(tmp_path)).holds(task)


def test_wall_time_counts_every_start_of_the_run(tmp_path: Path) -> None:
    path = tmp_path / "manifest.jsonl"
    lines = [("a", "s1", 10.0), ("b", "s1", 12.5), ("c", "s2", 4.0)]
    entry = '{{"file": "{}", "sha256": "", "session": "{}", "elapsed": {}, "seconds": 2.0}}\n'
    path.write_text("".join(entry.format(*line) for line in lines))
    assert Manifest(path).wall_seconds == 16.5
    assert Manifest(path).processor_seconds == 6.0
