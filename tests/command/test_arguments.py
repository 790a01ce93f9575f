"""Arguments at fault: exit status 2 and one message, whatever the command."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from aleafield.study.reading import read_text
from tests.command.saying import (
    Said,
    assert_one_message,
    command_line,
    ended,
    say,
    start,
    study_file,
    surroundings,
)

COMMANDS = ("check", "run", "report", "extend", "compare", "verify")


@pytest.fixture
def study(tmp_path: Path) -> Path:
    """A study file beside which nothing lies."""
    return study_file(tmp_path / "study.toml")


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        ([], "COMMAND"),
        (["rnu", "study.toml"], "'rnu'"),
        (["run", "study.toml"], "--out"),
        (["run", "study.toml", "--out", "d", "--workers", "many"], "'many'"),
        (["run", "study.toml", "--out", "d", "--worker", "1"], "--worker"),
        (["extend", "d"], "--samples"),
        (["extend", "d", "--samples", "1e3"], "'1e3'"),
        (["compare", "d"], "DIR_B"),
        (["verify", "front"], "front"),
    ],
)
def test_words_that_no_command_reads(
    capsys: pytest.CaptureFixture[str], arguments: list[str], says: str
) -> None:
    """The usage, then one line that names the word."""
    said = say(capsys, *arguments)
    assert (said.status, said.out) == (2, "")
    assert said.err.startswith("usage: aleafield")
    last = said.err.strip().splitlines()[-1]
    assert says in last
    assert "error: " in last


def test_an_unknown_command_is_told_the_known_ones(capsys: pytest.CaptureFixture[str]) -> None:
    said = say(capsys, "rnu")
    assert all(f"'{name}'" in said.err for name in COMMANDS)


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_its_help(capsys: pytest.CaptureFixture[str], name: str) -> None:
    assert name in say(capsys, "--help").out
    said = say(capsys, name, "--help")
    assert (said.status, said.err) == (0, "")
    assert "--json" in said.out


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    from importlib.metadata import version

    assert say(capsys, "--version") == Said(0, f"aleafield {version('aleafield')}\n", "")


@pytest.mark.parametrize("workers", [0, -1])
def test_no_workers(capsys: pytest.CaptureFixture[str], study: Path, workers: int) -> None:
    said = say(capsys, "run", study, "--out", study.parent / "out", "--workers", workers)
    assert_one_message(said, 2)
    assert f"workers: {workers} given" in said.err
    assert not (study.parent / "out").exists(), "a refused call leaves nothing"


def test_check_of_a_missing_file_prints_a_study_that_reads(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    for more in ([], ["--json"]):
        said = say(capsys, "check", tmp_path / "nowhere.toml", *more)
        assert (said.status, said.out) == (2, "")
        message, text = said.err.split("\n\n", 1)
        assert message.startswith(f"aleafield: {tmp_path / 'nowhere.toml'}: there is no such file")
        assert "[[quantity]]" in text
        assert read_text(text).quantities[0].measure == "active width"
    (tmp_path / "minimal.toml").write_text(text)
    assert say(capsys, "check", tmp_path / "minimal.toml").status == 0


@pytest.mark.parametrize("name", ["run", "check"])
def test_a_study_that_is_a_folder(capsys: pytest.CaptureFixture[str], tmp_path: Path, name: str) -> None:
    more = ["--out", tmp_path / "out"] if name == "run" else []
    said = say(capsys, name, tmp_path, *more)
    assert_one_message(said, 2)
    assert "this is a folder" in said.err


def test_run_of_a_missing_file(capsys: pytest.CaptureFixture[str], study: Path) -> None:
    said = say(capsys, "run", study.parent / "studdy.toml", "--out", study.parent / "out")
    assert_one_message(said, 2)
    assert f"did you mean '{study}'?" in said.err


@pytest.mark.parametrize("name", ["report", "extend", "compare"])
def test_a_folder_without_results(capsys: pytest.CaptureFixture[str], tmp_path: Path, name: str) -> None:
    more: dict[str, list[object]] = {"report": [], "extend": ["--samples", 64], "compare": [tmp_path]}
    for folder in (tmp_path, tmp_path / "nowhere"):
        said = say(capsys, name, folder, *more[name])
        assert_one_message(said, 2)
        assert str(folder) in said.err
    assert not (tmp_path / "nowhere").exists()


def test_run_into_a_file(capsys: pytest.CaptureFixture[str], study: Path) -> None:
    before = study.read_bytes()
    said = say(capsys, "run", study, "--out", study)
    assert_one_message(said, 2)
    assert "is a file; a folder is needed" in said.err
    assert study.read_bytes() == before


@pytest.mark.parametrize("name", ["notes.txt", "study.toml", "ensemble.nc", ".hidden"])
def test_run_into_a_foreign_folder(capsys: pytest.CaptureFixture[str], study: Path, name: str) -> None:
    """Also where its files bear the names of a run's."""
    folder = study.parent / "mine"
    folder.mkdir()
    (folder / name).write_text("mine\n")
    said = say(capsys, "run", study, "--out", folder)
    assert_one_message(said, 2)
    assert f"not empty, and not a results folder of aleafield (it holds {name})" in said.err
    assert [path.name for path in folder.iterdir()] == [name]
    assert (folder / name).read_text() == "mine\n"


@pytest.mark.parametrize(
    "words",
    [["--help"], ["--version"], ["check", "studies/bump_on_a_ring.toml"]],
    ids=lambda words: words[0],
)
@pytest.mark.parametrize("buffers", [{}, {"PYTHONUNBUFFERED": "1"}], ids=["buffered", "unbuffered"])
def test_whoever_read_the_output_has_gone(words: list[str], buffers: dict[str, str]) -> None:
    """As in `aleafield --help | head -0`: nothing is said, at exit either."""
    import subprocess

    reading, writing = os.pipe()
    os.close(reading)
    try:
        process = subprocess.run(
            command_line(*words),
            stdout=writing,
            stderr=subprocess.PIPE,
            text=True,
            env=surroundings(**buffers),
            timeout=60,
            check=False,
        )
    finally:
        os.close(writing)
    assert (process.returncode, process.stderr) == (0, "")


def test_an_output_that_cannot_be_written() -> None:
    words = " ".join(command_line("check", "studies/bump_on_a_ring.toml"))
    full = ended(start(["sh", "-c", f"{words} > /dev/full"]))
    assert_one_message(full, 2)
    assert "No space left on device" in full.err
    assert ended(start(["sh", "-c", f"{words} >&-"])) == Said(0, "", "")


def test_a_title_that_the_terminal_cannot_show(tmp_path: Path) -> None:
    study = study_file(tmp_path / "study.toml", title="Größe")
    said = ended(start(command_line("check", study), PYTHONIOENCODING="ascii"))
    assert (said.status, said.err) == (0, "")
    assert said.out.startswith(r"Gr\xf6\xdfe: the study is valid.")
