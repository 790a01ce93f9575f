"""Ctrl-C: exit status 3, one message; the stored chunks stay, and the same command ends with the same values.

Compared is everything in the ensemble, to the bit.
"""

from __future__ import annotations

import signal
import time
from pathlib import Path

import pytest

from tests.archive.small_runs import assert_same_values
from tests.command.saying import command_line, ended, say, start, study_file

SLOW = {"samples": 4096, "method": "monte carlo", "more": '[keep]\nfields = "none"\n'}
"""A study of several chunks, long enough to be caught at work."""


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with the study and, in `out`, the results of a run that nothing disturbed."""
    folder = tmp_path_factory.mktemp("undisturbed")
    study = slow_study(folder / "study.toml")
    said = ended(start(command_line("run", study, "--out", folder / "out", "--workers", 1, "--quiet")))
    assert said.status == 0, said.err
    return folder


def slow_study(path: Path) -> Path:
    """The linear ring with so many steps that its chunks take a good part of a second each."""
    study_file(path, **SLOW)
    path.write_text(path.read_text().replace("time_step = 1.0", "time_step = 0.1"))
    return path


@pytest.mark.parametrize("workers", [1, 2])
def test_interrupted_and_resumed(
    capsys: pytest.CaptureFixture[str], undisturbed: Path, tmp_path: Path, workers: int
) -> None:
    words = ["run", undisturbed / "study.toml", "--out", tmp_path / "out", "--workers", workers]
    process = start(command_line(*words))
    waited = time.monotonic() + 60
    while not list(tmp_path.glob("out/parts/n*.nc")):
        assert process.poll() is None, ended(process).err
        assert time.monotonic() < waited
        time.sleep(0.002)
    process.send_signal(signal.SIGINT)
    said = ended(process)
    assert said.status == 3, said.err
    assert said.out == ""
    assert "Traceback" not in said.err
    message = said.err.strip().splitlines()[-1]
    assert message.startswith("aleafield: interrupted: ")
    assert str(tmp_path / "out") in message
    assert "the same command goes on" in message
    assert not (tmp_path / "out" / "summary.json").exists()
    assert list(tmp_path.glob("out/parts/n*.nc"))

    unfinished = say(capsys, "report", tmp_path / "out")
    assert (unfinished.status, unfinished.out) == (2, "")
    assert "unfinished" in unfinished.err

    again = say(capsys, *words)
    assert again.status == 0
    first = next(line for line in again.err.splitlines() if line.startswith("solving: "))
    assert not first.startswith("solving: 0 %"), "what was stored counts as done"
    assert_same_values(tmp_path / "out", undisturbed / "out")
    assert not (tmp_path / "out" / "parts").exists()


def test_interrupted_before_anything_was_solved(tmp_path: Path) -> None:
    """While packages load and samples are drawn there is nothing to go on from; the status is the same."""
    process = start(command_line("run", slow_study(tmp_path / "study.toml"), "--out", tmp_path / "out"))
    waited = time.monotonic() + 60
    while not (tmp_path / "out").exists():
        assert time.monotonic() < waited
        time.sleep(0.002)
    process.send_signal(signal.SIGINT)
    said = ended(process)
    assert (said.status, said.out) == (3, ""), said.err
    assert "Traceback" not in said.err
    assert said.err.splitlines()[-1].startswith("aleafield: interrupted")
