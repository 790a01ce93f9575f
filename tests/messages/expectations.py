"""What the first line of every broken study file says about the message that the file must give."""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path

FOLDER = Path(__file__).resolve().parent

_FIRST_LINE = re.compile(
    r"# expect: (?:line (?P<line>\d+)|no line), key (?P<key>.+), "
    r'says "(?P<says>.+)", exit (?P<status>\d)(?P<run>, by a run)?'
)


@dataclass(frozen=True)
class Expectation:
    """The place, a fragment and the exit status of the message of a broken file.

    Attributes
    ----------
    path : Path
    line : int or None
        None where no line can be named.
    key : str
        Dotted key; empty where the whole file is meant.
    says : str
    status : int
        Exit status of the command line.
    by_a_run : bool
        Whether the fault shows only when samples are drawn or solved, not when the file is read.
    """

    path: Path
    line: int | None
    key: str
    says: str
    status: int
    by_a_run: bool


def expectation(path: Path) -> Expectation:
    """The expectation written in the first line of a file."""
    first = path.read_bytes().split(b"\n", 1)[0].decode("ascii")
    match = _FIRST_LINE.fullmatch(first)
    assert match, f"{path.name}: {first!r} states no expectation"
    return Expectation(
        path=path,
        line=None if match["line"] is None else int(match["line"]),
        key="" if match["key"] == "none" else match["key"],
        says=match["says"],
        status=int(match["status"]),
        by_a_run=match["run"] is not None,
    )


def broken_files() -> list[Expectation]:
    """All broken files of this folder."""
    return [expectation(path) for path in sorted(FOLDER.glob("*.toml"))]
