"""A run that ends without what its study demands: all is written, exit status 1, and one line says why."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.command.saying import say, study_file
from tests.examples.summary_shape import read_summary

CUBIC = """
title = "A field that may run away"

[domain]
shape = "ring"
length = 1.0

[kernel]
form = "formula"
formula = "1"

[rate]
form = "formula"
formula = "2*u**3"

[initial]
formula = "a"
a = "uniform({low}, {high})"

[dynamics]
time_constant = 1.0
duration = 12.0

[scheme]
nodes = 8
time_step = 0.05

[[quantity]]
name = "height"
measure = "maximum"

[sampling]
method = "monte carlo"
samples = 200
"""
"""u' = -u + 2 u^3 from a: 1/u^2 = 2 + (1/a^2 - 2) exp(2 t), infinite in finite time for a > sqrt(1/2)."""


def test_an_aim_that_is_missed_and_one_that_is_met(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    for name, tolerance, status in (
        ("tight", '"0.000001 %"', 1),
        ("loose", '"50 %"', 0),
        ("absolute", "1e-9", 1),
    ):
        study = study_file(tmp_path / f"{name}.toml", more=f"[aim]\ntolerance = {tolerance}\n")
        said = say(capsys, "run", study, "--out", tmp_path / name, "--workers", 1, "--quiet")
        assert (said.status, said.out) == (status, "")
        summary = read_summary((tmp_path / name / "summary.json").read_text())
        assert summary["aim"]["met"] is (status == 0)
        assert (tmp_path / name / "report.html").exists()
        if status:
            assert said.err.startswith("aleafield: not met: the aim is missed: the mean of peak is known to ")
            assert said.err.count("\n") == 1
        else:
            assert said.err == ""


def test_the_finished_run_goes_on_missing_its_aim(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    study = study_file(tmp_path / "study.toml", more='[aim]\ntolerance = "0.000001 %"\n')
    words = ["run", study, "--out", tmp_path / "out", "--workers", 1, "--quiet"]
    first = say(capsys, *words)
    assert first.status == 1
    assert say(capsys, *words) == first
    assert say(capsys, "report", tmp_path / "out", "--json").status == 1


def test_samples_that_fail_are_named(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    """From a in (0.5, 0.8) those above 0.7071 fail: 31 % expected, above the 5 % that a run may lose."""
    (tmp_path / "study.toml").write_text(CUBIC.format(low=0.5, high=0.8))
    said = say(capsys, "run", tmp_path / "study.toml", "--out", tmp_path / "out", "--workers", 1, "--quiet")
    assert said.status == 1
    summary = read_summary((tmp_path / "out" / "summary.json").read_text())
    failed = summary["failed"]
    assert failed["count"] == len(failed["list"])
    assert failed["reasons"] == {"field_not_finite": failed["count"]}
    assert all(entry["inputs"]["initial.a"] > 0.5**0.5 for entry in failed["list"])
    lines = said.err.splitlines()
    assert lines[0].startswith(
        f"aleafield: not met: {failed['count']} of 200 samples failed, more than 5 %: "
    )
    for entry in failed["list"][:3]:
        assert f"sample {entry['sample']} (field not finite at t = {entry['time']:.4g})" in lines[0]
    assert "Traceback" not in said.err
    surviving = [line.split(",") for line in (tmp_path / "out" / "ensemble.csv").read_text().splitlines()[1:]]
    assert sum(cells[3] == "0" for cells in surviving) == 200 - failed["count"]
    assert all(float(cells[4]) < 0.5**0.5 for cells in surviving if cells[3] == "0")


def test_a_run_of_which_nothing_is_left(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    """From a in (0.71, 0.8) all fail: the table says so, a hundred are listed, and it is said that they are."""
    (tmp_path / "study.toml").write_text(CUBIC.format(low=0.71, high=0.8))
    said = say(capsys, "run", tmp_path / "study.toml", "--out", tmp_path / "out", "--workers", 1)
    assert said.status == 1
    summary = read_summary((tmp_path / "out" / "summary.json").read_text())
    assert (summary["failed"]["count"], summary["failed"]["listed"]) == (200, 100)
    assert any("samples failed (100 %: " in warning for warning in summary["warnings"])
    assert any("the first 100 of the 200 failed samples" in warning for warning in summary["warnings"])
    for entry in summary["quantities"].values():
        assert entry["mean"]["reason"] == "not determined: all samples failed"
    assert "not determined: all samples failed" in said.out


def test_a_few_failures_are_said_and_suffered(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    """From a in (0.3, 0.72) about 3 % fail: the run is done, and a warning counts them."""
    (tmp_path / "study.toml").write_text(CUBIC.format(low=0.3, high=0.72))
    said = say(capsys, "run", tmp_path / "study.toml", "--out", tmp_path / "out", "--workers", 1)
    assert said.status == 0
    count = read_summary((tmp_path / "out" / "summary.json").read_text())["failed"]["count"]
    assert 1 <= count <= 10
    assert f"{count} of 200 samples failed" in said.out


def test_a_statistic_that_was_asked_and_is_not_determined(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    """The 0.001 quantile of 64 samples: refused where the file asks for it."""
    study = study_file(tmp_path / "study.toml")
    text = study.read_text().replace("[report]", "[report]\nquantiles = [0.001, 0.5]")
    study.write_text(text)
    said = say(capsys, "run", study, "--out", tmp_path / "out", "--workers", 1, "--quiet")
    assert said.status == 1
    assert "not met: peak, quantile 0.001: not determined by 64 samples" in said.err
    statistic = read_summary((tmp_path / "out" / "summary.json").read_text())["quantities"]["peak"][
        "quantiles"
    ]
    assert statistic["0.001"]["value"] is None
    assert statistic["0.5"]["value"] is not None
