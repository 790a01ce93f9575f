"""The command `aleafield` called, in this process or in one of its own, and everything that it says."""

from __future__ import annotations

import os
import subprocess
import sys
import traceback
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import pytest

from aleafield.cli import main
from tests.archive.studies import linear_ring

ROOT = Path(__file__).resolve().parents[2]


@dataclass(frozen=True)
class Said:
    """Exit status and the two streams of one call."""

    status: int
    out: str
    err: str


def say(capsys: pytest.CaptureFixture[str], *arguments: object) -> Said:
    """Call the command in this process; an exception ends it as it would end the interpreter."""
    capsys.readouterr()
    try:
        status = main([str(argument) for argument in arguments])
    except SystemExit as ended:  # how the parser of arguments ends
        status = int(ended.code or 0)
    except Exception:
        traceback.print_exc()
        status = 1
    captured = capsys.readouterr()
    return Said(status, captured.out, captured.err)


def command_line(*arguments: object) -> list[str]:
    """The command as words of a shell."""
    return [sys.executable, "-m", "aleafield", *map(str, arguments)]


def surroundings(**more: str) -> dict[str, str]:
    """Environment of a process of its own: the sources of this folder, streams with buffers."""
    inherited = {name: value for name, value in os.environ.items() if name != "PYTHONUNBUFFERED"}
    return {**inherited, "PYTHONPATH": str(ROOT / "src"), "OPENBLAS_NUM_THREADS": "1", **more}


def start(words: Sequence[str], **more: str) -> subprocess.Popen[str]:
    """Start a process of its own with both streams in pipes."""
    return subprocess.Popen(
        words,
        cwd=ROOT,
        env=surroundings(**more),
        text=True,
        encoding="utf-8",
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
    )


def ended(process: subprocess.Popen[str]) -> Said:
    """Wait for the end of a process."""
    out, err = process.communicate(timeout=120)
    return Said(process.returncode, out, err)


def study_file(path: Path, **changes: object) -> Path:
    """A file with the study of `linear_ring`, changed."""
    path.write_text(linear_ring(**changes).source.text, encoding="utf-8")  # type: ignore[arg-type]
    return path


def assert_one_message(said: Said, status: int) -> None:
    """One message on standard error, nothing on standard output, the exit status; never a traceback."""
    assert said.status == status, said.err
    assert said.out == ""
    assert said.err.startswith("aleafield: ")
    assert said.err.endswith("\n")
    assert said.err.count("\n") == 1, said.err
    assert "Traceback" not in said.err
