"""The stages of a run: decided on values alone, written down before they are solved, the same however often stopped."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from aleafield.archive.layout import Layout
from aleafield.errors import ArchiveError, InputError
from aleafield.randomness.families import exchange_runs
from aleafield.runs import run as run_module
from aleafield.runs.check import check
from aleafield.runs.execution import execute
from aleafield.runs.extend import extend
from aleafield.runs.model import design_of
from aleafield.runs.plan_file import read_plan
from aleafield.runs.report import report
from aleafield.runs.results import open_run
from aleafield.runs.run import run
from aleafield.runs.stages import exchange_rows, further_runs
from aleafield.sampling.allocation import allocate
from aleafield.study.reading import read_text
from tests.archive.small_runs import assert_same_values
from tests.sensitivity_runs.closed_fields import ABOVE, PEAK, ring

TOTALS = '[sensitivity]\nindices = ["first", "total"]\n'
TEXT = ring(PEAK + ABOVE, more=TOTALS)
EXCHANGED = 256 * 7


class Killed(BaseException):
    """Stands for the end of the process."""


def said(folder: Path) -> dict[str, Any]:
    """The summary without what a clock measured."""
    summary: dict[str, Any] = json.loads((folder / "summary.json").read_text())
    return {name: entry for name, entry in summary.items() if name != "cost"}


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("undisturbed") / "out"
    run(read_text(TEXT), folder, workers=1)
    return folder


@pytest.mark.parametrize(
    ("step", "call"),
    [
        ("execute", 1),
        ("gather_stage", 1),
        ("clear_parts", 1),
        ("next_stage", 1),
        ("write_plan", 2),
        ("execute", 2),
        ("put_together", 1),
        ("write_report", 1),
    ],
)
@pytest.mark.parametrize("after", [False, True])
def test_killed_at_every_step_and_resumed(
    undisturbed: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, step: str, call: int, after: bool
) -> None:
    """Killed just before, or just after, the given call of a step; the same call of `run` goes on."""
    original: Callable[..., Any] = getattr(run_module, step)
    calls = 0

    def until_killed(*arguments: Any) -> Any:
        nonlocal calls
        calls += 1
        if calls == call and not after:
            raise Killed
        result = original(*arguments)
        if calls == call:
            raise Killed
        return result

    folder = tmp_path / "out"
    monkeypatch.setattr(run_module, step, until_killed)
    with pytest.raises(Killed):
        run(read_text(TEXT), folder, workers=1)
    monkeypatch.undo()
    Layout(folder).lock.unlink(missing_ok=True)
    run(read_text(TEXT), folder, workers=1)
    assert_same_values(folder, undisturbed)
    assert said(folder) == said(undisturbed)
    assert read_plan(Layout(folder)) == read_plan(Layout(undisturbed))


def test_the_second_stage_stands_in_the_plan_before_it_is_solved(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    seen = []

    def watching(layout: Layout, *rest: Any) -> int:
        plan = read_plan(layout)
        seen.append((dict(plan.families), plan.settled))
        return execute(layout, *rest)

    monkeypatch.setattr(run_module, "execute", watching)
    run(read_text(TEXT), tmp_path / "out", workers=1)
    assert seen == [({"held out": 64}, False), ({"held out": 64, "exchange": EXCHANGED}, True)]


def test_a_finished_run_solves_and_decides_nothing_anew(
    undisturbed: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    for step in ("execute", "next_stage", "put_together"):
        monkeypatch.setattr(run_module, step, None)
    assert run(read_text(TEXT), undisturbed, workers=1).solved == 0


def test_between_two_stages_there_is_no_result(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = tmp_path / "out"

    def killed(*_: Any) -> None:
        raise Killed

    monkeypatch.setattr(run_module, "next_stage", killed)
    with pytest.raises(Killed):
        run(read_text(TEXT), folder, workers=1)
    with pytest.raises(ArchiveError, match="unfinished"):
        report(folder)
    with pytest.raises(ArchiveError, match="unfinished"):
        open_run(folder)


def test_nothing_is_exchanged_for_a_quantity_that_often_has_no_value(tmp_path: Path) -> None:
    """Its indices would not be stated, since the inputs of the runs with a value are no longer independent."""
    late = '[[quantity]]\nname = "arrival"\nmeasure = "time to level"\nat = 0.0\nlevel = 1.2\n'
    run(read_text(ring(late, more=TOTALS)), tmp_path / "out", workers=1)
    assert read_plan(Layout(tmp_path / "out")).families == {"held out": 64}
    total = said(tmp_path / "out")["quantities"]["arrival"]["sensitivity"]["amplitude"]["total"]
    assert total["value"] is None
    assert "gave no value" in total["reason"]


def test_an_extension_decides_the_rows_for_the_new_number(tmp_path: Path) -> None:
    """Of two inputs: 256 rows with 256 samples, 512 with 2048; the run equals one of 2048 samples from the start."""
    text = ring(ABOVE, 256, more=TOTALS).replace('"uniform(8, 12)"', "10.0")
    study = read_text(text)
    run(study, tmp_path / "extended", workers=1)
    assert read_plan(Layout(tmp_path / "extended")).families == {"held out": 64, "exchange": 256 * 5}
    extend(tmp_path / "extended", 1792, workers=1)
    run(read_text(text.replace("samples = 256", "samples = 2048")), tmp_path / "at once", workers=1)
    assert read_plan(Layout(tmp_path / "extended")).families == {"held out": 64, "exchange": 512 * 5}
    assert_same_values(tmp_path / "extended", tmp_path / "at once")
    assert said(tmp_path / "extended")["quantities"] == said(tmp_path / "at once")["quantities"]


def test_an_extension_holds_out_more(tmp_path: Path) -> None:
    text = ring(samples=64, method="polynomial chaos")
    run(read_text(text), tmp_path / "extended", workers=1)
    assert read_plan(Layout(tmp_path / "extended")).families == {"held out": 32}
    extend(tmp_path / "extended", 192, workers=1)
    run(read_text(text.replace("samples = 64", "samples = 256")), tmp_path / "at once", workers=1)
    assert read_plan(Layout(tmp_path / "extended")).families == {"held out": 64}
    assert_same_values(tmp_path / "extended", tmp_path / "at once")
    assert said(tmp_path / "extended")["quantities"] == said(tmp_path / "at once")["quantities"]


@pytest.mark.parametrize(("samples", "inputs"), [(64, 2), (256, 1), (1024, 8), (4096, 3), (100_000, 2)])
def test_rows_are_as_many_as_the_rule_says(samples: int, inputs: int) -> None:
    rows = exchange_rows(samples, inputs)
    if samples < 256:
        assert rows == 0
        return
    assert 256 <= rows <= samples
    assert rows // 16 & (rows // 16 - 1) == 0, "16 scramblings of a power of two"
    assert rows == 256 or rows * exchange_runs(inputs) <= 2 * samples
    assert 2 * rows * exchange_runs(inputs) > 2 * samples, "no more are affordable"


@pytest.mark.parametrize(
    ("more", "expected"),
    [
        ("", {}),
        ('[sensitivity]\nindices = ["first"]', {"held out": 64}),
        ('[sensitivity]\nindices = ["shapley"]', {"held out": 64}),
        (TOTALS, {"held out": 64, "exchange": EXCHANGED}),
        ('[sensitivity]\nindices = ["second"]', {"held out": 64, "exchange": EXCHANGED}),
        ("[sensitivity]\nwanted_sd = { peak = 0.1 }", {"held out": 64, "exchange": EXCHANGED}),
        ("[sensitivity]\nfix_below = 0.01", {"held out": 64, "exchange": EXCHANGED}),
        (
            '[sensitivity]\nindices = ["shapley"]\n[dependence]\n'
            'rank_correlation = [["amplitude", "dynamics.time_constant", 0.5]]',
            {"held out": 64},
        ),
    ],
)
def test_check_says_how_many_further_runs_there_may_be(more: str, expected: dict[str, int]) -> None:
    study = read_text(ring(more=more))
    assert further_runs(study, allocate(study.sampling, 3, noisy=False)) == expected
    found = check(study)
    assert found.sampling["further_runs"] == expected
    for count in expected.values():
        assert any(str(count) in line for line in found.as_text().splitlines())


def test_an_impossible_number_in_a_further_run_is_refused_before_any_solve(tmp_path: Path) -> None:
    """time_constant = amplitude - c, with c between the least amplitude held out and that of all samples."""
    found = set()
    for seed in range(1, 9):
        text = ring(more=TOTALS, seed=seed).replace('"uniform(8, 12)"', '"amplitude - {c}"')
        study = read_text(text.replace("{c}", "0.5"))
        allocation = allocate(study.sampling, 2, noisy=False)
        design = design_of(study, allocation)
        least = {
            family: design.values_at(design.points(family, np.arange(count)))["amplitude"].min()
            for family, count in (("main", 256), *further_runs(study, allocation).items())
        }
        family = min(least, key=lambda one: least[one])
        others = min(value for one, value in least.items() if one != family)
        impossible = read_text(text.replace("{c}", repr(float((least[family] + others) / 2))))
        words = "sample" if family == "main" else f"{family} sample"
        for look in (check, lambda study: run(study, tmp_path / str(seed), workers=1)):  # noqa: B023
            with pytest.raises(InputError, match=rf": {words} \d+ gives") as raised:
                look(impossible)
            assert "dynamics.time_constant" in str(raised.value)
        assert not (tmp_path / str(seed) / "parts").exists()
        found.add(family)
    assert len(found) > 1, "all seeds say the same"
