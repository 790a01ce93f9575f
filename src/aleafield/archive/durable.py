"""Files that are either whole or not there, also after the power fails.

A file is written under a temporary name, flushed to the disk, renamed, and its folder flushed: `os.replace`
is atomic on one file system, and a name is safe only once its folder is (Pillai et al. 2014, OSDI, "All file
systems are not created equal", from memory).  One process writes in a folder at a time, so temporary names
need not be unique.
"""

from __future__ import annotations

import json
import os
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from aleafield.archive.layout import PARTIAL
from aleafield.errors import Interrupted


@contextmanager
def storing(path: Path) -> Iterator[None]:
    """Turn a failure of the disk into one message; what was stored before is safe.

    Raises
    ------
    Interrupted
        Naming the file and the reason; the same command goes on once that is put right.
    """
    try:
        yield
    except OSError as error:
        reason = error.strerror or str(error)
        raise Interrupted(
            f"{path}: cannot be written ({reason}); what was stored before is safe: put that right and run "
            "the same command again"
        ) from error


def partial(path: Path) -> Path:
    """The temporary name of a file."""
    return path.with_name(f".{path.name}{PARTIAL}")


def commit(path: Path) -> None:
    """Flush the file that stands under the temporary name of `path` and give it its name."""
    with storing(path):
        descriptor = os.open(partial(path), os.O_RDWR)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)
        os.replace(partial(path), path)
        sync_folder(path.parent)


def write_bytes(path: Path, data: bytes) -> None:
    """Write a whole file."""
    with storing(path):
        descriptor = os.open(partial(path), os.O_WRONLY | os.O_CREAT | os.O_TRUNC, 0o644)
        try:
            _write_all(descriptor, data)
        finally:
            os.close(descriptor)
    commit(path)


def write_json(path: Path, document: Any) -> None:
    """Write a JSON document; NaN and Infinity are refused with ValueError, since JSON has neither."""
    text = json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False)
    write_bytes(path, (text + "\n").encode())


def append_line(path: Path, line: str) -> None:
    """Add one line to a file and flush it; a line torn by an earlier crash is closed first."""
    with storing(path):
        descriptor = os.open(path, os.O_RDWR | os.O_CREAT | os.O_APPEND, 0o644)
        try:
            size = os.fstat(descriptor).st_size
            torn = size > 0 and os.pread(descriptor, 1, size - 1) != b"\n"
            _write_all(descriptor, ("\n" if torn else "").encode() + line.encode() + b"\n")
            os.fsync(descriptor)
        finally:
            os.close(descriptor)
        if size == 0:
            sync_folder(path.parent)


def make_folder(path: Path) -> None:
    """Make a folder (and those above it) where there is none."""
    with storing(path):
        if not path.is_dir():
            path.mkdir(parents=True)
            sync_folder(path.parent)


def remove(path: Path) -> None:
    """Remove a file or a folder with all that it holds, where there is one."""
    with storing(path):
        if path.is_dir():
            shutil.rmtree(path)
        else:
            path.unlink(missing_ok=True)


def remove_partials(folder: Path) -> None:
    """Remove what a killed run left under temporary names."""
    for path in folder.glob(f".*{PARTIAL}"):
        remove(path)


def sync_folder(folder: Path) -> None:
    """Flush the names of a folder."""
    descriptor = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)


def _write_all(descriptor: int, data: bytes) -> None:
    view = memoryview(data)
    while view:
        view = view[os.write(descriptor, view) :]
