"""One process at a time in a results folder."""

from __future__ import annotations

import fcntl
import os
from collections.abc import Iterator
from contextlib import contextmanager

from aleafield.archive.durable import storing
from aleafield.archive.layout import Layout
from aleafield.errors import ArchiveError


@contextmanager
def locked(layout: Layout) -> Iterator[None]:
    """Hold the folder's lock; the system releases it when the process ends, however it ends.

    Raises
    ------
    ArchiveError
        When another living process holds it, naming the process.
    """
    descriptor = _acquire(layout)
    try:
        yield
    finally:
        layout.lock.unlink(missing_ok=True)
        os.close(descriptor)


def _acquire(layout: Layout) -> int:
    while True:
        with storing(layout.lock):
            descriptor = os.open(layout.lock, os.O_RDWR | os.O_CREAT, 0o644)
        try:
            fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            holder = os.pread(descriptor, 32, 0).decode(errors="replace").strip()
            os.close(descriptor)
            raise ArchiveError(
                f"{layout.folder}: another aleafield process{f' ({holder})' if holder else ''} is at work in "
                "this folder; wait for its end or choose another folder"
            ) from None
        if _is_current(layout, descriptor):
            os.ftruncate(descriptor, 0)
            os.pwrite(descriptor, f"process {os.getpid()}\n".encode(), 0)
            return descriptor
        os.close(descriptor)  # its holder removed the file between our open and our lock


def _is_current(layout: Layout, descriptor: int) -> bool:
    try:
        return os.stat(layout.lock).st_ino == os.fstat(descriptor).st_ino
    except FileNotFoundError:
        return False
