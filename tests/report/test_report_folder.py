"""The report of a results folder: words of the study, files on disk, another report section."""

from __future__ import annotations

import csv
import dataclasses
import json
import xml.etree.ElementTree as ElementTree
from pathlib import Path

import numpy as np
import pytest

from aleafield.errors import ArchiveError
from aleafield.runs.planning import make_plan
from aleafield.runs.report import report
from aleafield.runs.run import run
from aleafield.runs.wording import model_text
from aleafield.study.reading import read_text
from aleafield.study.study import Study
from tests.report.reading import SVG, cloud_places, number, page_tree, rows, section, words

STUDY = """title = "A small ring"
units = {{ length = "mm", time = "ms", activity = "mV" }}
[domain]
shape = "ring"
length = 4.0
[kernel]
{kernel}
[rate]
{rate}
[drive]
formula = "a * cos(2 * pi * x / 4) + b"
a = "uniform(0.5, 1.5)"
b = 0.25
[dynamics]
time_constant = "uniform(9, 11)"
duration = 5.0
{noise}
[scheme]
{scheme}
[sampling]
samples = 64
[[quantity]]
name = "top"
measure = "maximum"
[report]
exceed = {{ top = [{level}] }}
"""


def study(
    kernel: str = 'form = "cosine"\ncoefficients = [0.1, 0.2]',
    rate: str = 'form = "logistic"\ngain = 2',
    scheme: str = "nodes = 16\ntime_step = 0.5",
    level: float = 0.6,
    noise: str = "",
) -> Study:
    """A small study on a ring."""
    return read_text(STUDY.format(kernel=kernel, rate=rate, scheme=scheme, level=level, noise=noise))


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A finished run."""
    out = tmp_path_factory.mktemp("run") / "out"
    run(study(), out, workers=1)
    return out


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        (
            {},
            {
                "domain": "the ring of length 4 mm",
                "kernel": {"": "cosine (coefficients 0.1 mV mm-1, 0.2 mV mm-1)"},
                "rate": "logistic (gain 2 mV-1, threshold 0 mV, maximum 1)",
                "drive": "a * cos(2 * pi * x / 4) + b, with a = uniform(0.5, 1.5), b = 0.25",
                "time_constant": "uniform(9.0, 11.0) ms",
                "duration": "5 ms",
                "integrals": "the kernel acted by its exact Fourier symbol on the firing rate at 16 points",
                "steps": 10,
                "noise": None,
                "bridged": (),
                "dependence": "",
            },
        ),
        (
            {
                "kernel": 'form = "formula"\nformula = "exp(-r**2 / s)"\ns = 0.5',
                "rate": 'form = "normal-ogive"\ngain = 1.5',
                "scheme": 'projector = "piecewise linear"\nmethod = "galerkin"\nnodes = 16\ntime_step = 0.7',
            },
            {
                "kernel": {"": "w(x, y) = exp(-r**2 / s), with s = 0.5"},
                "rate": "normal-ogive (gain 1.5 mV-1, threshold 0 mV, maximum 1)",
                "integrals": "integrals were taken by the two-point Gauss rule on every element "
                "between 16 nodes",
                "steps": 8,
            },
        ),
        (
            {
                "kernel": '[kernel.near]\nform = "gaussian"\nstrength = 1\nwidth = 0.5',
                "rate": 'form = "step"\nthreshold = 0.2',
            },
            {
                "kernel": {"near": "gaussian (strength 1 mV, width 0.5 mm)"},
                "rate": "step (threshold 0.2 mV, maximum 1)",
                "integrals": "integrals of the step rate resolved the threshold crossings between 64 points",
            },
        ),
        (
            {
                "noise": '[noise]\nstrength = "uniform(0.1, 0.2)"\ncorrelation = "cosine"\n'
                "coefficients = [1.0, 0.5]"
            },
            {"noise": "cosine (strength uniform(0.1, 0.2) mV, coefficients 1, 0.5), 3 modes of the ring"},
        ),
    ],
    ids=["cosine", "formula", "step", "noise"],
)
def test_a_study_in_words(changes: dict[str, str], expected: dict[str, object]) -> None:
    built = study(**changes)  # type: ignore[arg-type]
    text = dataclasses.asdict(model_text(built, make_plan(built)[0]))
    assert {key: text[key] for key in expected} == expected


def test_a_run_leaves_page_and_figures(folder: Path) -> None:
    tree = page_tree((folder / "report.html").read_text(encoding="utf-8"))
    assert words(tree.find(".//h1")) == "A small ring"  # type: ignore[arg-type]
    code = section(tree, "study").find("pre/code")
    assert code is not None
    assert code.text == (folder / "study.toml").read_text(encoding="utf-8")
    assert sorted(p.name for p in (folder / "figures").iterdir()) == [
        "distribution-top.svg",
        "error-top.svg",
        "field-course.svg",
        "field-mean.svg",
        "field-profile.svg",
        "field-spread.svg",
        "scatter-top.svg",
    ]
    summary = json.loads((folder / "summary.json").read_text(encoding="utf-8"))
    shown = rows(tree, "How uncertain top is")[0][1].removesuffix(" mV")
    mean = summary["quantities"]["top"]["mean"]
    assert number(shown) == pytest.approx(mean["value"], abs=0.05 * mean["error"]["total"])


def test_the_scatter_shows_the_stored_inputs(folder: Path) -> None:
    """The value of every sample over its own input: places in the picture against rows of ensemble.csv."""
    with open(folder / "ensemble.csv", newline="", encoding="utf-8") as file:
        table = list(csv.DictReader(file))
    tree = ElementTree.fromstring((folder / "figures" / "scatter-top.svg").read_text(encoding="utf-8"))
    clouds = [cloud_places(e) for e in tree.iter(f"{SVG}path") if e.get("class") == "cloud"]
    assert len(clouds) == 2
    value = np.array([float(row["top"]) for row in table])
    for path, places in zip(("drive.a", "dynamics.time_constant"), clouds, strict=True):
        at = np.column_stack([np.array([float(row[path]) for row in table]), -value])
        spans = [np.ptp(points, axis=0) for points in (places, at)]
        shown, known = ((p - p.min(axis=0)) / span for p, span in zip((places, at), spans, strict=True))
        # every sample has a dot within the grain of half a px of 150
        nearest = np.abs(known[:, None] - shown[None]).max(axis=2).min(axis=1)
        assert nearest.max() < 0.01


def test_dependence_in_words() -> None:
    built = study(
        noise='[dependence]\nrank_correlation = [["drive.a", "dynamics.time_constant", 0.6]]',
    )
    said = model_text(built, make_plan(built)[0]).dependence
    assert said == "rank correlation 0.6 of drive.a and dynamics.time_constant"


def test_report_writes_the_same_again(folder: Path) -> None:
    """Deleted, changed and stale files are put right; what was stored stays as it is."""
    page, ensemble = (folder / "report.html").read_bytes(), (folder / "ensemble.nc").read_bytes()
    figure = (folder / "figures" / "error-top.svg").read_bytes()
    (folder / "report.html").unlink()
    (folder / "figures" / "error-top.svg").write_text("changed")
    (folder / "figures" / "error-gone.svg").write_text("stale")
    result = report(folder)
    assert result.solved == 0
    assert (folder / "report.html").read_bytes() == page
    assert (folder / "figures" / "error-top.svg").read_bytes() == figure
    assert not (folder / "figures" / "error-gone.svg").exists()
    assert (folder / "ensemble.nc").read_bytes() == ensemble


def test_report_takes_another_report_section(folder: Path) -> None:
    """Another level to exceed: its probability is the share of the rows of ensemble.csv above it."""
    other = study(level=0.5)
    result = report(folder, other)
    assert result.solved == 0
    with open(folder / "ensemble.csv", newline="", encoding="utf-8") as file:
        values = [float(row["top"]) for row in csv.DictReader(file)]
    share = sum(value > 0.5 for value in values) / len(values)
    assert 0 < share < 1
    assert result.summary["quantities"]["top"]["exceed"]["0.5"]["value"] == pytest.approx(share, abs=1e-12)
    table = rows(page_tree((folder / "report.html").read_text(encoding="utf-8")), "How likely it is")
    assert [row[1] for row in table] == ["P(above 0.5 mV)"]
    assert (folder / "study.toml").read_text(encoding="utf-8") == other.source.text


def test_report_refuses_what_it_cannot_show(folder: Path, tmp_path: Path) -> None:
    with pytest.raises(ArchiveError, match="another study"):
        report(folder, study(scheme="nodes = 32\ntime_step = 0.5"))
    with pytest.raises(ArchiveError, match="no results"):
        report(tmp_path)
