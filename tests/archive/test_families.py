"""Families besides the main sample: solved, stored, resumed, extended and read like it."""

from __future__ import annotations

import random
import signal
import time
from collections.abc import Mapping
from pathlib import Path

import numpy as np
import pytest

from aleafield.archive.chunk_store import ChunkStore
from aleafield.archive.ensemble_reader import open_ensemble, reading
from aleafield.archive.layout import Layout
from aleafield.errors import InputError
from aleafield.randomness.families import Family
from aleafield.runs.execution import Stored, is_complete, tasks_of
from aleafield.runs.plan_file import Plan, read_plan, with_rows, write_plan
from aleafield.runs.planning import make_plan, planned_model
from aleafield.runs.run import run
from tests.archive.analytic_model import FAILING_ABOVE, AnalyticModel
from tests.archive.conventions import strangers
from tests.archive.killing import kill, stored, wait_until
from tests.archive.small_runs import (
    as_program,
    assert_same_values,
    ensemble_values,
    extend,
    plan_of,
    small_run,
    with_families,
)
from tests.archive.studies import linear_ring, noisy_ring, peak_of_linear_ring

SAMPLES = 128
FAMILIES: Mapping[Family, int] = {"held out": 37, "exchange": 40 * 5, "screening": 4 * 3}
"""Numbers that fit no chunk; 40 rows of two inputs exchanged, 4 trajectories."""
FIELD_FAMILIES: Mapping[Family, int] = {"held out": 9, "exchange": 4 * 5, "screening": 2 * 3}
MODEL = AnalyticModel()


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A run with all families that nothing disturbed, in chunks of 16."""
    folder = tmp_path_factory.mktemp("undisturbed")
    small_run(folder, SAMPLES, 16, families=FAMILIES)
    return folder


@pytest.mark.parametrize(("width", "workers"), [(8, 1), (24, 1), (256, 1), (16, 2)])
def test_every_chunk_width_and_number_of_workers(
    undisturbed: Path, tmp_path: Path, width: int, workers: int
) -> None:
    small_run(tmp_path, SAMPLES, width, workers, families=FAMILIES)
    assert_same_values(tmp_path, undisturbed)


@pytest.mark.parametrize("workers", [1, 2])
def test_killed_again_and_again_and_resumed(undisturbed: Path, tmp_path: Path, workers: int) -> None:
    """SIGKILL when some more chunks are stored, the last time inside the families."""
    moments = random.Random(workers)
    tasks = tasks_of(read_plan(Layout(undisturbed)), Stored())
    main = sum(task.family == "main" for task in tasks)
    for least in (2, 8, main + 4):
        process = as_program(tmp_path, SAMPLES, 16, workers, delay=3e-3, families=FAMILIES)
        assert wait_until(lambda least=least: stored(tmp_path) >= least, process)  # type: ignore[misc]
        time.sleep(moments.uniform(0.0, 0.02))
        kill(process)
        assert process.returncode == -signal.SIGKILL
    held = stored(tmp_path)
    assert (
        0 < small_run(tmp_path) <= len(tasks) - held + 1
    )  # a chunk whose manifest line was cut off once more
    assert_same_values(tmp_path, undisturbed)


def test_an_extension_keeps_the_families(undisturbed: Path, tmp_path: Path) -> None:
    small_run(tmp_path, 64, 24, families=FAMILIES)
    extend(tmp_path, SAMPLES)
    assert_same_values(tmp_path, undisturbed)


def test_stages_decided_after_the_ensemble_was_made(undisturbed: Path, tmp_path: Path) -> None:
    """A family more, then more of it, then another one: what is there is never solved again."""
    layout = Layout(tmp_path)
    small_run(tmp_path, SAMPLES, 16)
    state = layout.field_state(SAMPLES).read_bytes()
    stages: list[tuple[Family, int, int]] = [("held out", 20, 2), ("held out", 37, 2), ("exchange", 200, 13)]
    for family, count, chunks in [*stages, ("screening", 12, 1)]:
        plan = with_rows(read_plan(layout), family, count)
        write_plan(layout, plan)
        assert not is_complete(layout, plan)
        assert small_run(tmp_path) == chunks
        assert is_complete(layout, plan)
    assert_same_values(tmp_path, undisturbed)
    # the fields are those of the main sample: an ensemble that is replaced must find its state to the last
    assert layout.field_state(SAMPLES).read_bytes() == state
    extend(tmp_path, 2 * SAMPLES)
    with reading(layout.ensemble) as reader:
        assert (len(reader), reader.families) == (2 * SAMPLES, FAMILIES)


def test_a_stage_decided_before_the_ensemble_was_made(undisturbed: Path, tmp_path: Path) -> None:
    layout = Layout(tmp_path)
    process = as_program(tmp_path, SAMPLES, 16, delay=3e-3)
    assert wait_until(lambda: stored(tmp_path) >= 4, process)
    kill(process)
    write_plan(layout, with_families(read_plan(layout), FAMILIES))
    small_run(tmp_path)
    assert_same_values(tmp_path, undisturbed)


def test_exchanged_inputs_tell_whose_they_are(undisturbed: Path) -> None:
    """The peak hears of the gain alone, the first input: AB_1 and BA_2 are B's, AB_2 and BA_1 are A's."""
    with reading(undisturbed / "ensemble.nc") as reader:
        a = reader.values("peak")[:40]
        b, ab_gain, ab_h, ba_gain, ba_h = reader.values("peak", "exchange").reshape(40, 5).T
        for same, other in ((ab_h, a), (ba_gain, a), (ab_gain, b), (ba_h, b)):
            np.testing.assert_array_equal(same, other)
        assert not np.isin(b[np.isfinite(b)], reader.values("peak")).any()


@pytest.mark.parametrize("family", FAMILIES)
def test_values_are_those_of_the_family(undisturbed: Path, family: Family) -> None:
    """Gain g: peak g (1 + g b), b = 0.3 / 16^2 + 0.1 / 16^2 + 1e-3; it fails above 1.19, and returns where the peak
    reaches 3.2 h, after peak / h."""
    count, label = FAMILIES[family], family.replace(" ", "_")
    inputs = MODEL.design.values_at(MODEL.design.points(family, np.arange(count)))
    gain, h = inputs["rate.gain"], inputs["h"]
    failed = gain > FAILING_ABOVE
    peak = np.where(failed, np.nan, gain * (1 + gain * (0.4 / 256 + 1e-3)))
    with reading(undisturbed / "ensemble.nc") as reader:
        assert reader.families == FAMILIES
        assert label not in reader.levels
        np.testing.assert_array_equal(reader.failed(label), failed)
        np.testing.assert_array_equal(reader.valid(label), ~failed)
        np.testing.assert_allclose(reader.values("peak", label), peak, rtol=1e-14)
        margins = reader.margins("time of return", label)
        assert margins is not None
        np.testing.assert_allclose(margins, peak - 3.2 * h, rtol=0, atol=1e-14)
        expected = np.where(peak >= 3.2 * h, peak / h, np.nan)
        np.testing.assert_allclose(reader.values("time of return", label), expected, rtol=1e-14)
        assert reader.margins("peak", label) is None
        part = reader.rows(3, 9, label)
        np.testing.assert_array_equal(part.values["peak"], reader.values("peak", label)[3:9])
        assert part.inputs == {}


def test_the_file_conforms_and_says_what_the_runs_are(undisturbed: Path) -> None:
    assert strangers(undisturbed / "ensemble.nc") == []
    with open_ensemble(undisturbed) as dataset:
        for family, count in FAMILIES.items():
            label = family.replace(" ", "_")
            assert dataset.sizes[label] == count
            assert dataset[label].attrs["comment"]
            names = {
                f"failed_{label}",
                f"peak_{label}",
                f"time_of_return_{label}",
                f"time_of_return_margin_{label}",
            }
            assert {str(n) for n, v in dataset.variables.items() if v.dims == (label,)} == {*names, label}
            for name in names:
                assert dataset[name].attrs["units"]
                assert family in dataset[name].attrs["long_name"]
                assert dataset[name].attrs["family"] == family
            assert dataset[f"peak_{label}"].attrs["ancillary_variables"] == f"failed_{label}"


def test_the_main_sample_does_not_see_the_families(undisturbed: Path, tmp_path: Path) -> None:
    small_run(tmp_path, SAMPLES, 16)
    alone, beside = ensemble_values(tmp_path), ensemble_values(undisturbed)
    labels = tuple(family.replace(" ", "_") for family in FAMILIES)
    assert {name for name in beside if not name.endswith(labels)} == alone.keys()
    for name, values in alone.items():
        assert values.tobytes() == beside[name].tobytes(), name
    assert (tmp_path / "ensemble.csv").read_bytes() == (undisturbed / "ensemble.csv").read_bytes()
    assert "families" not in (tmp_path / "plan.json").read_text()


def test_a_plan_reads_back_as_it_was_written(undisturbed: Path) -> None:
    plan = with_families(_plan(), FAMILIES)
    assert read_plan(Layout(undisturbed)) == plan
    assert plan.families == FAMILIES


def test_what_no_family_can_have() -> None:
    plan = with_rows(_plan(), "held out", 32)
    assert with_rows(plan, "held out", 32) == plan
    for family, count in (("held out", 31), ("exchange", 0), ("main", 500)):
        with pytest.raises(ValueError, match="runs of the family"):
            with_rows(plan, family, count)  # type: ignore[arg-type]
    noisy = plan_of(AnalyticModel(repeats=2), "quasi-monte carlo", SAMPLES, 16)
    with pytest.raises(InputError, match="under noise the main sample is the only one"):
        with_rows(noisy, "held out", 32)


def test_a_damaged_chunk_of_a_family_is_solved_again(undisturbed: Path, tmp_path: Path) -> None:
    process = as_program(tmp_path, SAMPLES, 16, delay=3e-3, families=FAMILIES)
    assert wait_until(lambda: any(tmp_path.glob("parts/*_screening_*.nc")), process)
    kill(process)
    (damaged,) = tmp_path.glob("parts/*_held_out_000000016_16.nc")
    damaged.write_bytes(damaged.read_bytes()[:-1])
    held = [ChunkStore(Layout(tmp_path)).holds(t) for t in tasks_of(read_plan(Layout(tmp_path)), Stored())]
    assert held.count(False) >= 1
    assert small_run(tmp_path) == held.count(False)
    assert_same_values(tmp_path, undisturbed)


@pytest.fixture(scope="module")
def field(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A study of a field through the front door, and families that were decided on afterwards."""
    folder = tmp_path_factory.mktemp("field") / "out"
    run(linear_ring(64), folder, workers=1)
    write_plan(Layout(folder), with_families(read_plan(Layout(folder)), FIELD_FAMILIES))
    assert run(linear_ring(64), folder, workers=1).solved == 3
    assert run(linear_ring(64), folder, workers=1).solved == 0
    return folder


def test_a_field_in_every_family(field: Path) -> None:
    """Against its closed form; the step errs by less than 1e-6 (see test_run)."""
    model = planned_model(linear_ring(64), read_plan(Layout(field)))
    with reading(field / "ensemble.nc") as reader:
        assert reader.families == FIELD_FAMILIES
        for family, count in FIELD_FAMILIES.items():
            u = model.design.points(family, np.arange(count))
            exact = peak_of_linear_ring(0.1 + 0.1 * u[:, 0], 8 + 4 * u[:, 1])
            found = reader.values("peak", family.replace(" ", "_"))
            assert np.abs(found - exact).max() < 1e-6
        assert "64 samples, 9 runs held out, 20 runs exchange, 6 runs screening at" in reader.attribute(
            "history"
        )
    assert strangers(field / "ensemble.nc") == []


def test_further_runs_of_a_noisy_field_are_refused() -> None:
    _, model = make_plan(noisy_ring(64))
    with pytest.raises(ValueError, match="'held out' given: under noise there is only the main family"):
        model.evaluate(model.level, np.arange(8), family="held out")


def _plan() -> Plan:
    return plan_of(MODEL, "quasi-monte carlo", SAMPLES, 16)
