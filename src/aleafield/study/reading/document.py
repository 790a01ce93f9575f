"""The text of a study file, its values, and the lines on which they stand."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from aleafield.errors import InputError
from aleafield.study.positions import dotted_lines

LARGEST = 4_000_000
"""Bytes that a study file may have; measurements belong in files of their own (`sampled`)."""

_PLACE = re.compile(r" \(at (?:line (\d+), column (\d+)|end of document)\)$")
_WORDS = {
    "Cannot overwrite a value": "a key that stands here twice",
    "Invalid value": "a value that cannot be read",
    "Illegal character '\\n'": "a string without its closing quotation mark",
    "Expected '=' after a key in a key/value pair": "no = after a key",
    "Expected newline or end of document after a statement": "something after the end of an entry",
    "Invalid statement": "a line that is neither an entry nor a [section]",
}
"""The parts of the parser's messages that say too little."""


@dataclass(frozen=True)
class Document:
    """A study file that is valid TOML.

    Attributes
    ----------
    path : Path or None
    text : str
        Exact text.
    data : mapping
        Its values.
    lines : mapping of dotted key to line
    """

    path: Path | None
    text: str
    data: Mapping[str, Any]
    lines: Mapping[str, int]


def name_of(path: Path | None) -> str:
    """What messages call the file."""
    return "study" if path is None else str(path)


def load(path: Path) -> str:
    """The text of a study file.

    Raises
    ------
    InputError
        Where there is no such file, or it is a folder, too large, or not UTF-8 text.
    """
    file = name_of(path)
    try:
        if path.is_dir():
            raise InputError("", "this is a folder", "name the study file in it", file=file)
        if not path.exists():
            nearest = _sibling(path)
            raise InputError("", "there is no such file", "name a study file", nearest=nearest, file=file)
        if not path.is_file():
            raise InputError("", "this is not a file", "name a study file", file=file)
        size = path.stat().st_size
        if size > LARGEST:
            needed = (
                f"a study file has at most {LARGEST}; measurements belong in files of their own (sampled)"
            )
            raise InputError("", f"{size} bytes", needed, file=file)
        content = path.read_bytes()
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        raise InputError("", f"the file cannot be read ({reason})", "name a study file", file=file) from None
    try:
        return content.decode("utf-8")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        found = f"the byte 0x{content[error.start]:02x} is not UTF-8 text"
        raise InputError("", found, "save the file as UTF-8", file=file, line=line) from None


def parse(text: str, path: Path | None) -> Document:
    """A document of the text of a study file; a byte order mark at its start is left out of account.

    Raises
    ------
    InputError
        Where the text is empty or not TOML, with the line.
    """
    file = name_of(path)
    body = text.removeprefix("\ufeff")
    try:
        data = tomllib.loads(body)
        lines = dotted_lines(body, data)
    except tomllib.TOMLDecodeError as error:
        found, line = _syntax_error(str(error), body)
        raise InputError("", found, "the file must be valid TOML", file=file, line=line) from None
    except RecursionError:
        found = "lists or tables nested too deeply"
        line = _line_with_most(r"[\[{]", body)
        raise InputError("", found, "no entry of a study needs it", file=file, line=line) from None
    except ValueError:  # Python reads no integer of more than some thousand digits
        line = _line_with_most(r"\d", body)
        raise InputError("", "a number of thousands of digits", "shorten it", file=file, line=line) from None
    if not data:
        needed = "a study needs a title, [domain], [kernel], [rate], [dynamics] and one [[quantity]]"
        raise InputError("", "the file holds no entries", needed, file=file, line=1)
    return Document(path, text, data, lines)


def _line_with_most(pattern: str, body: str) -> int:
    """The line in which most matches stand, counted from 1."""
    counts = [len(re.findall(pattern, line)) for line in body.split("\n")]
    return counts.index(max(counts)) + 1


def _syntax_error(message: str, body: str) -> tuple[str, int]:
    place = _PLACE.search(message)
    end = body.rstrip().count("\n") + 1
    line = int(place[1]) if place and place[1] else end
    what = message[: place.start()] if place else message
    for stiff, plain in _WORDS.items():
        if what.startswith(stiff):
            what = plain + what[len(stiff) :]
    declared = re.match(r"Cannot declare \((.*?),?\) twice", what)
    if declared:
        what = f"a second section {declared[1].replace(', ', '.')}"
    lines = body.split("\n")
    written = lines[line - 1].strip() if line <= len(lines) else ""
    if "in a key/value pair" in what or not written:
        return what, line
    shown = "".join(c if c.isprintable() else "?" for c in written)
    return f"{what}: {shown if len(shown) <= 60 else shown[:57] + '...'}", line


def _sibling(path: Path) -> str | None:
    from aleafield.formula import nearest_name

    folder = path.parent
    names = [p.name for p in folder.glob("*.toml")] if folder.is_dir() else []
    nearest = nearest_name(path.name, names)
    return None if nearest is None else str(path.with_name(nearest))
