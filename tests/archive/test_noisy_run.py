"""Runs of a noisy field through the front door: what they leave, extend, compare and solve again."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from aleafield.archive.ensemble_reader import open_ensemble, reading
from aleafield.errors import InputError
from aleafield.runs.compare import compare
from aleafield.runs.extend import extend
from aleafield.runs.results import open_run
from aleafield.runs.run import run
from aleafield.study.reading import read_text
from tests.archive.conventions import strangers
from tests.archive.small_runs import assert_same_values
from tests.archive.studies import noisy_ring, peak_of_linear_ring
from tests.examples.summary_shape import read_summary

PLAIN = "monte carlo"


@pytest.fixture(scope="module")
def finished(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A finished run of 64 samples with 2 noise paths each, plain Monte Carlo."""
    folder = tmp_path_factory.mktemp("finished") / "out"
    run(noisy_ring(64, PLAIN), folder, workers=1)
    return folder


def test_the_file_conforms_and_the_summary_has_its_shape(finished: Path) -> None:
    assert strangers(finished / "ensemble.nc") == []
    summary = read_summary((finished / "summary.json").read_text())
    assert (summary["cost"]["samples"], summary["cost"]["realizations"]) == (64, 128)
    assert summary["sampling"]["noise_repeats"] == 2
    assert summary["scheme"]["noise"]["correlation"] == "gaussian"
    assert summary["quantities"]["centre"]["variance"]["noise"]["value"] > 0


def test_the_field_is_described_as_it_lies_in_the_file(finished: Path) -> None:
    """Variance from the stored fields: mean square about the mean, plus its squared standard error.

    The latter by the spread of the means of clusters, here one each, as in a balanced analysis of variance.
    """
    summary = json.loads((finished / "summary.json").read_text())
    with open_ensemble(finished) as dataset:
        u = dataset["u"].values[:, -1]
    means = u.reshape(64, 2, -1).mean(axis=1)
    expected = np.mean(u.var(axis=0) + means.var(axis=0, ddof=1) / 64)
    (entry,) = summary["field"]
    assert entry["time"] == 20.0
    assert entry["variance"]["value"] == pytest.approx(expected, rel=1e-9)
    assert entry["variance"]["interval"][0] < expected < entry["variance"]["interval"][1]
    assert 0.0 < entry["correlation_length"]["value"] < np.pi


def test_nothing_is_said_of_fields_that_are_not_stored(tmp_path: Path) -> None:
    study = noisy_ring(64, PLAIN, more='[keep]\nfields = "none"\n')
    (entry,) = run(study, tmp_path / "out", workers=1).summary["field"]
    assert entry["variance"]["value"] is None
    assert "no field is stored" in entry["variance"]["reason"]


def test_the_mean_has_the_interval_of_its_clusters(finished: Path) -> None:
    """Student's t over the means of 64 samples; 1.998341 is its tabulated 0.975 quantile for 63 degrees."""
    mean = json.loads((finished / "summary.json").read_text())["quantities"]["centre"]["mean"]
    with reading(finished / "ensemble.nc") as reader:
        clusters = reader.values("centre").reshape(64, 2).mean(axis=1)
    assert mean["value"] == pytest.approx(clusters.mean(), rel=1e-12)
    assert mean["error"]["sampling"] == pytest.approx(1.998341 * clusters.std(ddof=1) / 8, rel=1e-5)


@pytest.mark.parametrize(("width", "workers"), [(8, 1), (64, 1), (16, 4)])
def test_every_chunk_width_and_number_of_workers(
    finished: Path, tmp_path: Path, width: int, workers: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("aleafield.runs.execution.WORTH_A_PROCESS", 1.0)
    run(noisy_ring(64, PLAIN), tmp_path / "out", workers=workers, chunk_width=width)
    assert_same_values(tmp_path / "out", finished)


def test_extension_equals_the_longer_run(finished: Path, tmp_path: Path) -> None:
    run(noisy_ring(40, PLAIN), tmp_path / "out", workers=1)
    assert extend(tmp_path / "out", 24, workers=1).summary["cost"]["realizations"] == 128
    assert_same_values(tmp_path / "out", finished)


def test_extension_where_nothing_but_the_noise_is_uncertain(tmp_path: Path) -> None:
    first = run(noisy_ring(64, repeats=1, inputs=False), tmp_path / "out", workers=1)
    assert any("its paths are drawn independently" in text for text in first.summary["warnings"])
    variance = read_summary((tmp_path / "out" / "summary.json").read_text())["quantities"]["centre"][
        "variance"
    ]
    assert (variance["parameters"], variance["share"]) == (None, None)
    longer = extend(tmp_path / "out", 36, workers=1)
    assert longer.summary["sampling"]["samples"] == 100
    assert longer.summary["sampling"]["method"] == PLAIN
    run(noisy_ring(100, repeats=1, inputs=False), tmp_path / "long", workers=1)
    assert_same_values(tmp_path / "out", tmp_path / "long")


def test_a_realization_solved_again_is_the_same(finished: Path) -> None:
    result = open_run(finished)
    again = result.sample(5, repeat=1)
    with reading(finished / "ensemble.nc") as reader:
        assert float(again["centre"]) == reader.values("centre")[11]
        fields = reader.fields(11, 12)
        assert fields is not None
    assert np.array_equal(again["u"].values[-1], fields[0, -1])
    with pytest.raises(InputError, match="repeat: 2 given; a noise path from 0 to 1 is needed"):
        result.sample(5, repeat=2)


def test_comparison_along_the_same_paths(finished: Path, tmp_path: Path) -> None:
    """The field is linear: noise falls out of a paired difference, which is a tenth of the noiseless field.

    Euler-Maruyama with step h = 1: the value of the noiseless field is A (1 - (1 - r h)^20) / (1 - a pi) for the
    rate r = (1 - a pi) / tau.
    """
    run(noisy_ring(32, PLAIN, amplitude="1.1"), tmp_path / "out", workers=1)
    result = compare(finished, tmp_path / "out")
    assert (result.samples, result.repeats, result.notes) == (32, 2, ())
    centre = next(one for one in result.differences if one.name == "centre")
    with reading(finished / "ensemble.nc") as reader:
        strength, tau = (reader.input(path)[:64] for path in reader.inputs)
    decay = 1.0 - np.pi * strength
    tenth = 0.1 * (1.0 - (1.0 - decay / tau) ** 20) / decay
    assert np.abs(tenth - 0.1 * peak_of_linear_ring(strength, tau)).max() < 0.01
    assert centre.mean.value == pytest.approx(tenth.mean(), rel=1e-9)
    # Student's t over 32 clusters; 2.039513 is its tabulated 0.975 quantile for 31 degrees
    half = 2.039513 * tenth[::2].std(ddof=1) / np.sqrt(32)
    assert centre.mean.high is not None
    assert centre.mean.value is not None
    assert centre.mean.high - centre.mean.value == pytest.approx(half, rel=1e-5)
    assert "32 common samples with 2 noise paths each" in result.as_text()


def test_comparison_of_runs_with_other_paths(finished: Path, tmp_path: Path) -> None:
    run(noisy_ring(64, PLAIN, repeats=3), tmp_path / "three", workers=1)
    with pytest.raises(InputError, match=r"2 noise paths a sample and .* 3"):
        compare(finished, tmp_path / "three")
    for seed in (5, 6):
        run(noisy_ring(64, PLAIN, 1, seed=seed, inputs=False), tmp_path / str(seed), workers=1)
    with pytest.raises(InputError, match=r"has the seed 5 and .* the seed 6"):
        compare(tmp_path / "5", tmp_path / "6")


def test_failed_realizations_are_named_by_sample_and_repeat(tmp_path: Path) -> None:
    """Of u' = -u + 200 u^2 and noise some paths of a sample leave every bound, and others may stay."""
    text = noisy_ring(64, PLAIN, repeats=3).source.text
    text = text.replace('form = "linear"', 'form = "formula"\nformula = "200 * u**2"')
    text = text.replace('coefficients = [0.0, "uniform(0.1, 0.2)"]', 'coefficients = ["uniform(0.0, 0.02)"]')
    result = run(read_text(text), tmp_path / "out", workers=1)
    failed = result.summary["failed"]
    with reading(tmp_path / "out" / "ensemble.nc") as reader:
        which = np.flatnonzero(~reader.valid())
        inputs = reader.input("kernel.coefficients.0")
    assert len(which) > 0.05 * 192
    assert (failed["count"], sum(failed["reasons"].values())) == (len(which), len(which))
    named = [(entry["sample"], entry["repeat"]) for entry in failed["list"]]
    assert named == [(j // 3, j % 3) for j in which[:100]]
    first = failed["list"][0]
    assert first["inputs"]["kernel.coefficients.0"] == inputs[which[0]]
    (unmet,) = (demand for demand in result.unmet if "more than 5 %" in demand)
    assert f"{len(which)} of 192 realizations failed" in unmet
    assert f"sample {first['sample']}, repeat {first['repeat']} (field not finite" in unmet
