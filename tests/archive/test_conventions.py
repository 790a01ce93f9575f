"""ensemble.nc against the CF conventions, by a checker that carries its tables with it."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from aleafield.archive.ensemble_reader import open_ensemble
from aleafield.runs.run import run
from tests.archive.conventions import findings, strangers
from tests.archive.small_runs import small_run
from tests.archive.studies import linear_ring


@pytest.fixture(scope="module")
def real(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A real run with units, exceedance, occurrence, stored fields and an error split."""
    folder = tmp_path_factory.mktemp("real") / "out"
    run(linear_ring(64), folder, workers=1)
    return folder / "ensemble.nc"


def test_a_real_run_conforms(real: Path) -> None:
    assert strangers(real) == []


def test_an_ensemble_with_fields_of_some_only_conforms(tmp_path: Path) -> None:
    small_run(tmp_path, 1040, 1040, method="monte carlo")
    assert strangers(tmp_path / "ensemble.nc") == []
    with open_ensemble(tmp_path) as dataset:
        finite = np.isfinite(dataset["u"].values).all(axis=(1, 2))
        assert "first 1024 realizations" in dataset["u"].attrs["comment"]
    assert not finite[1024:].any()


def test_the_checker_finds_what_is_wrong(real: Path, tmp_path: Path) -> None:
    """A spoilt copy is not let through: the allow-list is no blank cheque."""
    import netCDF4

    spoilt = tmp_path / "spoilt.nc"
    spoilt.write_bytes(real.read_bytes())
    with netCDF4.Dataset(spoilt, "a") as dataset:
        dataset["peak"].coordinates = "nowhere"
        dataset["failed"].flag_meanings = "only_one"
    found = " ".join(findings(spoilt))
    assert "nowhere" in found
    assert "flag_meanings" in found


def test_every_variable_says_what_it_is(real: Path) -> None:
    with open_ensemble(real.parent) as dataset:
        for name, variable in dataset.variables.items():
            assert variable.attrs["units"], name
            assert variable.attrs["long_name"], name
        assert {"sample", "repeat", "replicate", "dynamics_time_constant"} <= set(dataset.coords)
        assert dataset["dynamics_time_constant"].attrs["path"] == "dynamics.time_constant"
        assert dataset["peak"].dims == ("realization",)
        level = dataset.attrs["scheme_level"]
        probes = [
            name
            for name, v in dataset.variables.items()
            if v.dims == ("probe",) and str(name).startswith("peak_")
        ]
        assert len(probes) == 6
        assert all(name != f"peak_{level}" for name in probes), "the run's own level stands along realization"


def test_statistics_carry_their_errors(real: Path) -> None:
    """The same numbers as in the summary, linked from each statistic to the parts of its error."""
    import json

    summary = json.loads((real.parent / "summary.json").read_text())
    with open_ensemble(real.parent) as dataset:
        for name, entry in summary["quantities"].items():
            stem = name.replace(" ", "_")
            for kind, method in (("mean", "realization: mean"), ("sd", "realization: standard_deviation")):
                variable = dataset[f"{stem}_{kind}"]
                assert variable.attrs["cell_methods"] == method
                assert float(variable) == entry[kind]["value"]
                linked = variable.attrs["ancillary_variables"].split()
                assert float(dataset[f"{stem}_{kind}_error_total"]) == entry[kind]["error"]["total"]
                parts = {part for part, size in entry[kind]["error"].items() if size is not None}
                ends = {f"{stem}_{kind}_lower", f"{stem}_{kind}_upper"}
                assert set(linked) == {f"{stem}_{kind}_error_{part}" for part in parts} | ends
            for key, statement in entry["exceed"].items():
                assert float(dataset[f"{stem}_exceed_{key.replace('.', '_')}"]) == statement["value"]


def test_provenance(real: Path) -> None:
    study = linear_ring(64)
    with open_ensemble(real.parent) as dataset:
        attributes = dataset.attrs
    assert attributes["Conventions"] == "CF-1.11"
    assert attributes["study_text"] == study.source.text
    assert attributes["study_digest"] == study.digest
    assert attributes["seed"] == study.seed
    assert attributes["wall_time_s"] > 0
    assert attributes["processor_time_s"] > 0
