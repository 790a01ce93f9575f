"""One random problem, run and judged: is the truth inside the stated interval?"""

from __future__ import annotations

import tempfile
from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np

from tests.benchmarks.coverage.families import FAMILIES, Instance
from tests.benchmarks.coverage.truth import Truth

QUANTILES = (0.05, 0.5, 0.95)
LEVELS_AT = (0.02, 0.1, 0.5, 0.9, 0.98)
"""Exceedance levels lie at these quantiles of the truth."""
BIAS_PARTS = ("space", "quadrature", "time")


@dataclass(frozen=True)
class Row:
    """One statistic of one quantity of one instance.

    `inside` is None where the run says that the statistic is not determined.
    `bias` is the stated bound B of all discretisation parts, `sampling` the stated half-width.
    `inside_rss` tells what adding all parts, without their safety factors, in quadrature would have covered.
    """

    instance: int
    family: str
    method: str
    samples: int
    quantity: str
    statistic: str
    truth: float
    value: float | None
    inside: bool | None
    inside_rss: bool | None
    inside_sampling: bool | None
    inside_corrected: bool | None
    total: float | None
    bias: float | None
    sampling: float | None

    def as_json(self) -> dict[str, Any]:
        """Plain values."""
        return asdict(self)


def instance_of(block: int, index: int) -> tuple[Instance, str, int]:
    """Instance `index` of a block of seeds: the problem, the method, the number of samples."""
    rng = np.random.default_rng([20261201, block, index])
    method = ("monte carlo", "quasi-monte carlo")[int(rng.integers(2))]
    samples = (128, 512, 2048)[int(rng.integers(3))]
    return FAMILIES[index % len(FAMILIES)](rng), method, samples


def exceed_levels(truth: Truth) -> dict[float, float]:
    """Levels by the probability of lying below them; none at an atom, where "above" is a matter of rounding."""
    found = {p: truth.quantile(p) for p in LEVELS_AT}
    return {p: c for p, c in found.items() if list(found.values()).count(c) == 1}


def study_text(instance: Instance, method: str, samples: int, seed: int) -> str:
    """The whole study file of an instance."""
    exceed = ", ".join(
        f'"{name}" = {list(exceed_levels(truth).values())!r}' for name, truth in instance.truths.items()
    )
    return (
        f'title = "{instance.family}"\nseed = {seed}\n{instance.study}\n'
        f'[sampling]\nmethod = "{method}"\nsamples = {samples}\n'
        f"[report]\nquantiles = {list(QUANTILES)}\nexceed = {{ {exceed} }}\n"
        '[keep]\nfields = "none"\n'
    )


def run_instance(block: int, index: int) -> list[Row]:
    """Run one instance through the same code as ``aleafield run`` and judge its summary."""
    from aleafield.runs.run import run
    from aleafield.study.reading import read_text

    instance, method, samples = instance_of(block, index)
    text = study_text(instance, method, samples, seed=1 + index + 100_000 * block)
    with tempfile.TemporaryDirectory() as folder:
        summary = run(read_text(text), Path(folder) / "run", workers=1).summary
    return [
        _row(index, instance, method, samples, name, statistic, truth, stated)
        for name, exact in instance.truths.items()
        for statistic, truth, stated in _statistics(exact, summary["quantities"][name])
    ]


def _statistics(exact: Truth, stated: Mapping[str, Any]) -> Iterator[tuple[str, float, Mapping[str, Any]]]:
    yield "mean", exact.mean, stated["mean"]
    yield "sd", exact.sd, stated["sd"]
    for p in QUANTILES:
        yield f"quantile {p}", exact.quantile(p), stated["quantiles"][repr(p)]
    for p, level in exceed_levels(exact).items():
        yield f"exceed {1 - p:.2f}", exact.exceed(level), stated["exceed"][repr(level)]
    if exact.occurs < 1.0:
        yield "occurs", exact.occurs, stated["occurs"]


def _row(
    index: int,
    instance: Instance,
    method: str,
    samples: int,
    quantity: str,
    statistic: str,
    truth: float,
    stated: Mapping[str, Any],
) -> Row:
    value, interval, error = stated["value"], stated["interval"], stated["error"]
    inside = inside_rss = inside_sampling = inside_corrected = None
    bias = None
    if value is not None and interval is not None and None not in interval:
        inside = bool(interval[0] <= truth <= interval[1])
        bias = float(sum(error[part] or 0.0 for part in BIAS_PARTS))
        bare = [
            (error[p] or 0.0) / (stated.get("orders", {}).get(p, {}).get("factor") or 1.0) for p in BIAS_PARTS
        ]
        half = float(np.sqrt(sum(b**2 for b in bare) + (error["sampling"] or 0.0) ** 2))
        inside_rss = bool(abs(truth - value) <= half)
        inside_sampling = bool(abs(truth - value) <= (error["sampling"] or 0.0))
        if "corrected" in stated:
            low, high = stated["corrected"]["interval"]
            inside_corrected = bool(low <= truth <= high)
    return Row(
        index,
        instance.family,
        method,
        samples,
        quantity,
        statistic,
        truth,
        value,
        inside,
        inside_rss,
        inside_sampling,
        inside_corrected,
        error["total"],
        bias,
        error["sampling"],
    )
