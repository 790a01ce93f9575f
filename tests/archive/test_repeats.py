"""Repeated noise paths: a realization is a path of a sample, and the ensemble is the same however it was made."""

from __future__ import annotations

import csv
import random
import signal
import time
from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pytest

from aleafield.archive.ensemble_reader import open_ensemble, reading
from aleafield.archive.field_state import FAN
from aleafield.archive.layout import Layout
from aleafield.ensemble.level import Level, PathPart
from aleafield.randomness.inputs import Input
from aleafield.runs.execution import Stored, tasks_of
from aleafield.runs.plan_file import count_probes, default_width, read_plan
from aleafield.sampling.request import SamplingMethod
from tests.archive.analytic_model import INPUTS, NOISE, AnalyticModel, noise_of
from tests.archive.conventions import strangers
from tests.archive.killing import kill, stored, wait_until
from tests.archive.small_runs import MOMENT_TIMES, as_program, assert_same_values, extend, plan_of, small_run

REPEATS = 3
"""Noise paths of a sample: no power of two, so that samples and chunks of eight do not fit by chance."""


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A run that nothing disturbed: 128 samples of 3 paths in chunks of 16."""
    folder = tmp_path_factory.mktemp("undisturbed")
    small_run(folder, 128, 16, repeats=REPEATS)
    return folder


@pytest.mark.parametrize(("width", "workers"), [(8, 1), (24, 1), (128, 1), (16, 2), (16, 4)])
def test_every_chunk_width_and_number_of_workers(
    undisturbed: Path, tmp_path: Path, width: int, workers: int
) -> None:
    small_run(tmp_path, 128, width, workers, repeats=REPEATS)
    assert_same_values(tmp_path, undisturbed)


@pytest.mark.parametrize("workers", [1, 2])
def test_killed_again_and_again_and_resumed(undisturbed: Path, tmp_path: Path, workers: int) -> None:
    """SIGKILL when some more chunks are stored, at a random moment of the work on the next ones."""
    moments = random.Random(workers)
    for _ in range(3):
        process = as_program(tmp_path, 128, 16, workers, delay=1e-3, repeats=REPEATS)
        wanted = stored(tmp_path) + moments.randint(1, 3)
        assert wait_until(lambda wanted=wanted: stored(tmp_path) >= wanted, process)  # type: ignore[misc]
        time.sleep(moments.uniform(0.0, 0.04))
        kill(process)
        assert process.returncode == -signal.SIGKILL
    assert small_run(tmp_path, repeats=REPEATS) > 0
    assert_same_values(tmp_path, undisturbed)


@pytest.mark.parametrize("path", [[64, 128], [32, 64, 128]])
def test_extension_equals_the_longer_run(undisturbed: Path, tmp_path: Path, path: list[int]) -> None:
    small_run(tmp_path, path[0], 24, repeats=REPEATS)
    for samples in path[1:]:
        extend(tmp_path, samples)
    assert_same_values(tmp_path, undisturbed)


@pytest.mark.parametrize(("inputs", "repeats"), [(INPUTS, 4), ((), 1)], ids=["inputs", "noise alone"])
def test_extension_beyond_what_is_kept(tmp_path: Path, inputs: Sequence[Input], repeats: int) -> None:
    """From 1,000 to 1,200 realizations, plain: fields are stored and fans are made of the first 1,024."""
    method: SamplingMethod = "monte carlo"
    few, many = 1000 // repeats, 1200 // repeats
    small_run(tmp_path / "short", few, 64, method=method, repeats=repeats, inputs=inputs)
    extend(tmp_path / "short", many, inputs)
    small_run(tmp_path / "long", many, 48, method=method, repeats=repeats, inputs=inputs)
    assert_same_values(tmp_path / "short", tmp_path / "long")
    with open_ensemble(tmp_path / "long") as dataset:
        finite = np.isfinite(dataset["u"].values).all(axis=(1, 2))
    assert finite[:1024].mean() > 0.9
    assert not finite[1024:].any()


def test_numbers_of_realizations(undisturbed: Path) -> None:
    """Realization j is path j mod 3 of sample j // 3, and sample i belongs to scrambling i mod 16."""
    j = np.arange(128 * REPEATS)
    model = AnalyticModel(repeats=REPEATS)
    with open_ensemble(undisturbed) as dataset:
        for name, expected in (("sample", j // 3), ("repeat", j % 3), ("replicate", j // 3 % 16)):
            assert dataset[name].dtype == np.int32
            assert np.array_equal(dataset[name].values, expected), name
        gain = model.design.values(np.arange(128))["rate.gain"]
        assert np.array_equal(dataset["rate_gain"].values, np.repeat(gain, 3))
        assert np.array_equal(dataset["probe"].values, np.arange(32 * REPEATS))
        finer = dataset[f"peak_{Level(17, 17, 0, 11).label}"]
        assert finer.dims == ("probe",)
        assert finer.attrs["noise_modes"] == 11
        # 5 modes are kept, and 11 at the finer level: what both lack is 1e-3 / modes
        change = dataset["peak"].values[: 32 * REPEATS] - finer.values
        assert np.nanmax(np.abs(change - (1e-3 / 5 - 1e-3 / 11))) < 1e-15
    with (undisturbed / "ensemble.csv").open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    assert [int(row["sample"]) for row in rows] == (j // 3).tolist()
    assert [int(row["repeat"]) for row in rows] == (j % 3).tolist()


def test_fans_and_single_paths(undisturbed: Path) -> None:
    """The peak in time is a exp(-t) + 0.1 t z in closed form."""
    j = np.arange(128 * REPEATS)
    model = AnalyticModel(repeats=REPEATS)
    peak = model.evaluate(model.level, j).values["peak"]
    z = noise_of(j, REPEATS)[:, 0]
    t = np.array(MOMENT_TIMES)
    along = (peak - NOISE * z)[:, None] * np.exp(-t) + NOISE * z[:, None] * t
    kept = np.isfinite(peak)
    with reading(undisturbed / "ensemble.nc") as reader:
        found = reader.histories("peak")
        assert found is not None
        fan, paths = found
        assert np.array_equal(reader.axis("fan"), FAN)
        assert reader.histories("time of return") is None
    assert np.abs(fan - np.quantile(along[kept], FAN, axis=0)).max() < 1e-12
    assert np.nanmax(np.abs(paths - along[:6])) < 1e-12
    with open_ensemble(undisturbed) as dataset:
        assert dataset["peak_fan"].dims == ("fan", "t_moments")
        assert dataset["peak_paths"].dims == ("path", "t_moments")


def test_the_file_conforms(undisturbed: Path) -> None:
    assert strangers(undisturbed / "ensemble.nc") == []


def test_chunks_hold_whole_samples() -> None:
    plan = plan_of(AnalyticModel(repeats=REPEATS), "quasi-monte carlo", 128, 24)
    for level in (plan.level, *plan.extra_levels):
        tasks = [task for task in tasks_of(plan, Stored()) if task.level == level]
        assert all(task.first % REPEATS == task.count % REPEATS == 0 for task in tasks)
        assert {task.count for task in tasks[:-1]} <= {24 * REPEATS}
        samples = 128 if level == plan.level else 32
        assert sum(task.count for task in tasks) == samples * REPEATS


def test_a_plan_reads_back_as_it_was_written(undisturbed: Path) -> None:
    plan = plan_of(AnalyticModel(repeats=REPEATS), "quasi-monte carlo", 128, 16)
    assert read_plan(Layout(undisturbed)) == plan
    assert plan.noise is not None
    assert [part.coarse_pair is None for part in plan.path] == [False, False, False, True]


@pytest.mark.parametrize(
    ("nodes", "repeats", "rows"),
    [(64, 1, 256), (64, 4, 256), (256, 4, 128), (256, 64, 8 * 64), (8192, 2, 16)],
)
def test_default_width_counts_all_paths(nodes: int, repeats: int, rows: int) -> None:
    """2^15 / nodes rows, at most 256, but at least 8 samples with all their paths: by hand."""
    assert default_width(nodes, 1 << 16, 0, repeats) * repeats == rows


class Costly(AnalyticModel):
    """Its extra level costs 9 times the run's own, whatever they are: a quarter pays for no least count."""

    def operations(self, level: Level) -> float:
        """Counted once for the run's level and 9 times for others."""
        return 1.0 if level == self.level else 9.0

    def path(self, level: Level) -> tuple[PathPart, ...]:
        """One part, two more levels."""
        return super().path(level)[-1:]


@pytest.mark.parametrize(("demand", "probes"), [(0.0, 32), (0.03, 32), (0.1, 112), (0.101, 112), (2.0, 112)])
def test_the_demand_on_probes_rules_where_it_is_larger(demand: float, probes: int) -> None:
    """By hand: 1,024 x 0.101 = 103.4, up to 104 and to the multiple of 16; no more than 1,024 / 9, down to one."""
    model = Costly(repeats=2)
    found, share = count_probes(model, model.level, model.path(model.level), 1024, demand)
    assert found == probes
    assert share == pytest.approx(9.0 * probes / 1024)
