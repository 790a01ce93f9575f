"""A noisy nonlinear field, three paths a sample: one ensemble to the bit, however it was solved."""

from __future__ import annotations

import random
import signal
import time
from pathlib import Path

import numpy as np
import pytest

from aleafield.forward import field_model
from aleafield.runs.run import run
from aleafield.study.reading import read_text
from tests.archive.killing import kill, stored, wait_until
from tests.archive.small_runs import assert_same_values
from tests.command.saying import command_line, start
from tests.noise.known_fields import linear_ring, model_of, quantity

SAMPLES = 64
STUDY = f"""
title = "A noisy nonlinear field"
seed = 19
[domain]
shape = "interval"
from = -1.0
to = 1.0
[kernel]
form = "gaussian"
strength = "uniform(1.0, 1.5)"
width = 0.5
[rate]
form = "logistic"
gain = "uniform(3, 5)"
threshold = 0.4
[drive]
formula = "0.5 * exp(-x**2)"
[dynamics]
time_constant = "uniform(0.8, 1.2)"
duration = 2.0
[noise]
strength = "uniform(0.2, 0.4)"
correlation = "exponential"
correlation_length = "uniform(0.3, 0.6)"
[scheme]
projector = "legendre"
method = "galerkin"
nodes = 16
time_step = 0.025
[sampling]
samples = {SAMPLES}
noise_repeats = 3
{quantity("height", "maximum", "")}
{quantity("passage", "time to level", "level = 0.5" + chr(10) + "at = 0.2")}
"""


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A run in one process that nothing disturbed, in chunks of 16 samples."""
    folder = tmp_path_factory.mktemp("undisturbed") / "out"
    run(read_text(STUDY), folder, workers=1, chunk_width=16)
    return folder


@pytest.mark.parametrize(("width", "workers"), [(8, 1), (16, 4)])
def test_every_chunk_width_and_number_of_workers(
    undisturbed: Path, tmp_path: Path, width: int, workers: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("aleafield.runs.execution.WORTH_A_PROCESS", 1.0)
    run(read_text(STUDY), tmp_path / "out", workers=workers, chunk_width=width)
    assert_same_values(tmp_path / "out", undisturbed)


@pytest.mark.parametrize("workers", [1, 4])
def test_killed_twice_and_resumed(undisturbed: Path, tmp_path: Path, workers: int) -> None:
    """SIGKILL when some more chunks are stored, at a random moment of the work on the next ones."""
    (tmp_path / "study.toml").write_text(STUDY)
    words = ["run", tmp_path / "study.toml", "--out", tmp_path / "out", "--workers", workers, "--quiet"]
    moments = random.Random(workers)
    for _ in range(2):
        process = start(command_line(*words))
        wanted = stored(tmp_path / "out") + moments.randint(1, 3)
        assert wait_until(lambda wanted=wanted: stored(tmp_path / "out") >= wanted, process)  # type: ignore[misc]
        time.sleep(moments.uniform(0.0, 0.02))
        kill(process)
        assert process.returncode == -signal.SIGKILL
    assert not (tmp_path / "out" / "summary.json").exists()
    run(read_text(STUDY), tmp_path / "out", workers=workers)
    assert_same_values(tmp_path / "out", undisturbed)


def test_batches_that_are_cut_for_memory_give_the_same_bits(monkeypatch: pytest.MonkeyPatch) -> None:
    """Noise of 8 realizations at a time in place of all 40: every value, margin, field and history is the same."""
    hit = quantity("hit", "time to level", "at = 0.0\nlevel = 0.1")
    model = model_of(linear_ring(hit, scheme="", duration=1.0, samples=64))
    times, every = [0.0, 0.5, 1.0], np.arange(40)
    whole = model.evaluate(model.level, every, times)
    monkeypatch.setattr(field_model, "NOISE_BYTES", 1)
    cut = model.evaluate(model.level, every, times)
    assert np.array_equal(whole.values["hit"], cut.values["hit"], equal_nan=True)
    assert np.array_equal(whole.margins["hit"], cut.margins["hit"])
    assert whole.fields is not None
    assert np.array_equal(whole.fields, cut.fields)
