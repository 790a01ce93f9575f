"""Every broken study file gives its one message, with the line and the key written in its first line."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from aleafield.errors import InputError
from aleafield.study.reading import read_study
from tests.messages.expectations import Expectation, broken_files

FILES = broken_files()
READ = [entry for entry in FILES if not entry.by_a_run]
RUN = [entry for entry in FILES if entry.by_a_run]


def test_there_are_a_hundred_of_them() -> None:
    assert len(READ) >= 100


@pytest.mark.parametrize("entry", READ, ids=lambda entry: entry.path.stem)
def test_the_reader_says_what_is_wrong(entry: Expectation) -> None:
    with pytest.raises(InputError) as caught:
        read_study(entry.path)
    error = caught.value
    message = str(error)
    assert entry.says in message
    assert (error.key, error.line, error.exit_status) == (entry.key, entry.line, entry.status), message
    assert error.file == str(entry.path)
    assert "\n" not in message
    assert len(message) < 600


@pytest.mark.parametrize("entry", RUN, ids=lambda entry: entry.path.stem)
def test_what_only_a_run_can_find_is_read_without_complaint(entry: Expectation) -> None:
    assert read_study(entry.path).title


@pytest.mark.parametrize(
    ("name", "says"),
    [("nowhere.toml", "no such file"), ("", "this is a folder"), ("pipe", "this is not a file")],
)
def test_files_that_are_none(tmp_path: Path, name: str, says: str) -> None:
    os.mkfifo(tmp_path / "pipe")
    with pytest.raises(InputError, match=says):
        read_study(tmp_path / name)


def test_a_misspelt_file_name_finds_its_neighbour(tmp_path: Path) -> None:
    (tmp_path / "evoked.toml").write_text("title = 'a'\n")
    with pytest.raises(InputError) as caught:
        read_study(tmp_path / "evokd.toml")
    assert caught.value.nearest == str(tmp_path / "evoked.toml")
