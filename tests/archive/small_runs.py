"""A whole run of the analytic model, in this process or (as a program) in one of its own.

python -m tests.archive.small_runs FOLDER SAMPLES WIDTH WORKERS DELAY METHOD REPEATS FAMILIES
"""

from __future__ import annotations

import json
import os
import resource
import subprocess
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path
from types import MappingProxyType

import numpy as np

from aleafield.archive.description import Axes, Description, InputColumn, QuantityColumn
from aleafield.archive.durable import make_folder
from aleafield.archive.ensemble_file import Summary
from aleafield.archive.ensemble_reader import EnsembleReader
from aleafield.archive.layout import Layout
from aleafield.archive.lock import locked
from aleafield.ensemble.forward_model import ForwardModel
from aleafield.field.noise_modes import NoiseModes
from aleafield.forward.function_model import FunctionModel
from aleafield.randomness.families import Family
from aleafield.randomness.inputs import Input
from aleafield.runs.execution import (
    Cost,
    Question,
    clear_parts,
    execute,
    is_complete,
    put_together,
    stored_ensemble,
)
from aleafield.runs.plan_file import Plan, count_probes, read_plan, with_more_samples, with_rows, write_plan
from aleafield.runs.progress import NoProgress
from aleafield.runs.statements import Asked, columns_of, statements_of
from aleafield.sampling.allocation import Allocation
from aleafield.sampling.request import SamplingMethod
from tests.archive.analytic_model import DURATION, INPUTS, MODES, AnalyticModel

ROOT = Path(__file__).resolve().parents[2]
MOMENT_TIMES = tuple(np.linspace(0.0, DURATION, 5).tolist())


NOISE_MODES = NoiseModes(MODES, 2.0, 1e-3, 1e-4)
QUANTITIES = (
    QuantityColumn("peak", "mV", "maximum", False),
    QuantityColumn("time of return", "ms", "time to level", True),
)
"""Of the analytic model."""
NO_FAMILIES: Mapping[Family, int] = MappingProxyType({})


def allocation_of(method: SamplingMethod, samples: int, repeats: int = 1) -> Allocation:
    """So many samples; 16 scramblings for quasi-Monte Carlo."""
    return Allocation(method, samples, 16 if method == "quasi-monte carlo" else 1, "", repeats)


def plan_of(model: AnalyticModel | FunctionModel, method: SamplingMethod, samples: int, width: int) -> Plan:
    """The plan of a run of the analytic model, or of a function."""
    has_field = isinstance(model, AnalyticModel)
    path = model.path(model.level)
    probes, share = count_probes(model, model.level, path, samples)
    levels = {one for part in path for one in part.levels} | {model.level}
    return Plan(
        digest="d" * 64,
        versions={"aleafield": "0"},
        level=model.level,
        time_step=0.5,
        schedule_times=(DURATION,),
        path=path,
        allocation=allocation_of(method, samples, model.repeats),
        probes=probes,
        probe_share=share,
        operations={one.label: model.operations(one) for one in levels},
        chunk_width=width,
        peak_references={},
        moment_times=MOMENT_TIMES if has_field else (),
        kept_times=(0.25, DURATION) if has_field else (),
        data_folder="inputs",
        noise=NOISE_MODES if isinstance(model, AnalyticModel) and model.noisy else None,
    )


def with_families(plan: Plan, families: Mapping[Family, int]) -> Plan:
    """The plan with so many runs of each family, decided one after the other."""
    for family, count in families.items():
        plan = with_rows(plan, family, count)
    return plan


def describe(
    model: ForwardModel, plan: Plan, cost: Cost, quantities: tuple[QuantityColumn, ...]
) -> Description:
    """The ensemble file of a model."""
    return Description(
        inputs=tuple(InputColumn(entry.path, entry.units, entry.law.text) for entry in model.inputs),
        quantities=quantities,
        samples=plan.samples,
        repeats=plan.repeats,
        replicates=plan.allocation.replicates,
        level=plan.level,
        probes=plan.probes,
        extra_levels=plan.extra_levels,
        axes=Axes(model.points(plan.level), plan.kept_times, plan.moment_times, "mm", "ms", "mV"),
        attributes={
            "title": "a model in closed form",
            "history": "made by the tests",
            "institution": "none",
            "source": "aleafield",
            "references": "none",
            "comment": "none",
            "study_digest": plan.digest,
            "versions": plan.versions,
            "seed": 7,
            "wall_time_s": cost.wall,
            "processor_time_s": cost.processor,
        },
        families=plan.families,
    )


def summarise(reader: EnsembleReader, plan: Plan, cost: Cost) -> Summary:
    """The statements of all quantities."""
    asked = Asked((0.05, 0.5), (1.0,), 0.95)
    quantities = {
        name: statements_of(columns_of(reader, plan, name), asked).as_json(reader.unit(name))
        for name in reader.quantities
    }
    return {"quantities": quantities, "cost": {"measured_s": cost.wall}}


def finish(
    layout: Layout,
    model: ForwardModel,
    plan: Plan,
    workers: int,
    quantities: tuple[QuantityColumn, ...] = QUANTITIES,
) -> int:
    """Solve what is missing and put the ensemble together; how many chunks were solved."""
    solved = 0
    if not is_complete(layout, plan):
        solved = execute(layout, model, plan, stored_ensemble(layout), workers, NoProgress())
    question = Question(lambda p, cost: describe(model, p, cost, quantities), summarise)
    put_together(layout, plan, question)
    clear_parts(layout)
    return solved


def small_run(
    folder: Path,
    samples: int = 256,
    width: int = 16,
    workers: int = 1,
    delay: float = 0.0,
    method: SamplingMethod = "quasi-monte carlo",
    parts: int = 4,
    repeats: int = 0,
    inputs: Sequence[Input] = INPUTS,
    families: Mapping[Family, int] = NO_FAMILIES,
) -> int:
    """Run, or go on with, the analytic model in a folder; how many chunks were solved."""
    layout = Layout(folder)
    model = AnalyticModel(method, delay=delay, parts=parts, repeats=repeats, inputs=inputs)
    make_folder(folder)
    with locked(layout):
        if not layout.plan.exists():
            write_plan(layout, with_families(plan_of(model, method, samples, width), families))
        return finish(layout, model, read_plan(layout), workers)


def extend(folder: Path, samples: int, inputs: Sequence[Input] = INPUTS) -> int:
    """More samples for a small run that ended: `samples` in all."""
    layout = Layout(folder)
    plan = read_plan(layout)
    method, repeats = plan.allocation.method, plan.repeats
    model = AnalyticModel(method, repeats=0 if plan.noise is None else repeats, inputs=inputs)
    if is_complete(layout, plan):
        plan = with_more_samples(plan, model, allocation_of(method, samples, repeats))
        write_plan(layout, plan)
    return finish(layout, model, plan, 1)


def as_program(
    folder: Path,
    samples: int = 256,
    width: int = 16,
    workers: int = 1,
    delay: float = 0.0,
    method: SamplingMethod = "quasi-monte carlo",
    repeats: int = 0,
    families: Mapping[Family, int] = NO_FAMILIES,
) -> subprocess.Popen[str]:
    """Start a small run in a process of its own."""
    command = [sys.executable, "-m", "tests.archive.small_runs", str(folder)]
    command += [str(samples), str(width), str(workers), str(delay), method, str(repeats)]
    command += [json.dumps(dict(families))]
    environment = {
        **os.environ,
        "PYTHONPATH": f"{ROOT / 'src'}{os.pathsep}{ROOT}",
        "OPENBLAS_NUM_THREADS": "1",
    }
    return subprocess.Popen(
        command, cwd=ROOT, env=environment, text=True, stdout=subprocess.PIPE, stderr=subprocess.PIPE
    )


def ensemble_values(folder: Path) -> dict[str, np.ndarray]:
    """All variables of an ensemble, by name, as raw arrays."""
    import netCDF4

    with netCDF4.Dataset(folder / "ensemble.nc") as dataset:
        dataset.set_auto_mask(False)
        return {name: np.array(variable[...]) for name, variable in dataset.variables.items()}


def assert_same_values(folder: Path, reference: Path) -> None:
    """Two ensembles hold the same variables with the same values, to the bit."""
    found, expected = ensemble_values(folder), ensemble_values(reference)
    assert found.keys() == expected.keys()
    for name, values in expected.items():
        assert found[name].dtype == values.dtype, name
        assert found[name].tobytes() == values.tobytes(), name
    assert (folder / "ensemble.csv").read_bytes() == (reference / "ensemble.csv").read_bytes()


if __name__ == "__main__":
    where, n, w, k, seconds, how, paths, further = sys.argv[1:]
    small_run(
        *(Path(where), int(n), int(w), int(k), float(seconds), how),  # type: ignore[arg-type]
        repeats=int(paths),
        families=json.loads(further),
    )
    print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)
