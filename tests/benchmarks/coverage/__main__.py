"""``python -m tests.benchmarks.coverage --instances 600 --noisy 600 --block 2 --out docs/coverage.md``"""

from __future__ import annotations

import argparse
import json
import math
import os
import sys
import time
from concurrent.futures import ProcessPoolExecutor
from functools import partial
from multiprocessing import get_context
from pathlib import Path

from tests.benchmarks.coverage.experiment import Row, run_instance
from tests.benchmarks.coverage.judgement import (
    LEAST_INSTANCES,
    Cell,
    controls,
    controls_of_noise,
    controls_without_field,
    parts_of_noise,
    strata,
    strata_of_noise,
)

INTRODUCTION = """\
# How often the stated interval contains the truth

Random problems with answers in closed form: random kernels, laws, projectors, meshes, quadratures, steps, methods
and sample counts, each run through the same code as `aleafield run` and judged by its summary. Made by

    {command}

on {date}, {seconds:.0f} s on {cores} cores. An instance is one problem; statistics of one problem are correlated, so a
cell counts instances: its coverage is the mean over instances of the share of statistics whose stated 95 % interval
holds the truth. The floor is the exact binomial one: a true coverage of 0.95 falls below it once in a thousand
cells. The ratio is the median of the stated total over the true error (an exact normal 95 % interval has 2.9).
Statistics that the run declares undetermined are not judged.
"""
NOISE = """\
Linear fields, whose modes are Ornstein-Uhlenbeck processes, so that every truth is that of the continuous equation.
A ring with a random kernel and a random correlation of the noise, where nothing but the noise is random; a ring with
two waves, where strength of the kernel, drive or strength of the noise are random as well, with 1, 2 or 4 noise paths
a parameter sample; an interval without a kernel, where the drive and the correlation length may be random. Steps of
Euler-Maruyama are 0.03 to 0.6 of the shortest time constant of the field. Values are normal and spectral powers
chi-square given the inputs; their laws are mixed over the inputs by quadrature.
"""
PARTS = """\
The two random waves again: Fourier modes hold them exactly, so that the law of Euler-Maruyama itself is known, and
its bias. Time part: the stated bound with `bias_noise` is at least the true bias, where that is a tenth of the stated
total or more; the ratio is bound (without `bias_noise`) over bias. Sampling: the value is no further from the
scheme's own statistic than the stated half-width, the longer one. The time part of a probability counts the samples
that cross the level when they are shifted, which few samples show coarsely: of all parts it alone leans on the
sampling interval beside it.
"""


def main() -> int:
    """Run the benchmark, write the page, return 1 when a cell is below its floor or a control passes."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--instances", type=int, default=240, help="problems without noise")
    parser.add_argument("--noisy", type=int, default=120, help="problems with noise")
    parser.add_argument("--block", type=int, default=1, help="block of seeds")
    parser.add_argument("--workers", type=int, default=os.cpu_count())
    parser.add_argument("--out", type=Path, help="page to write")
    parser.add_argument("--rows", type=Path, help="JSON file of all rows")
    arguments = parser.parse_args()
    os.environ["OPENBLAS_NUM_THREADS"] = "1"
    start = time.monotonic()
    counts = {"without noise": arguments.instances, "with noise": arguments.noisy}
    with ProcessPoolExecutor(arguments.workers, mp_context=get_context("spawn")) as pool:
        rows = {name: _rows(pool, name, arguments.block, count) for name, count in counts.items()}
    seconds = time.monotonic() - start
    if arguments.rows:
        plain = {name: [r.as_json() for r in found] for name, found in rows.items()}
        arguments.rows.write_text(json.dumps(plain), encoding="utf-8")
    still, noisy = rows.values()
    cells = [list(strata(still)), list(strata_of_noise(noisy)), list(parts_of_noise(noisy))]
    negative = [
        [*controls(still), *controls_without_field()],
        [*controls(noisy), *controls_of_noise(noisy)],
    ]
    passed = all(c.passed for found in cells for c in found) and all(
        c.coverage < c.floor for found in negative for c in found if c.instances >= LEAST_INSTANCES
    )
    command = (
        f"python -m tests.benchmarks.coverage --instances {arguments.instances} --noisy {arguments.noisy} "
        f"--block {arguments.block}"
    )
    page = INTRODUCTION.format(
        command=command, date=time.strftime("%Y-%m-%d"), seconds=seconds, cores=arguments.workers
    )
    page += "\n## Strata\n\n" + _strata(cells[0]) + "\n## Negative controls, which must fail\n\n"
    page += _controls(negative[0]) + "\n## With noise\n\n" + NOISE + "\n" + _strata(cells[1])
    page += "\n## Time step and sampling one by one\n\n" + PARTS + "\n"
    page += _table(cells[2], "floor kept", "stated / true")
    page += "\n## Negative controls with noise, which must fail\n\n" + _controls(negative[1])
    if arguments.out:
        arguments.out.write_text(page, encoding="utf-8")
    print(page)
    return 0 if passed else 1


def _rows(pool: ProcessPoolExecutor, suite: str, block: int, instances: int) -> list[Row]:
    """All rows of a suite, with the time that is left on standard error."""
    rows: list[Row] = []
    start = time.monotonic()
    for done, found in enumerate(pool.map(partial(run_instance, suite, block), range(instances)), 1):
        rows.extend(found)
        left = (time.monotonic() - start) / done * (instances - done)
        print(f"\r{suite}: {done} of {instances}, {left:.0f} s left ", end="", file=sys.stderr, flush=True)
    print(file=sys.stderr)
    return rows


def _strata(cells: list[Cell]) -> str:
    return _table(cells, "floor kept")


def _controls(cells: list[Cell]) -> str:
    return _table(cells, "passes, as it must not")


def _table(cells: list[Cell], verdict: str, ratio: str = "total / true error") -> str:
    lines = [
        f"| stratum | instances | coverage | floor | {ratio} | {verdict} |",
        "|---|---|---|---|---|---|",
    ]
    for c in cells:
        kept = "not judged" if c.instances < LEAST_INSTANCES else "yes" if c.coverage >= c.floor else "**no**"
        coverage = f"{c.coverage:.3f}" if c.instances else "-"
        median = f"{c.ratio:.2f}" if math.isfinite(c.ratio) else "-"
        lines.append(f"| {c.name} | {c.instances} | {coverage} | {c.floor:.3f} | {median} | {kept} |")
    return "\n".join(lines) + "\n"


if __name__ == "__main__":
    raise SystemExit(main())
