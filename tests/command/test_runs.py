"""What the commands print, and where; what they solve; what they refuse in a folder that is in use."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from aleafield.forward.field_model import FieldModel
from aleafield.report.caution import CAUTION
from tests.archive.small_runs import assert_same_values
from tests.command.saying import Said, assert_one_message, command_line, ended, say, start, study_file
from tests.examples.summary_shape import read_summary


@pytest.fixture(scope="module")
def home(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with a study, and with its results in `out`."""
    folder = tmp_path_factory.mktemp("home")
    words = command_line("run", study_file(folder / "study.toml"), "--out", folder / "out", "--workers", 1)
    said = ended(start(words))
    assert said.status == 0, said.err
    (folder / "said.out").write_text(said.out)
    (folder / "said.err").write_text(said.err)
    return folder


def stamps(folder: Path) -> dict[str, int]:
    """Times of the last change of everything in a folder."""
    return {str(path): path.stat().st_mtime_ns for path in folder.rglob("*")}


@pytest.fixture
def nothing_is_solved(monkeypatch: pytest.MonkeyPatch) -> None:
    """A field that is solved all the same is an error."""

    def solve(*_: object) -> None:
        raise AssertionError("a field was solved")

    monkeypatch.setattr(FieldModel, "evaluate", solve)


def test_a_run_prints_its_table_and_where_its_files_are(home: Path) -> None:
    out = (home / "said.out").read_text()
    lines = out.splitlines()
    assert lines[0].split("  ")[0] == "quantity"
    assert "mean and 95 % interval" in lines[0]
    assert lines[1].startswith("peak")
    assert "error comes from" in lines[0]
    for name in ("report.html", "summary.json", "ensemble.nc"):
        assert str(home / "out" / name) in out
    assert out.endswith(f"\n{CAUTION}\n")
    assert "\x1b" not in out, "no colours away from a terminal"


def test_progress_goes_to_standard_error(home: Path) -> None:
    lines = (home / "said.err").read_text().splitlines()
    assert lines
    assert all(line.startswith("solving: ") and "%" in line for line in lines)
    assert lines[-1] == "solving: 100 %"
    assert "left" in lines[0]


@pytest.mark.parametrize("more", [[], ["--quiet"]], ids=["with progress", "quiet"])
def test_json_is_one_document_alone_on_standard_output(
    capsys: pytest.CaptureFixture[str], tmp_path: Path, more: list[str]
) -> None:
    study = study_file(tmp_path / "study.toml")
    said = say(capsys, "run", study, "--out", tmp_path / "out", "--workers", 1, "--json", *more)
    assert said.status == 0
    assert read_summary(said.out) == read_summary((tmp_path / "out" / "summary.json").read_text())
    assert ("solving: " in said.err) == (not more)


def test_quiet_says_nothing(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    study = study_file(tmp_path / "study.toml")
    said = say(capsys, "run", study, "--out", tmp_path / "out", "--workers", 1, "--quiet")
    assert said == Said(0, "", "")
    assert (tmp_path / "out" / "report.html").exists()


@pytest.mark.parametrize("name", ["check", "run", "report", "compare", "extend"])
def test_every_result_as_json(
    capsys: pytest.CaptureFixture[str], home: Path, tmp_path: Path, name: str
) -> None:
    if name == "extend":
        home = tmp_path
        study_file(home / "study.toml")
        assert say(capsys, "run", home / "study.toml", "--out", home / "out", "--workers", 1).status == 0
    words: dict[str, list[object]] = {
        "check": [home / "study.toml"],
        "run": [home / "study.toml", "--out", home / "out"],
        "report": [home / "out"],
        "compare": [home / "out", home / "out"],
        "extend": [home / "out", "--samples", 1, "--workers", 1],
    }
    said = say(capsys, name, *words[name], "--json")
    assert said.status == 0, said.err
    document = json.loads(said.out)
    assert document["schema"] == 1
    if name in ("run", "report", "extend"):
        read_summary(said.out)
    else:
        assert said.err == ""
    if name == "extend":
        assert document["sampling"]["samples"] == 128
    if name == "compare":
        assert document["quantities"]["peak"]["mean_difference"]["value"] == 0.0


def test_a_finished_run_prints_the_same_and_touches_nothing(
    capsys: pytest.CaptureFixture[str], home: Path, nothing_is_solved: None
) -> None:
    before = stamps(home / "out")
    said = say(capsys, "run", home / "study.toml", "--out", home / "out")
    assert said == Said(0, (home / "said.out").read_text(), "")
    assert stamps(home / "out") == before


def test_a_changed_study_in_a_used_folder_is_refused(capsys: pytest.CaptureFixture[str], home: Path) -> None:
    before = stamps(home / "out")
    changed = study_file(home / "changed.toml", amplitude="1.1")
    for words in (["run", changed, "--out", home / "out"], ["report", home / "out", "--study", changed]):
        said = say(capsys, *words)
        assert_one_message(said, 2)
        assert str(home / "out") in said.err
        assert "title, about and [report]" in said.err
    assert stamps(home / "out") == before


@pytest.mark.parametrize("name", ["run", "report"])
def test_another_report_section_solves_nothing(
    capsys: pytest.CaptureFixture[str], tmp_path: Path, name: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    out = tmp_path / "out"
    assert say(capsys, "run", study_file(tmp_path / "a.toml"), "--out", out, "--workers", 1).status == 0
    changed = study_file(tmp_path / "b.toml", title="Another title", exceed="[1.1, 1.25]")
    monkeypatch.setattr(FieldModel, "evaluate", None)
    words = ["run", changed, "--out", out] if name == "run" else ["report", out, "--study", changed]
    said = say(capsys, *words)
    assert (said.status, said.err) == (0, "")
    assert "P(above 1.25 mV)" in said.out
    summary = read_summary((out / "summary.json").read_text())
    assert list(summary["quantities"]["peak"]["exceed"]) == ["1.1", "1.25"]
    assert "Another title" in (out / "report.html").read_text()
    assert (out / "study.toml").read_bytes() == changed.read_bytes()


def test_report_alone_writes_the_same_page_again(
    capsys: pytest.CaptureFixture[str], home: Path, nothing_is_solved: None
) -> None:
    page = home / "out" / "report.html"
    before = page.read_bytes()
    page.write_text("gone")
    said = say(capsys, "report", home / "out")
    assert said == Said(0, (home / "said.out").read_text(), "")
    assert page.read_bytes() == before


def test_extension_says_how_many_it_took_and_equals_the_longer_run(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    out = tmp_path / "out"
    assert say(capsys, "run", study_file(tmp_path / "a.toml"), "--out", out, "--workers", 1).status == 0
    said = say(capsys, "extend", out, "--samples", 10, "--workers", 1)
    assert said.status == 0
    assert "128 samples (quasi-Monte Carlo), 0 failed" in said.out
    assert "74 samples asked, 128 used" in said.out
    longer = study_file(tmp_path / "b.toml", samples=128)
    assert say(capsys, "run", longer, "--out", tmp_path / "longer", "--workers", 1).status == 0
    assert_same_values(out, tmp_path / "longer")


@pytest.mark.parametrize("samples", [0, -3, 10**12])
def test_extension_by_nothing_or_by_too_much(
    capsys: pytest.CaptureFixture[str], home: Path, samples: int
) -> None:
    said = say(capsys, "extend", home / "out", "--samples", samples)
    assert_one_message(said, 2)
    assert f"samples: {samples} given" in said.err


def test_comparison_prints_the_paired_difference(
    capsys: pytest.CaptureFixture[str], home: Path, tmp_path: Path
) -> None:
    """The field is linear in the drive: with a drive of 1.1 every peak is a tenth higher."""
    other = study_file(tmp_path / "b.toml", amplitude="1.1")
    assert say(capsys, "run", other, "--out", tmp_path / "out", "--workers", 1).status == 0
    said = say(capsys, "compare", home / "out", tmp_path / "out", "--json")
    mean = read_summary((home / "out" / "summary.json").read_text())["quantities"]["peak"]["mean"]["value"]
    found = json.loads(said.out)["quantities"]["peak"]["mean_difference"]
    assert found["value"] == pytest.approx(0.1 * mean, rel=1e-12)
    text = say(capsys, "compare", home / "out", tmp_path / "out").out
    assert f"A: {home / 'out'}" in text
    assert "64 common samples" in text


def test_comparison_of_runs_with_other_samples_is_refused(
    capsys: pytest.CaptureFixture[str], home: Path, tmp_path: Path
) -> None:
    other = study_file(tmp_path / "b.toml", method="monte carlo")
    assert say(capsys, "run", other, "--out", tmp_path / "out", "--workers", 1).status == 0
    said = say(capsys, "compare", home / "out", tmp_path / "out")
    assert_one_message(said, 2)
    assert "the same laws, dependence, method and seed" in said.err
