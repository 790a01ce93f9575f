"""Every broken study of tests/messages through the command: one message, its exit status, no traceback."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.command.saying import assert_one_message, say
from tests.messages.expectations import Expectation, broken_files

FILES = broken_files()


@pytest.mark.parametrize("entry", FILES, ids=lambda entry: entry.path.stem)
def test_run_says_what_is_wrong(
    capsys: pytest.CaptureFixture[str], tmp_path: Path, entry: Expectation
) -> None:
    said = say(capsys, "run", entry.path, "--out", tmp_path / "out", "--workers", 1, "--quiet")
    assert_one_message(said, entry.status)
    assert entry.says in said.err
    if entry.line is not None:
        key = f" {entry.key}: " if entry.key else " "
        assert said.err.startswith(f"aleafield: {entry.path}:{entry.line}:{key}")
    if entry.status == 2:
        assert not any(tmp_path.glob("out/*")), "a study at fault leaves nothing behind"


@pytest.mark.parametrize("entry", [e for e in FILES if not e.by_a_run], ids=lambda entry: entry.path.stem)
def test_check_says_the_same(capsys: pytest.CaptureFixture[str], entry: Expectation) -> None:
    said = say(capsys, "check", entry.path, "--json")
    assert_one_message(said, entry.status)
    assert entry.says in said.err


def test_check_finds_impossible_samples_too(capsys: pytest.CaptureFixture[str]) -> None:
    """A width that an expression makes negative for some sample: nothing need be solved to see that."""
    entry = next(e for e in FILES if e.path.stem == "width_impossible_through_an_expression")
    assert_one_message(say(capsys, "check", entry.path), 2)
