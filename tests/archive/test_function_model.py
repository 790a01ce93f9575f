"""A Python function in place of a field, through the same runs and the same files."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np
import pytest

from aleafield.archive.description import QuantityColumn
from aleafield.archive.durable import make_folder
from aleafield.archive.ensemble_reader import reading
from aleafield.archive.layout import Layout
from aleafield.arrays import FloatArray
from aleafield.ensemble.records import QUANTITY_NOT_FINITE
from aleafield.errors import InputError
from aleafield.forward.function_model import FunctionModel
from aleafield.randomness.design import Design
from aleafield.randomness.families import Family
from aleafield.randomness.inputs import Dependence, Input
from aleafield.randomness.laws import Uniform
from aleafield.runs.plan_file import read_plan, with_more_samples, write_plan
from tests.archive.conventions import strangers
from tests.archive.small_runs import allocation_of, assert_same_values, finish, plan_of, with_families
from tests.sensitivity.known_functions import ISHIGAMI

QUANTITIES = (QuantityColumn("y", "1", "function", False), QuantityColumn("root", "1", "function", False))
DESIGN = Design(
    [Input(f"x{k}", Uniform(-np.pi, np.pi)) for k in range(3)], Dependence(), "quasi-monte carlo", 9
)
FAMILIES: Mapping[Family, int] = {"held out": 37, "exchange": 32 * 7, "screening": 5 * 4}


def ishigami(inputs: Mapping[str, FloatArray]) -> dict[str, FloatArray]:
    """The function, and the root of x1 + 3: not finite where x1 < -3, once in 44."""
    x1, x2, x3 = (inputs[f"x{k}"] for k in range(3))
    return {"y": (1 + 0.1 * x3**4) * np.sin(x1) + 7 * np.sin(x2) ** 2, "root": np.sqrt(x1 + 3)}


def a_run(folder: Path, samples: int, width: int, workers: int = 1) -> FunctionModel:
    """A finished run with all families."""
    model = FunctionModel(ishigami, DESIGN)
    plan = with_families(plan_of(model, "quasi-monte carlo", samples, width), FAMILIES)
    make_folder(folder)
    write_plan(Layout(folder), plan)
    finish(Layout(folder), model, plan, workers, QUANTITIES)
    return model


def test_a_run_holds_the_values_of_the_function(tmp_path: Path) -> None:
    a_run(tmp_path, 128, 24)
    assert {path.name for path in tmp_path.iterdir()} == {
        *("plan.json", "ensemble.nc", "ensemble.csv", "summary.json")
    }
    assert strangers(tmp_path / "ensemble.nc") == []
    with reading(tmp_path / "ensemble.nc") as reader:
        for family, count in {"main": 128, **FAMILIES}.items():
            label = "" if family == "main" else family.replace(" ", "_")
            u = DESIGN.points(family, np.arange(count))
            x1 = np.pi * (2 * u[:, 0] - 1)
            known = np.where(x1 < -3, np.nan, ISHIGAMI.evaluate(u))
            # |y| < 18, and the arguments of its sines are exact to 1e-15: rounding of each stays below 1e-13
            np.testing.assert_allclose(reader.values("y", label), known, rtol=0, atol=1e-13)
            np.testing.assert_array_equal(reader.failed(label), np.where(x1 < -3, QUANTITY_NOT_FINITE, 0))
        assert reader.failed().any()
        assert reader.histories("y") is None
        assert len(reader.axis("t_moments")) == 0


def test_an_extension_and_workers_give_the_same(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("aleafield.runs.execution.WORTH_A_PROCESS", 1.0)
    a_run(tmp_path / "long", 256, 64, workers=2)
    model = a_run(tmp_path / "short", 64, 16)
    layout = Layout(tmp_path / "short")
    longer = with_more_samples(read_plan(layout), model, allocation_of("quasi-monte carlo", 256))
    assert longer.families == FAMILIES
    write_plan(layout, longer)
    finish(layout, model, longer, 1, QUANTITIES)
    assert_same_values(tmp_path / "short", tmp_path / "long")


@pytest.mark.parametrize("given", [np.zeros(3), np.array(1.0), np.zeros((8, 1))])
def test_one_number_for_each_row(given: FloatArray) -> None:
    model = FunctionModel(lambda inputs: {"y": given}, DESIGN)
    with pytest.raises(
        InputError, match=r"y: the function gives shape .* for 8 rows; one number for each row"
    ):
        model.evaluate(model.level, np.arange(8))


def test_what_it_is_as_a_forward_model() -> None:
    model = FunctionModel(ishigami, DESIGN)
    assert model.path(model.level) == ()
    assert (model.repeats, len(model.inputs), len(model.points(model.level))) == (1, 3, 0)
