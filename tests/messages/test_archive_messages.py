"""What a user reads when a results folder cannot be used: one message with what, where and the way out."""

from __future__ import annotations

import io
import json
import os
import re
import signal
from collections.abc import Callable, Sequence
from pathlib import Path

import pytest

from aleafield.archive.ensemble_reader import open_ensemble
from aleafield.arrays import IntArray
from aleafield.ensemble.level import Level
from aleafield.ensemble.records import Records
from aleafield.errors import AleafieldError, ArchiveError, InputError, Interrupted
from aleafield.randomness.families import Family
from aleafield.runs.compare import compare
from aleafield.runs.extend import extend
from aleafield.runs.progress import ProgressLine
from aleafield.runs.run import run
from aleafield.runs.workers import Solver, solved
from tests.archive.analytic_model import AnalyticModel
from tests.archive.studies import linear_ring


@pytest.fixture(scope="module")
def finished(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A finished run of 64 samples."""
    folder = tmp_path_factory.mktemp("finished") / "out"
    run(linear_ring(64), folder, workers=1)
    return folder


def says(fault: type[AleafieldError], status: int, action: Callable[[], object], *fragments: str) -> None:
    """The action raises the fault, its text holds all the fragments, and it ends with that status."""
    with pytest.raises(fault) as caught:
        action()
    text = str(caught.value)
    for fragment in fragments:
        assert fragment in text
    assert "\n" not in text
    assert caught.value.exit_status == status


def test_a_changed_study_in_a_used_folder(finished: Path) -> None:
    changed = linear_ring(64, amplitude="1.1")
    says(
        *(ArchiveError, 2, lambda: run(changed, finished)),
        *(str(finished), "another study", changed.digest[:12], linear_ring(64).digest[:12], "another --out"),
    )


def test_a_folder_with_other_files(tmp_path: Path) -> None:
    (tmp_path / "thesis.txt").write_text("years of work")
    says(ArchiveError, 2, lambda: run(linear_ring(), tmp_path), "not empty", "thesis.txt", "an empty folder")
    assert [path.name for path in tmp_path.iterdir()] == ["thesis.txt"], "nothing was added"


def test_a_folder_with_a_study_of_that_name(tmp_path: Path) -> None:
    (tmp_path / "study.toml").write_text("title = 'mine'")
    says(ArchiveError, 2, lambda: run(linear_ring(), tmp_path), "not empty", "study.toml")
    assert (tmp_path / "study.toml").read_text() == "title = 'mine'"


def test_a_folder_that_cannot_be_made(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("")
    says(InputError, 2, lambda: run(linear_ring(), tmp_path / "file" / "out"), "cannot be made", "may write")


def test_a_file_in_place_of_a_folder(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("")
    says(InputError, 2, lambda: run(linear_ring(), tmp_path / "out"), "is a file", "a folder is needed")


@pytest.mark.parametrize(
    "text", ["", "[]", "{}", '{"schema": 2}', '{"schema": 1, "level": 3}', '{"schema": 1']
)
def test_a_plan_that_cannot_be_understood(tmp_path: Path, text: str) -> None:
    (tmp_path / "plan.json").write_text(text)
    says(
        ArchiveError,
        2,
        lambda: run(linear_ring(), tmp_path),
        "plan.json",
        "cannot be understood",
        "new folder",
    )


@pytest.mark.parametrize("workers", [0, -3])
def test_no_workers(tmp_path: Path, workers: int) -> None:
    says(
        InputError,
        2,
        lambda: run(linear_ring(), tmp_path, workers),
        "workers",
        f"{workers} given",
        "at least one",
    )
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("width", [0, 4, 12, -8])
def test_a_chunk_width_that_is_no_multiple_of_eight(tmp_path: Path, width: int) -> None:
    says(
        *(InputError, 2, lambda: run(linear_ring(), tmp_path, 1, None, width)),
        *("chunk_width", f"{width} given", "multiple of 8"),
    )


def test_extension_of_what_is_no_run(tmp_path: Path, finished: Path) -> None:
    says(ArchiveError, 2, lambda: extend(tmp_path, 16), "no results of aleafield here")
    says(InputError, 2, lambda: extend(finished, 0), "samples", "0 given", "at least one")


def test_extension_of_an_unfinished_run(tmp_path: Path, finished: Path) -> None:
    for name in ("plan.json", "study.toml"):
        (tmp_path / name).write_bytes((finished / name).read_bytes())
    says(ArchiveError, 2, lambda: extend(tmp_path, 16), "unfinished", "run it to its end")


def test_extension_without_the_running_sums(tmp_path: Path) -> None:
    folder = tmp_path / "out"
    run(linear_ring(64), folder, workers=1)
    (folder / "field_state_64.nc").write_bytes(b"")
    says(ArchiveError, 2, lambda: extend(folder, 16, workers=1), "field_state_64.nc", "damaged", "new folder")


def test_a_study_copy_that_was_edited(tmp_path: Path) -> None:
    folder = tmp_path / "out"
    run(linear_ring(64), folder, workers=1)
    (folder / "study.toml").write_text(linear_ring(64, amplitude="1.1").source.text)
    says(ArchiveError, 2, lambda: extend(folder, 16), "not the study that was run")


def test_comparison_of_what_cannot_be_compared(tmp_path: Path, finished: Path) -> None:
    says(ArchiveError, 2, lambda: compare(finished, tmp_path), str(tmp_path), "no ensemble.nc")
    (tmp_path / "ensemble.nc").write_bytes(b"no netCDF at all")
    says(ArchiveError, 2, lambda: compare(finished, tmp_path), "ensemble.nc", "damaged or not a netCDF file")
    other = tmp_path / "plain"
    run(linear_ring(64, method="monte carlo"), other, workers=1)
    says(InputError, 2, lambda: compare(finished, other), "differ in the samples of", "same laws", "seed")
    text = linear_ring(64).source.text.replace('"uniform(8, 12)"', "10.0")
    from aleafield.study.reading import read_text

    fewer = tmp_path / "fewer"
    run(read_text(text), fewer, workers=1)
    says(
        InputError, 2, lambda: compare(finished, fewer), "has the input dynamics.time_constant", "same inputs"
    )


def test_a_netcdf_file_of_somebody_else(tmp_path: Path) -> None:
    import netCDF4

    with netCDF4.Dataset(tmp_path / "ensemble.nc", "w") as dataset:
        dataset.title = "the weather"
    says(ArchiveError, 2, lambda: open_ensemble(tmp_path), "not an ensemble that aleafield wrote")


class DyingModel(AnalyticModel):
    """Takes its process with it."""

    def evaluate(
        self, level: Level, samples: IntArray, times: Sequence[float] = (), family: Family = "main"
    ) -> Records:
        """The end."""
        os.kill(os.getpid(), signal.SIGKILL)
        raise AssertionError("nobody survives SIGKILL")


class RefusingModel(AnalyticModel):
    """Cannot be sent anywhere."""

    def __init__(self) -> None:
        super().__init__()
        self.function = lambda u, x: u


def solve_with_two_workers(model: AnalyticModel) -> None:
    """Four tasks at the run's level."""
    from aleafield.archive.chunks import cut

    for _ in solved(Solver(model, model.level, (0.0,), ()), list(cut(model.level, 0, 32, 8)), 2):
        pass


def test_a_worker_that_dies() -> None:
    says(
        *(Interrupted, 3, lambda: solve_with_two_workers(DyingModel())),
        *("a worker process ended", "what was stored is safe", "same command", "__main__"),
    )


def test_a_model_that_no_worker_can_get() -> None:
    says(
        *(InputError, 2, lambda: solve_with_two_workers(RefusingModel())),
        *("workers", "cannot be sent to other processes", "use one worker"),
    )


def test_failed_samples_are_said_and_end_with_status_one(tmp_path: Path) -> None:
    """rate u^2 in a growing field: above a strength of about 1/4 the solution is infinite in finite time."""
    text = (
        linear_ring(64)
        .source.text.replace('form = "linear"', 'form = "formula"\nformula = "200 * u**2"')
        .replace('coefficients = [0.0, "uniform(0.1, 0.2)"]', 'coefficients = ["uniform(0.0, 0.02)"]')
    )
    from aleafield.study.reading import read_text

    result = run(read_text(text), tmp_path / "out", workers=1)
    failed = result.summary["failed"]
    assert failed["count"] > 0.05 * 64
    assert sum(failed["reasons"].values()) == failed["count"] == failed["listed"] == len(failed["list"])
    assert set(failed["list"][0]) == {"sample", "repeat", "reason", "time", "inputs"}
    assert any("samples failed" in warning for warning in result.summary["warnings"])
    assert any("more than 5 %" in demand for demand in result.unmet)
    assert result.exit_status == 1
    json.dumps(result.summary, allow_nan=False)


@pytest.mark.parametrize(
    ("more", "unmet"),
    [
        ('[aim]\ntolerance = "0.001 %"\nquantity = "peak"\n', "the aim is missed: .* 0.001 % demands"),
        ('[aim]\ntolerance = 10.0\nquantity = "peak"\n', None),
        ("quantiles = [0.001]\n", "quantile 0.001: not determined by 64 samples"),
    ],
)
def test_demands(tmp_path: Path, more: str, unmet: str | None) -> None:
    result = run(linear_ring(64, more=more), tmp_path / "out", workers=1)
    assert result.exit_status == (0 if unmet is None else 1)
    if unmet is None:
        assert result.unmet == ()
        assert result.summary["aim"]["met"] is True
    else:
        assert any(re.search(unmet, demand) for demand in result.unmet)


def test_progress_away_from_a_terminal_is_plain() -> None:
    stream = io.StringIO()
    progress = ProgressLine(stream)
    progress.start(100.0, 0.0)
    for _ in range(100):
        progress.advance(1.0)
    progress.finish()
    lines = stream.getvalue().splitlines()
    assert len(lines) == 10
    assert all(re.fullmatch(r"solving: \d+ %(, about \S+ \S+ left)?", line) for line in lines)
    assert "\r" not in stream.getvalue()
    assert "\x1b" not in stream.getvalue()


def test_progress_of_a_resumed_run_starts_where_it_was() -> None:
    stream = io.StringIO()
    progress = ProgressLine(stream)
    progress.start(100.0, 40.0)
    assert stream.getvalue() == "solving: 40 %\n"
