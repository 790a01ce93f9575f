"""Killed, resumed, spread over workers, cut differently, extended: the ensemble is the same to the bit."""

from __future__ import annotations

import random
import signal
import time
from pathlib import Path

import pytest

from tests.archive.killing import kill, stored, wait_until
from tests.archive.small_runs import as_program, assert_same_values, extend, small_run


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A run that nothing disturbed: 512 samples in chunks of 16."""
    folder = tmp_path_factory.mktemp("undisturbed")
    small_run(folder, 512, 16)
    return folder


@pytest.mark.parametrize("width", [8, 24, 64])
def test_every_chunk_width(undisturbed: Path, tmp_path: Path, width: int) -> None:
    small_run(tmp_path, 512, width)
    assert_same_values(tmp_path, undisturbed)


@pytest.mark.parametrize("workers", [2, 4])
def test_every_number_of_workers(undisturbed: Path, tmp_path: Path, workers: int) -> None:
    small_run(tmp_path, 512, 16, workers)
    assert_same_values(tmp_path, undisturbed)


@pytest.mark.parametrize("workers", [1, 2])
def test_killed_again_and_again_and_resumed(undisturbed: Path, tmp_path: Path, workers: int) -> None:
    """SIGKILL when some more chunks are stored, at a random moment of the work on the next ones."""
    moments = random.Random(workers)
    for _ in range(4):
        process = as_program(tmp_path, 512, 16, workers, delay=2e-3)
        wanted = stored(tmp_path) + moments.randint(1, 6)
        assert wait_until(lambda wanted=wanted: stored(tmp_path) >= wanted, process)  # type: ignore[misc]
        time.sleep(moments.uniform(0.0, 0.04))
        kill(process)
        assert process.returncode == -signal.SIGKILL
    assert small_run(tmp_path) < 44
    assert_same_values(tmp_path, undisturbed)
    assert not (tmp_path / "parts").exists()


@pytest.mark.parametrize("name", [".ensemble.nc.partial", "ensemble.nc", "ensemble.csv"])
def test_killed_while_the_ensemble_is_made(undisturbed: Path, tmp_path: Path, name: str) -> None:
    process = as_program(tmp_path, 512, 128)
    wait_until((tmp_path / name).exists, process)
    kill(process)
    small_run(tmp_path)
    assert_same_values(tmp_path, undisturbed)
    assert not list(tmp_path.glob(".*"))


def test_interrupted_from_the_keyboard(undisturbed: Path, tmp_path: Path) -> None:
    """SIGINT to the run alone: what is stored stays, the workers end, the next call does only the rest."""
    process = as_program(tmp_path, 512, 16, workers=2, delay=4e-3)
    assert wait_until(lambda: stored(tmp_path) >= 4, process)
    process.send_signal(signal.SIGINT)
    _, said = process.communicate(timeout=30)
    assert "aleafield.errors.Interrupted: interrupted: " in said
    assert "the same command goes on" in said
    held = stored(tmp_path)
    assert 4 <= held < 44
    assert small_run(tmp_path) <= 44 - held + 1  # a chunk whose manifest line was cut off is solved again
    assert_same_values(tmp_path, undisturbed)


def test_a_finished_run_solves_nothing(undisturbed: Path) -> None:
    assert small_run(undisturbed, 512, 16) == 0


@pytest.mark.parametrize("path", [[64, 512], [64, 128, 256, 512]])
def test_extension_equals_the_longer_run(undisturbed: Path, tmp_path: Path, path: list[int]) -> None:
    small_run(tmp_path, path[0], 24)
    for samples in path[1:]:
        extend(tmp_path, samples)
    assert_same_values(tmp_path, undisturbed)


def test_extension_beyond_the_kept_samples(tmp_path: Path) -> None:
    """Plain Monte Carlo from 1,000 to 1,400: counts that fit no chunk, and fields stored for 1,024 only."""
    small_run(tmp_path / "short", 1000, 64, method="monte carlo")
    extend(tmp_path / "short", 1400)
    small_run(tmp_path / "long", 1400, 48, method="monte carlo")
    assert_same_values(tmp_path / "short", tmp_path / "long")


def test_an_extension_that_was_stopped_is_finished_by_a_plain_call(undisturbed: Path, tmp_path: Path) -> None:
    from aleafield.archive.layout import Layout
    from aleafield.runs.plan_file import read_plan, with_more_samples, write_plan
    from tests.archive.analytic_model import AnalyticModel
    from tests.archive.small_runs import allocation_of

    small_run(tmp_path, 128, 16)
    layout = Layout(tmp_path)
    longer = with_more_samples(read_plan(layout), AnalyticModel(), allocation_of("quasi-monte carlo", 512))
    write_plan(layout, longer)  # and there it was killed
    small_run(tmp_path, 128, 16)
    assert_same_values(tmp_path, undisturbed)
