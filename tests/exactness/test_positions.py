"""Positions of keys: documents are written line by line, so that every key's line is known beforehand."""

from __future__ import annotations

import json
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

from hypothesis import given, settings
from hypothesis import strategies as st

from aleafield.study.positions import KeyPath, dotted_lines, key_positions, line_of

ROOT = Path(__file__).resolve().parents[2]

BY_HAND = '''# a comment with [brackets] and = signs
title = """three
lines, a quotation mark " and [not.a.table]
here""" # and a comment
"quoted.key" = 'a # that is no comment'
a.b.c = { d = 1, "e f" = [2, 3] }   # inline

[table . "inner part"]
x = [
  1, # one
  { y = 2 },

  [3,
   4],
]

[[list]]
n = 1
[list.below]
m = 2
[[list]]
[[list.deep]]
k = \'\'\'
'' \'\'\'
when = 2026-12-01 10:00:00
[table]
last = "a \\"quoted\\" \\\\"
'''


def test_a_document_written_by_hand() -> None:
    """Every table, key and element, counted by eye."""
    assert key_positions(BY_HAND) == {
        ("title",): 2,
        ("quoted.key",): 5,
        ("a",): 6,
        ("a", "b"): 6,
        ("a", "b", "c"): 6,
        ("a", "b", "c", "d"): 6,
        ("a", "b", "c", "e f"): 6,
        ("a", "b", "c", "e f", 0): 6,
        ("a", "b", "c", "e f", 1): 6,
        ("table",): 26,
        ("table", "inner part"): 8,
        ("table", "inner part", "x"): 9,
        ("table", "inner part", "x", 0): 10,
        ("table", "inner part", "x", 1): 11,
        ("table", "inner part", "x", 1, "y"): 11,
        ("table", "inner part", "x", 2): 13,
        ("table", "inner part", "x", 2, 0): 13,
        ("table", "inner part", "x", 2, 1): 14,
        ("list",): 17,
        ("list", 0): 17,
        ("list", 0, "n"): 18,
        ("list", 0, "below"): 19,
        ("list", 0, "below", "m"): 20,
        ("list", 1): 21,
        ("list", 1, "deep"): 22,
        ("list", 1, "deep", 0): 22,
        ("list", 1, "deep", 0, "k"): 23,
        ("list", 1, "deep", 0, "when"): 25,
        ("table", "last"): 27,
    }


def paths_in(value: Any, path: KeyPath = ()) -> set[KeyPath]:
    """Paths of all tables, keys and elements of a parsed document."""
    found = {path} if path else set()
    entries = (
        value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    )
    for key, entry in entries:
        found |= paths_in(entry, (*path, key))
    return found


def test_the_shipped_studies_have_a_line_for_everything() -> None:
    studies = sorted((ROOT / "studies").glob("*.toml"))
    assert studies
    for study in studies:
        text = study.read_text(encoding="utf-8")
        places = key_positions(text)
        assert set(places) == paths_in(tomllib.loads(text))
        lines = text.split("\n")
        for path, line in places.items():
            name = next(part for part in reversed(path) if isinstance(part, str))
            if isinstance(path[-1], str):
                assert name in lines[line - 1]


def _written(value: Any) -> str:
    return json.dumps(value, ensure_ascii=True)


KEYS = st.one_of(
    st.from_regex(r"[A-Za-z0-9_-]{1,6}", fullmatch=True),
    st.text(st.characters(codec="ascii", min_codepoint=32, exclude_characters="\x7f"), max_size=6),
)
WORDS = st.text(
    st.characters(codec="utf-8", min_codepoint=32, max_codepoint=0xFFFF, exclude_characters="\x7f\\'"),
    max_size=12,
)
Writer = Callable[["Lines", KeyPath], None]
"""Appends a value to the lines of a document and records where its elements stand."""


class Lines:
    """A document as it grows; `places` holds the line of every path, counted while writing."""

    def __init__(self) -> None:
        self.text = ""
        self.places: dict[KeyPath, int] = {}

    def mark(self, path: KeyPath) -> None:
        """The path stands on the current line, if it stands nowhere yet."""
        self.places.setdefault(path, self.text.count("\n") + 1)


def _scalar(text: str) -> Writer:
    def write(lines: Lines, path: KeyPath) -> None:
        lines.text += text

    return write


def _array(entries: list[tuple[Writer, str]]) -> Writer:
    def write(lines: Lines, path: KeyPath) -> None:
        lines.text += "["
        for index, (entry, gap) in enumerate(entries):
            lines.text += gap
            lines.mark((*path, index))
            entry(lines, (*path, index))
            lines.text += gap + ","
        lines.text += "]"

    return write


def _inline(entries: dict[str, Writer]) -> Writer:
    def write(lines: Lines, path: KeyPath) -> None:
        lines.text += "{"
        for index, (key, entry) in enumerate(entries.items()):
            lines.text += (", " if index else " ") + _written(key) + " = "
            lines.mark((*path, key))
            entry(lines, (*path, key))
        lines.text += " }"

    return write


GAPS = st.sampled_from(["", " ", "\n", '\n  # ] no end, "\n', "\t"])
SCALARS = st.one_of(
    st.sampled_from(["1", "-2.5e3", "true", "nan", "2026-12-01", "1979-05-27 07:32:00", "0x1F", '""', "''"]),
    WORDS.map(_written),
    WORDS.map(lambda word: "'" + word.replace("'", "") + "'"),
    WORDS.map(lambda word: '"""' + word.replace('"', "") + '\n=[\\"\\\\ """'),
    WORDS.map(lambda word: "'''" + word + "\n# [x]\n'''"),
).map(_scalar)
VALUES = st.recursive(
    SCALARS,
    lambda inner: st.one_of(
        st.lists(st.tuples(inner, GAPS), max_size=3).map(_array),
        st.dictionaries(KEYS, inner, max_size=3).map(_inline),
    ),
    max_leaves=6,
)
TABLES = st.dictionaries(KEYS, VALUES, max_size=4)
BREAKS = st.sampled_from(["\n", "\r\n", "\n\n", " # a = 1\n", "\n# [no.table]\n"])


@settings(max_examples=300, deadline=None)
@given(
    top=TABLES,
    tables=st.dictionaries(KEYS, TABLES, max_size=3),
    rows=st.lists(TABLES, max_size=3),
    end=BREAKS,
)
def test_documents_whose_lines_are_counted_while_they_are_written(
    top: dict[str, Writer], tables: dict[str, dict[str, Writer]], rows: list[dict[str, Writer]], end: str
) -> None:
    lines = Lines()
    body: list[tuple[str, KeyPath, dict[str, Writer]]] = [("", (), top)]
    body += [
        (f"[ {_written(name)} ]", (name,), entries) for name, entries in tables.items() if name not in top
    ]
    if "rows" not in top and "rows" not in tables:
        body += [("[[rows]]", ("rows", index), entries) for index, entries in enumerate(rows)]
    for header, path, entries in body:
        if header:
            lines.mark(path[:1])
            lines.mark(path)
            lines.text += header + end
        for key, write in entries.items():
            lines.mark((*path, key))
            lines.text += f"{_written(key)} = "
            write(lines, (*path, key))
            lines.text += end
    assert set(lines.places) == paths_in(tomllib.loads(lines.text))
    assert key_positions(lines.text) == lines.places


def test_entries_of_quantities_are_found_by_name() -> None:
    text = "[parameters]\nh = 1\n[[quantity]]\nname = 'a b'\nlevel = 1\n[[quantity]]\nname = 'c'\n"
    lines = dotted_lines(text, tomllib.loads(text))
    assert lines["quantity.0.level"] == lines["quantity.a b.level"] == 5
    assert lines["quantity.c.name"] == 7
    assert lines["h"] == 2
    assert line_of(lines, "quantity.c.level") == 6
    assert line_of(lines, "domain.from") == 1
