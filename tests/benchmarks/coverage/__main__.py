"""``python -m tests.benchmarks.coverage --instances 240 --out docs/coverage.md``"""

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
from tests.benchmarks.coverage.judgement import LEAST_INSTANCES, Cell, controls, strata

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


def main() -> int:
    """Run the benchmark, write the page, return 1 when a cell is below its floor or a control passes."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--instances", type=int, default=240)
    parser.add_argument("--block", type=int, default=1, help="block of seeds")
    parser.add_argument("--workers", type=int, default=os.cpu_count())
    parser.add_argument("--out", type=Path, help="page to write")
    parser.add_argument("--rows", type=Path, help="JSON file of all rows")
    arguments = parser.parse_args()
    os.environ["OPENBLAS_NUM_THREADS"] = "1"
    start = time.monotonic()
    rows: list[Row] = []
    with ProcessPoolExecutor(arguments.workers, mp_context=get_context("spawn")) as pool:
        results = pool.map(partial(run_instance, arguments.block), range(arguments.instances))
        for done, found in enumerate(results, 1):
            rows.extend(found)
            elapsed = time.monotonic() - start
            left = elapsed / done * (arguments.instances - done)
            print(
                f"\r{done} of {arguments.instances}, {left:.0f} s left ", end="", file=sys.stderr, flush=True
            )
    print(file=sys.stderr)
    seconds = time.monotonic() - start
    if arguments.rows:
        arguments.rows.write_text(json.dumps([r.as_json() for r in rows]), encoding="utf-8")
    cells, negative = list(strata(rows)), list(controls(rows))
    passed = all(c.passed for c in cells) and all(
        c.coverage < c.floor for c in negative if c.instances >= LEAST_INSTANCES
    )
    command = (
        f"python -m tests.benchmarks.coverage --instances {arguments.instances} --block {arguments.block}"
    )
    page = INTRODUCTION.format(
        command=command, date=time.strftime("%Y-%m-%d"), seconds=seconds, cores=arguments.workers
    )
    page += "\n## Strata\n\n" + _table(cells, "floor kept") + "\n## Negative controls, which must fail\n\n"
    page += _table(negative, "passes, as it must not")
    if arguments.out:
        arguments.out.write_text(page, encoding="utf-8")
    print(page)
    return 0 if passed else 1


def _table(cells: list[Cell], verdict: str) -> str:
    lines = [
        f"| stratum | instances | coverage | floor | total / true error | {verdict} |",
        "|---|---|---|---|---|---|",
    ]
    for c in cells:
        kept = "not judged" if c.instances < LEAST_INSTANCES else "yes" if c.coverage >= c.floor else "**no**"
        coverage = f"{c.coverage:.3f}" if c.instances else "-"
        ratio = f"{c.ratio:.2f}" if math.isfinite(c.ratio) else "-"
        lines.append(f"| {c.name} | {c.instances} | {coverage} | {c.floor:.3f} | {ratio} | {kept} |")
    return "\n".join(lines) + "\n"


if __name__ == "__main__":
    raise SystemExit(main())
