"""Runs through the front door: what they leave, what they refuse, what they never solve twice."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from aleafield.archive.ensemble_reader import open_ensemble, reading
from aleafield.archive.layout import Layout
from aleafield.errors import ArchiveError, InputError
from aleafield.runs.compare import compare
from aleafield.runs.extend import extend
from aleafield.runs.run import run
from tests.archive.small_runs import assert_same_values
from tests.archive.studies import linear_ring, peak_of_linear_ring


@pytest.fixture(scope="module")
def finished(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A finished run of 128 samples."""
    folder = tmp_path_factory.mktemp("finished") / "out"
    run(linear_ring(128), folder, workers=1)
    return folder


def test_what_a_run_leaves(finished: Path) -> None:
    names = {path.name for path in finished.iterdir()}
    assert names == {
        *("study.toml", "plan.json", "ensemble.nc", "ensemble.csv", "summary.json", "report.html", "figures"),
        "field_state_128.nc",
    }
    assert (finished / "study.toml").read_text() == linear_ring(128).source.text


def test_values_are_those_of_the_closed_form(finished: Path) -> None:
    """Runge-Kutta 4 with step h = 1: relative error (r h)^4 r T / 120 < 8e-7 for rates r < 0.0858, T = 20."""
    with open_ensemble(finished) as dataset:
        strength, tau = dataset["kernel_coefficients_1"].values, dataset["dynamics_time_constant"].values
        exact = peak_of_linear_ring(strength, tau)
        assert np.abs(dataset["peak"].values - exact).max() < 1e-6
        assert dataset["u"].dims == ("realization", "t", "x")
        field = exact[:, None] * np.cos(dataset["x"].values)
        assert np.abs(dataset["u"].values[:, -1] - field).max() < 1e-6
        mean, sd = field.mean(axis=0), field.std(axis=0, ddof=1)
        assert np.abs(dataset["u_mean"].values[-1] - mean).max() < 1e-6
        assert np.abs(dataset["u_sd"].values[-1] - sd).max() < 1e-6
        band = np.quantile(field, dataset["band"].values, axis=0)
        assert np.abs(dataset["u_band"].values[:, -1] - band).max() < 1e-6


def test_the_table_holds_the_same_numbers(finished: Path) -> None:
    lines = (finished / "ensemble.csv").read_text().splitlines()
    inputs = "kernel.coefficients.1,dynamics.time_constant"
    assert lines[0] == f"sample,repeat,replicate,failed,{inputs},peak,arrival"
    table = np.array([[float(cell or "nan") for cell in line.split(",")] for line in lines[1:]])
    with reading(finished / "ensemble.nc") as reader:
        assert np.array_equal(table[:, 0], np.arange(128))
        assert not table[:, 1].any(), "without noise a sample has one run"
        assert np.array_equal(table[:, 2], np.arange(128) % 16)
        for column, name in ((4, "kernel.coefficients.1"), (5, "dynamics.time_constant")):
            assert np.array_equal(table[:, column], reader.input(name))
        for column, name in ((6, "peak"), (7, "arrival")):
            assert np.array_equal(table[:, column], reader.values(name), equal_nan=True)


@pytest.mark.parametrize("width", [8, 16, 64])
def test_every_chunk_width(finished: Path, tmp_path: Path, width: int) -> None:
    run(linear_ring(128), tmp_path / "out", workers=1, chunk_width=width)
    assert_same_values(tmp_path / "out", finished)


@pytest.mark.parametrize("workers", [2, 4])
def test_every_number_of_workers(
    finished: Path, tmp_path: Path, workers: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("aleafield.runs.execution.WORTH_A_PROCESS", 1.0)
    run(linear_ring(128), tmp_path / "out", workers=workers, chunk_width=16)
    assert_same_values(tmp_path / "out", finished)


def test_extension_equals_the_longer_run(finished: Path, tmp_path: Path) -> None:
    run(linear_ring(64), tmp_path / "out", workers=1)
    result = extend(tmp_path / "out", 10, workers=1)
    assert result.summary["sampling"]["samples"] == 128
    assert "128 used" in " ".join(result.summary["warnings"])
    assert_same_values(tmp_path / "out", finished)
    assert run(linear_ring(64), tmp_path / "out", workers=1).solved == 0, "it is still the same study"


def test_a_finished_run_is_left_alone(finished: Path) -> None:
    before = {path: path.stat().st_mtime_ns for path in finished.iterdir()}
    assert run(linear_ring(128), finished, workers=1).solved == 0
    assert {path: path.stat().st_mtime_ns for path in finished.iterdir()} == before


def test_another_report_solves_nothing(tmp_path: Path) -> None:
    folder = tmp_path / "out"
    first = run(linear_ring(64), folder, workers=1)
    changed = linear_ring(64, title="Another title", exceed="[1.0, 1.25]")
    again = run(changed, folder, workers=1)
    assert (first.solved > 0, again.solved) == (True, 0)
    assert set(again.summary["quantities"]["peak"]["exceed"]) == {"1.0", "1.25"}
    assert json.loads((folder / "summary.json").read_text()) == again.summary
    assert (folder / "study.toml").read_text() == changed.source.text
    with open_ensemble(folder) as dataset:
        assert dataset.attrs["title"] == "Another title"
        assert "peak_exceed_1_25" in dataset
    run(changed, tmp_path / "fresh", workers=1)
    assert_same_values(folder, tmp_path / "fresh")
    assert again.summary["cost"]["measured_s"] == first.summary["cost"]["measured_s"]


def test_a_changed_study_is_refused(finished: Path) -> None:
    before = (finished / "study.toml").read_bytes()
    with pytest.raises(ArchiveError, match="results of another study"):
        run(linear_ring(128, amplitude="1.1"), finished, workers=1)
    assert (finished / "study.toml").read_bytes() == before


def test_one_run_without_inputs(tmp_path: Path) -> None:
    study = linear_ring(64)
    text = study.source.text.replace('"uniform(0.1, 0.2)"', "0.15").replace('"uniform(8, 12)"', "10.0")
    from aleafield.study.reading import read_text

    result = run(read_text(text), tmp_path / "out", workers=1)
    mean = result.summary["quantities"]["peak"]["mean"]
    exact = float(peak_of_linear_ring(np.array(0.15), np.array(10.0)))
    assert result.summary["sampling"] is None
    assert mean["value"] == pytest.approx(exact, abs=1e-6)
    assert mean["interval"][0] <= exact <= mean["interval"][1]
    assert mean["error"]["sampling"] is None
    assert result.summary["quantities"]["peak"]["sd"]["value"] == 0.0
    with pytest.raises(InputError, match="no uncertain inputs"):
        extend(tmp_path / "out", 16)


def test_data_files_go_with_the_run(tmp_path: Path) -> None:
    """The study can be read from its folder alone: extension needs no file beside it."""
    (tmp_path / "here" / "deep").mkdir(parents=True)
    numbers = "\n".join(repr(v) for v in np.linspace(8.0, 12.0, 50).tolist())
    (tmp_path / "here" / "measured.csv").write_text(f"tau\n{numbers}\n")
    sampled = "sampled('../measured.csv', 'tau')"
    text = linear_ring(64).source.text.replace("uniform(8, 12)", sampled)
    from aleafield.study.reading import read_text

    run(read_text(text, tmp_path / "here" / "deep" / "study.toml"), tmp_path / "out", workers=1)
    (tmp_path / "here" / "measured.csv").unlink()
    assert (tmp_path / "out" / "inputs" / "measured.csv").read_text() == f"tau\n{numbers}\n"
    assert extend(tmp_path / "out", 64, workers=1).summary["sampling"]["samples"] == 128


def test_stored_fields(tmp_path: Path) -> None:
    """All steps (0 to 20 by 1) and a time between them, where the cubic Hermite interpolant errs by
    r^4 h^4 / 384 < 2e-7 relative to the amplitude."""
    study = linear_ring(64, more='[keep]\nfields = "all"\ntimes = [2.5]\n')
    run(study, tmp_path / "out", workers=1)
    with open_ensemble(tmp_path / "out") as dataset:
        assert dataset["t"].values.tolist() == sorted([*range(21), 2.5])
        decay = 1.0 - np.pi * dataset["kernel_coefficients_1"].values[:, None]
        rate = decay / dataset["dynamics_time_constant"].values[:, None]
        amplitude = -np.expm1(-rate * dataset["t"].values) / decay
        field = amplitude[:, :, None] * np.cos(dataset["x"].values)
        assert np.abs(dataset["u"].values - field).max() < 1e-6


def test_comparison_of_paired_runs(finished: Path, tmp_path: Path) -> None:
    """The field is linear in the drive: with a drive of 1.1 every sample is a tenth larger."""
    run(linear_ring(64, amplitude="1.1"), tmp_path / "out", workers=1)
    result = compare(finished, tmp_path / "out")
    peak = next(one for one in result.differences if one.name == "peak")
    with reading(finished / "ensemble.nc") as reader:
        tenth = 0.1 * reader.values("peak")[:64]
    assert result.samples == 64
    assert peak.mean.value == pytest.approx(tenth.mean(), rel=1e-12)
    assert peak.sd == pytest.approx(tenth.std(ddof=1), rel=1e-9)
    # Student's t over the means of 16 scramblings; 2.131450 is its tabulated 0.975 quantile for 15 degrees
    means = tenth.reshape(4, 16).mean(axis=0)
    half = 2.131450 * means.std(ddof=1) / 4
    assert peak.mean.high is not None
    assert peak.mean.value is not None
    assert peak.mean.high - peak.mean.value == pytest.approx(half, rel=1e-5)
    assert peak.share == 1.0
    assert "64 common samples" in result.as_text()
    json.dumps(result.as_json(), allow_nan=False)


def test_lock_of_a_living_process(tmp_path: Path) -> None:
    from aleafield.archive.lock import locked

    (tmp_path / "out").mkdir()
    with locked(Layout(tmp_path / "out")), pytest.raises(ArchiveError, match="another aleafield process"):
        run(linear_ring(64), tmp_path / "out", workers=1)


def test_a_lock_left_by_a_dead_process_is_taken_over(tmp_path: Path) -> None:
    (tmp_path / "out").mkdir()
    (tmp_path / "out" / ".lock").write_text("process 1\n")
    assert run(linear_ring(64), tmp_path / "out", workers=1).solved > 0
    assert not (tmp_path / "out" / ".lock").exists()
