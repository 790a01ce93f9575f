"""The folder of chunks: put, verify, get."""

from __future__ import annotations

import hashlib
import time
import uuid

from aleafield.archive.chunks import Chunk, Task, decode, encode
from aleafield.archive.durable import make_folder, remove_partials, write_bytes
from aleafield.archive.layout import Layout
from aleafield.archive.manifest import Entry, Manifest
from aleafield.errors import Interrupted


class ChunkStore:
    """Chunks of one run, each a file of its own, with the manifest that vouches for them.

    Tasks are idempotent: the same task has the same file name, and storing it again replaces the file.

    Parameters
    ----------
    layout : Layout
    """

    def __init__(self, layout: Layout) -> None:
        self._layout = layout
        make_folder(layout.parts)
        remove_partials(layout.parts)
        self._manifest = Manifest(layout.manifest)
        self._session = uuid.uuid4().hex[:12]
        self._start = time.monotonic()

    def put(self, task: Task, chunk: Chunk) -> None:
        """Store a chunk; on return it is safe on the disk."""
        data = encode(chunk)
        write_bytes(self._layout.parts / task.name, data)
        elapsed = time.monotonic() - self._start
        digest = hashlib.sha256(data).hexdigest()
        self._manifest.add(Entry(task.name, digest, self._session, elapsed, chunk.seconds))

    def holds(self, task: Task) -> bool:
        """Whether the chunk of a task is stored and whole; its bytes are read and their hash compared."""
        return self._verified(task) is not None

    def get(self, task: Task) -> Chunk:
        """The stored chunk of a task, its hash verified before it is opened.

        Raises
        ------
        Interrupted
            When it is missing or damaged; the same command computes it again.
        """
        data = self._verified(task)
        if data is None:
            raise Interrupted(
                f"{self._layout.parts / task.name}: missing or damaged since it was stored; run the same "
                "command again, and it is computed anew"
            )
        return decode(data)

    @property
    def wall_seconds(self) -> float:
        """Wall-clock time spent, over all starts of the run."""
        return self._manifest.wall_seconds

    @property
    def processor_seconds(self) -> float:
        """Processor time spent on all chunks."""
        return self._manifest.processor_seconds

    def _verified(self, task: Task) -> bytes | None:
        entry = self._manifest.entries.get(task.name)
        if entry is None:
            return None
        try:
            data = (self._layout.parts / task.name).read_bytes()
        except OSError:
            return None
        return data if hashlib.sha256(data).hexdigest() == entry.sha256 else None
