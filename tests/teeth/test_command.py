"""Faults of the command line, and of what it leaves, that the tests of commands and examples must see."""

from __future__ import annotations

import copy
import json
import sys
from collections.abc import Callable, Iterator
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

import pytest

from aleafield import cli
from aleafield.runs import run as running
from aleafield.runs import summary as summaries
from aleafield.runs.execution import Stored, stored_ensemble
from aleafield.runs.folder import claimed_plan
from aleafield.runs.plan_file import read_plan
from aleafield.runs.progress import ProgressLine
from aleafield.runs.run import RunResult
from aleafield.study import minimal
from aleafield.study.impossible import refuse_impossible_samples
from tests.command import (
    saying,
    test_arguments,
    test_broken_studies,
    test_requirements,
    test_runs,
)
from tests.command import test_start_up as start_up
from tests.examples.summary_shape import assert_is_summary, read_summary
from tests.messages.expectations import broken_files
from tests.teeth.biting import Plant, Tooth, assert_bites, everywhere, member

Capture = pytest.CaptureFixture[str]
Test = Callable[[Capture, Path], None]
BROKEN = {entry.path.stem: entry for entry in broken_files()}


def nothing_failed(*_: Any) -> dict[str, Any]:
    """Failures that are not counted."""
    return {"count": 0, "reasons": {}, "listed": 0, "list": []}


FAULTS: list[tuple[str, Plant, Test]] = [
    (
        "progress on standard output",
        everywhere(ProgressLine, lambda stream=None: ProgressLine(sys.stdout)),
        lambda capture, folder: test_runs.test_json_is_one_document_alone_on_standard_output(
            capture, folder, []
        ),
    ),
    (
        "JSON with a NaN in it",
        member(
            cli, "_print_json", lambda document: print(json.dumps({**document, "confidence": float("nan")}))
        ),
        lambda capture, folder: test_runs.test_json_is_one_document_alone_on_standard_output(
            capture, folder, ["--quiet"]
        ),
    ),
    (
        "an error that ends in a traceback",
        member(cli, "AleafieldError", ZeroDivisionError),
        lambda capture, _: test_broken_studies.test_check_says_the_same(
            capture, BROKEN["kernel_width_negative"]
        ),
    ),
    (
        "a fault that exits with 1",
        member(saying, "main", lambda arguments: min(cli.main(arguments), 1)),
        lambda capture, _: test_broken_studies.test_check_says_the_same(capture, BROKEN["missing_title"]),
    ),
    (
        "an aim that is not looked at",
        member(RunResult, "exit_status", property(lambda self: 0)),
        test_requirements.test_an_aim_that_is_missed_and_one_that_is_met,
    ),
    (
        "failures that are not counted",
        member(summaries, "_failed", nothing_failed),
        test_requirements.test_samples_that_fail_are_named,
    ),
    (
        "a blow-up in the middle of a run that counts as a success",
        member(summaries, "FAILED_SHARE", 1.1),
        lambda capture, folder: test_broken_studies.test_run_says_what_is_wrong(
            capture, folder, BROKEN["blow_up_in_the_middle"]
        ),
    ),
    (
        "impossible samples that nobody looks for",
        everywhere(
            refuse_impossible_samples,
            lambda study, design, count, block=0: None,
        ),
        lambda capture, _: test_broken_studies.test_check_finds_impossible_samples_too(capture),
    ),
    (
        "no study where a file is missing",
        member(minimal, "MINIMAL_STUDY", 'title = "nothing"\n'),
        lambda capture, folder: test_arguments.test_check_of_a_missing_file_prints_a_study_that_reads(
            capture, folder
        ),
    ),
    (
        "no workers taken for one",
        everywhere(running.worker_count, lambda asked: 1),
        lambda capture, folder: test_arguments.test_no_workers(
            capture, saying.study_file(folder / "study.toml"), 0
        ),
    ),
    (
        "a foreign folder that is used",
        everywhere(claimed_plan, lambda layout, study: read_plan(layout) if layout.plan.exists() else None),
        lambda capture, folder: test_arguments.test_run_into_a_foreign_folder(
            capture, saying.study_file(folder / "study.toml"), "notes.txt"
        ),
    ),
    (
        "another report section that solves again",
        everywhere(stored_ensemble, lambda layout: Stored()),
        lambda capture, folder: solved_again(capture, folder),
    ),
]


def solved_again(capture: Capture, folder: Path) -> None:
    """The suite's test, its own patches undone at its end."""
    with pytest.MonkeyPatch.context() as patch:
        test_runs.test_another_report_section_solves_nothing(capture, folder, "run", patch)


@pytest.mark.parametrize(("fault", "plant", "test"), FAULTS, ids=[entry[0] for entry in FAULTS])
def test_commands(capsys: Capture, fault: str, plant: Plant, test: Test) -> None:
    def check() -> None:
        with TemporaryDirectory() as folder:
            test(capsys, Path(folder))

    assert_bites(Tooth(fault, plant, check))


def test_start_up(tmp_path: Path) -> None:
    """Every new interpreter loads numpy, as an import at the top of the package would."""
    (tmp_path / "sitecustomize.py").write_text("import numpy\n")

    def heavy(real: Callable[..., dict[str, str]] = saying.surroundings) -> dict[str, str]:
        found = real()
        return {**found, "PYTHONPATH": f"{tmp_path}:{found['PYTHONPATH']}"}

    assert_bites(
        Tooth(
            "a heavy package loaded at the start",
            member(saying, "surroundings", heavy),
            lambda: start_up.test_help_loads_no_heavy_package(["--help"]),
        )
    )


@pytest.fixture(scope="module")
def summary(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    """summary.json of a real run."""
    folder = tmp_path_factory.mktemp("run")
    study = saying.study_file(folder / "study.toml", more='[aim]\ntolerance = "50 %"\n')
    words = saying.command_line("run", study, "--out", folder / "out", "--workers", 1, "--json", "--quiet")
    return read_summary(saying.ended(saying.start(words)).out)


def changed(entry: Any, steps: str, value: Any) -> None:
    """Set what lies at the end of a path; a value that is a function takes what lies there."""
    *way, last = steps.split("/")
    for step in way:
        entry = entry[step]
    entry[last] = value(entry[last]) if callable(value) else value


MEAN = "quantities/peak/mean"
SHAPES: list[tuple[str, str, Any]] = [
    ("an unknown schema", "schema", 2),
    ("an interval turned round", f"{MEAN}/interval", lambda ends: ends[::-1]),
    ("an interval about another value", f"{MEAN}/value", lambda value: value + 10.0),
    ("an interval shorter than its total", f"{MEAN}/error/total", lambda total: 2 * total),
    ("a part that is left out of the total", f"{MEAN}/error/space", 1.0),
    ("a negative part", f"{MEAN}/error/time", -1e-9),
    ("a part that does not apply and is 0", f"{MEAN}/error/noise_modes", 0.0),
    ("a NaN", f"{MEAN}/error/sampling", float("nan")),
    ("a truth value for a number", f"{MEAN}/value", True),
    ("a value without an interval", f"{MEAN}/interval", None),
    ("a factor without safety", f"{MEAN}/orders/space/factor", 1.0),
    ("a probability above 1", "quantities/peak/exceed/1.0/interval", [0.5, 1.5]),
    ("a negative sd", "quantities/peak/sd/interval", [-1.0, 9.0]),
    ("quantiles that fall", "quantities/peak/quantiles/0.5/value", 0.5),
    ("an occurrence where none is asked", "quantities/arrival/occurs/value", 1.2),
    ("a count that is no product", "sampling/samples", 65),
    ("15 scramblings", "sampling/replicates", 15),
    ("a failure without a reason", "failed/count", 1),
    ("an aim that is met though missed", "aim/half_width", 1e9),
    ("a confidence in per cent", "confidence", 95),
    ("an input without a unit", "inputs/dynamics.time_constant/units", ""),
    ("an operator without a reason", "scheme/operators", [{"part": "kernel", "operator": "x", "error": 0.0}]),
    ("an empty warning", "warnings", [""]),
]


@pytest.mark.parametrize(("fault", "steps", "value"), SHAPES, ids=[entry[0] for entry in SHAPES])
def test_summaries(summary: dict[str, Any], fault: str, steps: str, value: Any) -> None:
    broken = copy.deepcopy(summary)
    assert_is_summary(broken)
    changed(broken, steps, value)
    with pytest.raises(AssertionError):
        assert_is_summary(broken)


def members(entry: Any, way: tuple[str, ...] = ()) -> Iterator[tuple[str, ...]]:
    """Paths of all members of a document down to the statistics' own."""
    if isinstance(entry, dict):
        for key, value in entry.items():
            yield (*way, key)
            yield from members(value, (*way, key))


def test_every_member_of_a_summary_is_needed(summary: dict[str, Any]) -> None:
    """Members may be left out where they are named by the study, or say more than must be said."""
    may_go = {"orders", "notes", "corrected"}
    named = {"quantities", "quantiles", "exceed", "inputs", "reasons", "parts", "orders"}
    for way in members(summary):
        if way[-1] in may_go or (way[-2:-1] and way[-2] in named) or "parts" in way:
            continue
        broken = copy.deepcopy(summary)
        entry = broken
        for step in way[:-1]:
            entry = entry[step]
        del entry[way[-1]]
        with pytest.raises((AssertionError, KeyError)):
            assert_is_summary(broken)
