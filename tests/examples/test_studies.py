"""Every shipped study reads, is checked and runs with few samples; its numbers are those of another solver.

The samples of run and oracle are the same, and so are their noise paths, so that the means differ by the
discretisation alone: at most by the sum of the parts that the run states for its mean, and the noise of these.
"""

from __future__ import annotations

import csv
import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from aleafield.study.reading import read_study
from tests.command.saying import ROOT, Said, command_line, ended, say, start
from tests.examples.independent import ORACLES
from tests.examples.summary_shape import BIASES, read_summary

STUDIES = sorted((ROOT / "studies").glob("*.toml"))
SAMPLES = 64
ORACLE_ACCURACY = 1e-6
"""Relative error of the oracles: tolerances of the time steps, grown over a relaxation near a fold."""


@dataclass(frozen=True)
class Ran:
    """A shipped study with few samples, and what it left."""

    name: str
    said: Said
    folder: Path
    summary: dict[str, Any]

    def column(self, heading: str) -> np.ndarray:
        """A column of ensemble.csv."""
        with (self.folder / "ensemble.csv").open(newline="") as table:
            return np.array([float(row[heading] or "nan") for row in csv.DictReader(table)])


@pytest.fixture(scope="module", params=STUDIES, ids=lambda path: path.stem)
def ran(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Ran:
    folder = tmp_path_factory.mktemp(request.param.stem)
    text, changes = re.subn(r"(?m)^samples = \d+$", f"samples = {SAMPLES}", request.param.read_text())
    assert changes == 1
    (folder / "study.toml").write_text(text)
    words = command_line("run", folder / "study.toml", "--out", folder / "out", "--workers", 1)
    said = ended(start(words))
    summary = read_summary((folder / "out" / "summary.json").read_text())
    return Ran(request.param.stem, said, folder / "out", summary)


@pytest.mark.parametrize("path", STUDIES, ids=lambda path: path.stem)
def test_it_is_checked_without_a_warning(capsys: pytest.CaptureFixture[str], path: Path) -> None:
    said = say(capsys, "check", path)
    assert (said.status, said.err) == (0, "")
    assert said.out.startswith(f"{read_study(path).title}: the study is valid.")
    assert "does not hold" not in said.out or "step" in path.read_text()


@pytest.mark.parametrize("path", STUDIES, ids=lambda path: path.stem)
def test_it_is_marked_as_invented(path: Path) -> None:
    assert path.read_text().startswith("# An invented scenario")
    assert read_study(path).about.startswith("Invented scenario")


def test_it_ends_as_its_demands_say(ran: Ran) -> None:
    """So few samples may miss the aim or leave a quantile open; that is said, and nothing else is amiss."""
    unmet = [line for line in ran.said.err.splitlines() if not line.startswith("solving: ")]
    aim = ran.summary["aim"]
    missed = aim is not None and not aim["met"]
    assert ran.said.status == bool(unmet)
    assert sum("the aim is missed" in line for line in unmet) == missed
    for line in unmet:
        assert "the aim is missed" in line or line.endswith(f": not determined by {SAMPLES} samples")
    assert ran.summary["sampling"]["samples"] == SAMPLES
    assert ran.summary["failed"]["count"] == 0


def test_it_leaves_a_report_about_itself(ran: Ran) -> None:
    page = (ran.folder / "report.html").read_text()
    assert page.startswith("<!doctype html>")
    assert ran.summary["title"] in page
    assert all(name in page for name in ran.summary["quantities"])
    assert "Invented scenario" in page
    assert list((ran.folder / "figures").glob("*.svg"))


def test_its_questions_are_answered(ran: Ran) -> None:
    """Every quantity has a mean and every level that the study asks about a probability."""
    study = read_study(ROOT / "studies" / f"{ran.name}.toml")
    for quantity in study.quantities:
        entry = ran.summary["quantities"][quantity.name]
        assert entry["mean"]["value"] is not None
        asked = study.report.exceed.get(quantity.name, ())
        assert [float(level) for level in entry["exceed"]] == sorted(asked)
        assert all(statement["value"] is not None for statement in entry["exceed"].values())


def test_its_means_are_those_of_another_solver(ran: Ran) -> None:
    inputs = {name: ran.column(name) for name in ("sample", "repeat", *ran.summary["inputs"])}
    for name, expected in ORACLES[ran.name](inputs).items():
        found, mean = ran.column(name), ran.summary["quantities"][name]["mean"]
        occurs = ~np.isnan(found)
        np.testing.assert_array_equal(occurs, ~np.isnan(expected))
        assert mean["value"] == pytest.approx(found[occurs].mean(), rel=1e-12)
        allowed = sum(mean["error"][part] or 0.0 for part in (*BIASES, "bias_noise"))
        difference = abs(found[occurs].mean() - expected[occurs].mean())
        assert difference <= allowed + ORACLE_ACCURACY * abs(expected[occurs].mean()), name


def test_there_is_an_oracle_for_every_study() -> None:
    assert {path.stem for path in STUDIES} == set(ORACLES)
