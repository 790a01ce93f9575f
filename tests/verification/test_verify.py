"""`aleafield verify` prints what it finds, passes, and goes red when an answer or expectation is changed."""

from __future__ import annotations

import json
import re
from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import chi2

from aleafield.verification import problems
from aleafield.verification.given_noise import CosinePaths, Impulses
from aleafield.verification.problem import KnownProblem, Series
from aleafield.verification.problems import PROBLEMS
from aleafield.verification.solving import solve
from tests.command.saying import Said, command_line, ended, say, start

NAMES = [problem.name for problem in PROBLEMS]
HEADS = ["problem", "scheme", "refined", "expected", "observed", "last error", "accepted"]


@pytest.fixture(scope="module")
def said() -> Said:
    """The whole table, as a user gets it."""
    return ended(start(command_line("verify")))


def rows_of(out: str) -> list[list[str]]:
    """Cells of a table; at least two spaces lie between them."""
    return [re.split(r" {2,}", line) for line in out.splitlines()]


def quickest(problem: KnownProblem) -> Series:
    """The series of a problem with the fewest nodes, points and steps."""
    return min(problem.series, key=lambda series: max(series.counts) * series.steps)


def only(monkeypatch: pytest.MonkeyPatch, problem: KnownProblem, series: Series, **changes: object) -> None:
    """Let the command verify one series of one changed problem."""
    changed = replace(problem, series=(series,), **changes)  # type: ignore[arg-type]
    monkeypatch.setattr(problems, "PROBLEMS", (changed,))


def test_everything_passes(said: Said) -> None:
    assert (said.status, said.err) == (0, "")


def test_columns(said: Said) -> None:
    head, *rows = rows_of(said.out)
    assert head == HEADS
    assert len(rows) == sum(len(problem.series) for problem in PROBLEMS)
    assert {row[0] for row in rows} == set(NAMES)
    for row in rows:
        assert len(row) == len(HEADS) + 1
        assert row[-1] == "ok"
        assert float(row[5]) <= float(row[6])
        if row[3] != "spectral":
            assert float(row[4]) == pytest.approx(float(row[3]), abs=0.5)


def test_every_kind_of_projector_and_order_is_there(said: Said) -> None:
    schemes = {row[1] for row in rows_of(said.out)[1:]}
    for scheme in (
        *("piecewise linear, collocation", "piecewise linear, galerkin", "chebyshev, collocation"),
        *("legendre, galerkin", "fourier, collocation", "fourier, galerkin"),
        *("chebyshev, collocation, trapezoid", "legendre, galerkin, trapezoid"),
    ):
        assert scheme in schemes
    assert {row[3] for row in rows_of(said.out)[1:]} == {"1", "2", "4", "spectral"}


@pytest.mark.parametrize("steps", [4, 64])
def test_impulses_have_the_covariance_of_independent_increments(steps: int) -> None:
    """The sum of all increments of three modes over a run of 2: sums of 1 to each realization, variance 2."""
    increments = Impulses().increments(steps, 3, 2.0)
    assert increments.shape == (steps, 3 * steps, 3)
    flat = increments.transpose(0, 2, 1).reshape(3 * steps, 3 * steps)
    np.testing.assert_array_equal(flat @ flat.T, np.eye(3 * steps))
    ends = increments.sum(axis=0)
    fields = np.stack([ends[:, 0], ends[:, 0] + 2 * ends[:, 1], ends[:, 2]], axis=1)
    np.testing.assert_allclose(Impulses().observed(fields, 2.0 / steps), [[2.0, 2.0, 0.0]], rtol=1e-14)


def test_given_paths_are_one_path_for_every_number_of_steps() -> None:
    """Chi-square bounds of the variance of the ends, 1e-4 in each tail; no other mode moves."""
    paths = CosinePaths(realizations=400, depth=5, seed=1)
    coarse, fine = (paths.increments(steps, 3, 2.0) for steps in (4, 32))
    np.testing.assert_array_equal(coarse, fine)
    assert fine.shape == (32, 400, 3)
    assert not fine[:, :, [0, 2]].any()
    assert chi2.ppf(1e-4, 400) < (fine.sum(axis=0)[:, 1] ** 2).sum() / 2.0 < chi2.isf(1e-4, 400)


@pytest.mark.parametrize("problem", PROBLEMS, ids=NAMES)
def test_a_changed_answer_is_off(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch, problem: KnownProblem
) -> None:
    """An answer changed by the accepted error itself, at the place where the field is largest."""
    series = quickest(problem)
    only(monkeypatch, problem, series)
    assert say(capsys, "verify").status == 0
    shift = 2.1 * series.last_error
    only(monkeypatch, problem, series, exact=lambda x: problem.exact(x) + shift)
    said = say(capsys, "verify")
    assert (said.status, said.err) == (1, "")
    assert [row[-1] for row in rows_of(said.out)[1:]] == ["OFF"]


def test_a_wrong_expectation_is_off(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    series = PROBLEMS[0].series[0]
    assert series.expected_order == 2
    for changed in (replace(series, expected_order=3.0), replace(series, last_error=series.last_error / 2)):
        only(monkeypatch, PROBLEMS[0], changed)
        assert say(capsys, "verify").status == 1


def test_json(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> None:
    series = PROBLEMS[0].series[0]
    only(monkeypatch, PROBLEMS[0], series)
    said = say(capsys, "verify", "--json")
    document = json.loads(said.out)
    assert (said.status, document["schema"], document["passed"]) == (0, 1, True)
    (found,) = document["series"]
    assert found["problem"] == PROBLEMS[0].name
    assert found["counts"] == list(series.counts)
    assert found["errors"] == [solve(PROBLEMS[0], series, count) for count in series.counts]
    widths = 1.0 / (np.array(series.counts) - 1)
    slope = np.diff(np.log(found["errors"]))[-1] / np.diff(np.log(widths))[-1]
    assert found["observed_order"] == pytest.approx(slope, rel=1e-12)
