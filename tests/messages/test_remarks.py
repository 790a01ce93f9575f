"""What a run says of values that answer another question than the one asked."""

from __future__ import annotations

from pathlib import Path

import pytest

import aleafield as af
from aleafield.study.minimal import MINIMAL_STUDY
from aleafield.study.reading import read_text

SMALL = '[scheme]\nnodes = 33\ntime_step = 2.0\n[sampling]\nmethod = "monte carlo"\nsamples = 16\n'


def warnings(text: str, folder: Path) -> list[str]:
    """The warnings of a small run of a study."""
    return list(af.run(read_text(text), folder / "run").summary["warnings"])


def test_a_flooded_domain_is_named(tmp_path: Path) -> None:
    flooded = MINIMAL_STUDY.replace("strength = 0.25", "strength = 1.4") + SMALL
    found = [w for w in warnings(flooded, tmp_path) if w.startswith("width")]
    assert found == [
        "width: in 16 of 16 samples the whole domain is active; the width then is that of the domain, not of a patch"
    ]


def test_the_minimal_study_answers_its_question(tmp_path: Path) -> None:
    assert not [w for w in warnings(MINIMAL_STUDY + SMALL, tmp_path) if w.startswith("width")]


def test_a_front_that_has_left_is_named(tmp_path: Path) -> None:
    front = MINIMAL_STUDY.replace("strength = 0.25", "strength = 1.4").replace(
        'measure = "active width"', 'measure = "front position"'
    )
    found = [w for w in warnings(front + SMALL, tmp_path) if w.startswith("width")]
    assert len(found) == 1
    assert "in 16 of 16 samples no front is inside the domain" in found[0]


def test_a_run_is_opened_with_the_functions_it_was_made_with(tmp_path: Path) -> None:
    study = af.build_study(
        "a function of the field",
        domain=af.Ring(10.0),
        kernel=af.GaussianKernel(0.5, af.Uniform(0.8, 1.2)),
        rate=af.LogisticRate(10.0, 0.3),
        initial="cos(2*pi*x/10)",
        time_constant=1.0,
        duration=2.0,
        quantities=[af.FunctionQuantity("middle", lambda u, x: u[:, 0])],
        scheme={"nodes": 16, "time_step": 0.5},
        sampling={"samples": 16, "method": "monte carlo"},
    )
    af.run(study, tmp_path / "run")
    assert af.open_run(tmp_path / "run", study).sample(3)["middle"].shape == ()
    with pytest.raises(af.ArchiveError, match="Python functions"):
        af.open_run(tmp_path / "run")


def test_run_takes_the_path_of_a_study(tmp_path: Path) -> None:
    path = tmp_path / "study.toml"
    path.write_text(MINIMAL_STUDY + SMALL, encoding="utf-8")
    assert af.run(path, tmp_path / "run").summary["cost"]["samples"] == 16
