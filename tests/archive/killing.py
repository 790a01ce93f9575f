"""Runs in processes of their own that are stopped half-way."""

from __future__ import annotations

import subprocess
import time
from collections.abc import Callable
from pathlib import Path


def stored(folder: Path) -> int:
    """Number of chunks that lie in the parts folder."""
    return len(list(folder.glob("parts/n*.nc")))


def wait_until(condition: Callable[[], bool], process: subprocess.Popen[str]) -> bool:
    """Poll until the condition holds; False when the process ended before."""
    while not condition():
        if process.poll() is not None:
            return False
        time.sleep(0.001)
    return True


def kill(process: subprocess.Popen[str]) -> None:
    """SIGKILL; its workers hold its pipes, so the pipes close only when they have ended too."""
    process.kill()
    process.communicate(timeout=20)
