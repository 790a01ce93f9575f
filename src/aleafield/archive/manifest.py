"""The list of stored chunks: one JSON line each, appended and flushed after the chunk itself is safe."""

from __future__ import annotations

import json
from dataclasses import asdict, dataclass
from pathlib import Path

from aleafield.archive.durable import append_line


@dataclass(frozen=True)
class Entry:
    """One stored chunk.

    Attributes
    ----------
    file : str
        Name inside the parts folder.
    sha256 : str
        Hash of the file's bytes.
    session : str
        Which start of the run stored it.
    elapsed : float
        Wall-clock seconds from that start.
    seconds : float
        Processor time of the chunk.
    """

    file: str
    sha256: str
    session: str
    elapsed: float
    seconds: float


class Manifest:
    """Entries of a parts folder, in the order in which they were stored.

    Lines that are torn or otherwise unreadable are passed over: their chunks are computed again.
    """

    def __init__(self, path: Path) -> None:
        self._path = path
        self.entries: dict[str, Entry] = {}
        if path.exists():
            for line in path.read_bytes().split(b"\n"):
                entry = _read(line)
                if entry is not None:
                    self.entries[entry.file] = entry

    def add(self, entry: Entry) -> None:
        """Append an entry; on return it is safe on the disk."""
        append_line(self._path, json.dumps(asdict(entry)))
        self.entries[entry.file] = entry

    @property
    def wall_seconds(self) -> float:
        """Wall-clock time of all starts of the run up to their last stored chunks."""
        ends: dict[str, float] = {}
        for entry in self.entries.values():
            ends[entry.session] = max(ends.get(entry.session, 0.0), entry.elapsed)
        return sum(ends.values())

    @property
    def processor_seconds(self) -> float:
        """Processor time of all stored chunks."""
        return sum(entry.seconds for entry in self.entries.values())


def _read(line: bytes) -> Entry | None:
    try:
        entry = Entry(**json.loads(line))
    except (ValueError, TypeError):
        return None
    numbers = isinstance(entry.elapsed, (int, float)) and isinstance(entry.seconds, (int, float))
    texts = all(isinstance(text, str) for text in (entry.file, entry.sha256, entry.session))
    return entry if numbers and texts else None
