"""Where each entry of a TOML document stands: key path -> line number.

The standard library's reader gives values without places.  This scanner walks the same text once more and
keeps the places alone; it relies on the text being valid TOML.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from aleafield.errors import InputError

KeyPath = tuple[str | int, ...]
"""Keys of tables and positions in arrays, from the root to an entry."""

_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_SPACE = re.compile(r"[ \t]*")
_BLANK = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_PLAIN_VALUE = re.compile(r"[^,\]}#\n]*")
_ESCAPE = re.compile(r"\\(?:u([0-9A-Fa-f]{4})|U([0-9A-Fa-f]{8})|(.))", re.DOTALL)
_ESCAPED = {"b": "\b", "t": "\t", "n": "\n", "f": "\f", "r": "\r", '"': '"', "\\": "\\"}


def key_positions(text: str) -> dict[KeyPath, int]:
    """Line (counted from 1) of every table, key and array element of a valid TOML document.

    A table stands where its header is, or where its first key is if it has no header; a dotted key gives its
    line to the tables that it makes on the way; an array of tables stands at its first header.

    >>> key_positions('a = 1\\n[b.c]\\nd = [2,\\n3]')[("b", "c", "d", 1)]
    4
    """
    return _Scanner(text).document()


def dotted_lines(text: str, data: Mapping[str, Any]) -> dict[str, int]:
    """The same by dotted key, as messages name entries.

    The entries of a `[[quantity]]` are found under its place (``quantity.0.level``) and under its name
    (``quantity.width.level``), the first of that name; a parameter also under its bare name, as its input is.
    """
    lines: dict[str, int] = {}
    names: dict[int, str] = {}
    tables, parameters = data.get("quantity"), data.get("parameters")
    if isinstance(tables, list):
        for index, entry in enumerate(tables):
            if isinstance(entry, dict) and isinstance(entry.get("name"), str):
                names[index] = entry["name"]
    for path, line in key_positions(text).items():
        lines.setdefault(".".join(str(part) for part in path), line)
        if len(path) > 1 and path[0] == "quantity" and path[1] in names:
            named = ("quantity", names[int(path[1])], *path[2:])
            lines.setdefault(".".join(str(part) for part in named), line)
    for name in parameters if isinstance(parameters, dict) else ():
        lines.setdefault(name, lines[f"parameters.{name}"])
    return lines


def line_of(lines: Mapping[str, int], key: str) -> int:
    """Line of an entry, or of the nearest table around it that is written down; 1 where there is none."""
    while key:
        if key in lines:
            return lines[key]
        key = key.rpartition(".")[0]
    return 1


def located(error: InputError, path: Path | None, lines: Mapping[str, int]) -> InputError:
    """The error with the file and the line of its key, if it has no file yet.

    A study without a file is called "study".
    """
    if error.file is not None:
        return error
    return error.placed("study" if path is None else path, line_of(lines, error.key))


class _Scanner:
    """One pass over a document; `at` is the position, `line` the line of the position `passed`."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.at = 0
        self.passed = 0
        self.line = 1
        self.places: dict[KeyPath, int] = {}
        self.counts: dict[KeyPath, int] = {}

    def document(self) -> dict[KeyPath, int]:
        table: KeyPath = ()
        self._skip(_BLANK)
        while self.at < len(self.text):
            if self.text[self.at] == "[":
                table = self._header()
            else:
                self._pair(table)
            self._skip(_BLANK)
        return self.places

    def _skip(self, pattern: re.Pattern[str]) -> str:
        match = pattern.match(self.text, self.at)
        if match is None:
            return ""
        self.at = match.end()
        return match.group()

    def _here(self) -> int:
        self.line += self.text.count("\n", self.passed, self.at)
        self.passed = self.at
        return self.line

    def _header(self) -> KeyPath:
        line = self._here()
        repeated = self.text.startswith("[[", self.at)
        self.at += 2 if repeated else 1
        keys = self._dotted_key()
        self.at += 2 if repeated else 1
        path: KeyPath = ()
        for key in keys[:-1]:
            path = (*path, key)
            self.places.setdefault(path, line)
            if path in self.counts:
                path = (*path, self.counts[path] - 1)
        path = (*path, keys[-1])
        if repeated:
            self.places.setdefault(path, line)
            self.counts[path] = self.counts.get(path, 0) + 1
            path = (*path, self.counts[path] - 1)
        self.places[path] = line
        return path

    def _pair(self, table: KeyPath) -> None:
        line = self._here()
        path = table
        for key in self._dotted_key():
            path = (*path, key)
            self.places.setdefault(path, line)
        self.at += 1  # the equals sign
        self._skip(_SPACE)
        self._value(path)

    def _dotted_key(self) -> list[str]:
        """Keys up to the sign after them; the position is left on that sign."""
        keys = []
        while True:
            self._skip(_SPACE)
            if self.text[self.at] in "\"'":
                keys.append(self._string())
            else:
                keys.append(self._skip(_BARE_KEY))
            self._skip(_SPACE)
            if self.text[self.at] != ".":
                return keys
            self.at += 1

    def _value(self, path: KeyPath) -> None:
        start = self.text[self.at]
        if start in "\"'":
            self._string()
        elif start == "[":
            self._array(path)
        elif start == "{":
            self._inline_table(path)
        else:
            self._skip(_PLAIN_VALUE)

    def _array(self, path: KeyPath) -> None:
        self.at += 1
        index = 0
        self._skip(_BLANK)
        while self.text[self.at] != "]":
            element = (*path, index)
            self.places[element] = self._here()
            self._value(element)
            index += 1
            self._comma()
        self.at += 1

    def _inline_table(self, path: KeyPath) -> None:
        self.at += 1
        self._skip(_BLANK)
        while self.text[self.at] != "}":
            self._pair(path)
            self._comma()
        self.at += 1

    def _comma(self) -> None:
        self._skip(_BLANK)
        if self.text[self.at] == ",":
            self.at += 1
            self._skip(_BLANK)

    def _string(self) -> str:
        """The text of a string of any of the four kinds; the position is left after it."""
        quote = self.text[self.at]
        long = self.text.startswith(quote * 3, self.at)
        fence = quote * 3 if long else quote
        self.at += len(fence)
        start = self.at
        while not self.text.startswith(fence, self.at):
            self.at += 2 if quote == '"' and self.text[self.at] == "\\" else 1
        if long:  # up to two quotation marks may stand before the closing three
            while self.text.startswith(fence, self.at + 1):
                self.at += 1
        content = self.text[start : self.at]
        self.at += len(fence)
        return content if quote == "'" else _ESCAPE.sub(_unescaped, content)


def _unescaped(match: re.Match[str]) -> str:
    code = match.group(1) or match.group(2)
    return chr(int(code, 16)) if code else _ESCAPED.get(match.group(3), match.group(3))
