"""Whatever is done to a study file, reading it gives a study or one message, never another exception."""

from __future__ import annotations

from pathlib import Path

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from aleafield.errors import InputError
from aleafield.study.reading import read_text
from aleafield.study.study import Study

ROOT = Path(__file__).resolve().parents[2]
VALID = [path.read_text(encoding="utf-8") for path in sorted((ROOT / "studies").glob("*.toml"))]
BROKEN = sorted((ROOT / "tests" / "messages").glob("*.toml"))
BROKEN_TEXTS = [path.read_bytes().decode("utf-8", errors="replace") for path in BROKEN]

INSERTIONS = [
    *("\n", '"', "'", "[", "]", "[[", "]]", "{", "}", "=", "#", ",", ".", "-", "\\", "\t", "\r\n", "\x00"),
    *("1e999", "nan", "-inf", "true", "0", "-1", "10000000000000000000", "2026-12-01", "[]", "{}", '""'),
    *('"uniform(0, 1)"', '"normal(0, 1)"', '"discrete([1], [0])"', "\"sampled('/', 'x')\""),
    *('"x"', '"t*u"', '"a.b"', '"1/0"', "\"__import__('os')\"", "\u00e9", "\u200b", "'''", '"""'),
    *("[parameters]", "[kernel]", "[scheme]\n", "nodes = 3\n"),
]
VALUES = st.one_of(st.sampled_from(INSERTIONS), st.text(max_size=8))


def read_or_refuse(text: str) -> None:
    """Read a text; a refusal must be one line that names the file and a line of it."""
    study: Study | None = None
    refused: InputError | None = None
    try:
        study = read_text(text, ROOT / "studies" / "mutated.toml")
    except InputError as error:
        refused = error
    if refused is not None:
        assert "\n" not in str(refused)
        assert refused.found
        assert refused.needed
        assert refused.line is not None
        assert 1 <= refused.line <= text.count("\n") + 1
        assert refused.exit_status == 2
    else:
        assert study is not None
        assert len(study.digest) == 64


@settings(max_examples=400, deadline=None, suppress_health_check=list(HealthCheck), derandomize=True)
@given(data=st.data())
def test_pieces_cut_out_and_put_in(data: st.DataObject) -> None:
    text = data.draw(st.sampled_from(VALID + BROKEN_TEXTS))
    for _ in range(data.draw(st.integers(1, 3))):
        start = data.draw(st.integers(0, len(text)))
        end = min(len(text), start + data.draw(st.integers(0, 12)))
        text = text[:start] + data.draw(VALUES) + text[end:]
    read_or_refuse(text)


@settings(max_examples=400, deadline=None, suppress_health_check=list(HealthCheck), derandomize=True)
@given(data=st.data())
def test_values_and_keys_replaced(data: st.DataObject) -> None:
    """Still valid TOML most of the time, so that the rules of the sections are what is tried."""
    lines = data.draw(st.sampled_from(VALID)).split("\n")
    entries = [place for place, line in enumerate(lines) if " = " in line and not line.startswith("#")]
    place = data.draw(st.sampled_from(entries))
    key, _, value = lines[place].partition(" = ")
    others = [lines[other].partition(" = ") for other in entries]
    kind = data.draw(st.sampled_from(["value", "key", "swap value", "swap key", "drop", "repeat"]))
    if kind == "value":
        lines[place] = f"{key} = {data.draw(VALUES)}"
    elif kind == "key":
        new = data.draw(st.text('abcxt._-" ', min_size=1, max_size=6))
        lines[place] = f"{new} = {value}"
    elif kind == "swap value":
        lines[place] = f"{key} = {data.draw(st.sampled_from(others))[2]}"
    elif kind == "swap key":
        lines[place] = f"{data.draw(st.sampled_from(others))[0]} = {value}"
    elif kind == "drop":
        del lines[place]
    else:
        lines.insert(data.draw(st.integers(0, len(lines))), lines[place])
    read_or_refuse("\n".join(lines))


@settings(max_examples=200, deadline=None, suppress_health_check=list(HealthCheck), derandomize=True)
@given(data=st.data())
def test_lines_moved_about(data: st.DataObject) -> None:
    lines = data.draw(st.sampled_from(VALID)).split("\n")
    for _ in range(data.draw(st.integers(1, 4))):
        line = lines.pop(data.draw(st.integers(0, len(lines) - 1)))
        lines.insert(data.draw(st.integers(0, len(lines))), line)
    read_or_refuse("\n".join(lines))


@settings(max_examples=100, deadline=None, derandomize=True)
@given(text=st.text(max_size=200))
def test_any_text(text: str) -> None:
    read_or_refuse(text)
