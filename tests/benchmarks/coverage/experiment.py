"""One random problem, run and judged: is the truth inside the stated interval?"""

from __future__ import annotations

import tempfile
from collections.abc import Callable, Iterator, Mapping
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np

from tests.benchmarks.coverage import dishonest
from tests.benchmarks.coverage.families import FAMILIES, Instance
from tests.benchmarks.coverage.noisy_families import NOISY_FAMILIES
from tests.benchmarks.coverage.truth import Known

QUANTILES = (0.05, 0.5, 0.95)
LEVELS_AT = (0.02, 0.1, 0.5, 0.9, 0.98)
"""Exceedance levels lie at these quantiles of the truth."""


@dataclass(frozen=True)
class Suite:
    """Families that are drawn in turn, with seeds of their own."""

    families: tuple[Callable[[np.random.Generator], Instance], ...]
    entropy: int
    first_seed: int


SUITES = {
    "without noise": Suite(FAMILIES, 20261201, 1),
    "with noise": Suite(NOISY_FAMILIES, 20261202, 50_001),
}


@dataclass(frozen=True)
class Row:
    """One statistic of one quantity of one instance.

    `inside` is None where the run says that the statistic is not determined.
    `parts` are the stated bounds of the discretisation parts, `bias_noise` and `sampling` the stated half-widths.
    `stepped` is the statistic of the scheme itself, at the run's steps, where it is known.
    `share` is the true share of the parameters in the variance; None where nothing is parted.
    `dishonest` tells by name how often intervals of that kind hold what they should.
    """

    instance: int
    family: str
    method: str
    samples: int
    repeats: int
    quantity: str
    statistic: str
    truth: float
    stepped: float | None
    value: float | None
    inside: bool | None
    inside_corrected: bool | None
    total: float | None
    parts: Mapping[str, float]
    bias_noise: float | None
    sampling: float | None
    share: float | None
    dishonest: Mapping[str, float]

    @property
    def bias(self) -> float:
        """The stated bound B of all discretisation parts."""
        return sum(self.parts.values())

    def as_json(self) -> dict[str, Any]:
        """Plain values."""
        return asdict(self)


def instance_of(suite: Suite, block: int, index: int) -> tuple[Instance, str, int]:
    """Instance `index` of a block of seeds: the problem, the method, the number of samples."""
    rng = np.random.default_rng([suite.entropy, block, index])
    method = ("monte carlo", "quasi-monte carlo")[int(rng.integers(2))]
    samples = (128, 512, 2048)[int(rng.integers(3))]
    instance = suite.families[index % len(suite.families)](rng)
    return instance, method if instance.inputs else "monte carlo", samples


def exceed_levels(truth: Known) -> dict[float, float]:
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
        f'[sampling]\nmethod = "{method}"\nsamples = {samples}\nnoise_repeats = {instance.repeats}\n'
        f"[report]\nquantiles = {list(QUANTILES)}\nexceed = {{ {exceed} }}\n"
        '[keep]\nfields = "none"\n'
    )


def run_instance(name: str, block: int, index: int) -> list[Row]:
    """Run one instance of a suite through the same code as ``aleafield run`` and judge its summary."""
    from aleafield.archive.ensemble_reader import reading
    from aleafield.runs.run import run
    from aleafield.study.reading import read_text

    suite = SUITES[name]
    instance, method, samples = instance_of(suite, block, index)
    text = study_text(instance, method, samples, seed=suite.first_seed + index + 100_000 * block)
    with tempfile.TemporaryDirectory() as folder:
        summary = run(read_text(text), Path(folder) / "run", workers=1).summary
        with reading(Path(folder) / "run" / "ensemble.nc") as reader:
            values = {quantity: reader.values(quantity) for quantity in instance.truths}
    repeated = method == "monte carlo" and instance.repeats > 1
    rows = []
    for quantity, exact in instance.truths.items():
        found = summary["quantities"][quantity]
        levels = exceed_levels(exact)
        own: dict[str, float] = {}
        if instance.stepped is not None:
            own = {name: known for name, known, _ in _statistics(instance.stepped[quantity], levels, found)}
        for statistic, truth, stated in _statistics(exact, levels, found):
            row = _row(statistic, truth, stated)
            naive: dict[str, float] = {}
            if row["inside"] is not None:
                naive = {name: _holds(i, truth) for name, i in dishonest.of_statistic(stated).items()}
            if repeated and statistic == "mean" and own:
                naive["realizations as if independent"] = dishonest.held_as_independent(
                    values[quantity], instance.repeats, own["mean"]
                )
            if repeated and statistic == "variance parameters" and own:
                interval = dishonest.without_noise_taken_off(found, samples, instance.repeats)
                naive["parameter part without the noise taken off"] = _holds(interval, own[statistic])
            rows.append(
                Row(
                    instance=index,
                    family=instance.family,
                    method=method,
                    samples=samples,
                    repeats=instance.repeats,
                    quantity=quantity,
                    stepped=own.get(statistic),
                    share=exact.variance.get("share"),
                    dishonest=naive,
                    **row,
                )
            )
    return rows


def _holds(interval: tuple[float, float], truth: float) -> bool:
    return bool(interval[0] <= truth <= interval[1])


def _statistics(
    exact: Known, levels: Mapping[float, float], stated: Mapping[str, Any]
) -> Iterator[tuple[str, float, Mapping[str, Any]]]:
    """Name, known value and statement of each statistic; levels by the probability of lying below them."""
    yield "mean", exact.mean, stated["mean"]
    yield "sd", exact.sd, stated["sd"]
    for p in QUANTILES:
        yield f"quantile {p}", exact.quantile(p), stated["quantiles"][repr(p)]
    for p, level in levels.items():
        yield f"exceed {1 - p:.2f}", exact.exceed(level), stated["exceed"][repr(level)]
    if exact.occurs < 1.0:
        yield "occurs", exact.occurs, stated["occurs"]
    for member, truth in exact.variance.items():
        yield f"variance {member}", truth, stated["variance"][member]


def _row(statistic: str, truth: float, stated: Mapping[str, Any]) -> dict[str, Any]:
    """What a row says of the statement itself."""
    interval, error = stated["interval"], stated["error"]
    determined = stated["value"] is not None and interval is not None and None not in interval
    corrected = stated["corrected"]["interval"] if determined and "corrected" in stated else None
    return {
        "statistic": statistic,
        "truth": truth,
        "value": stated["value"],
        "inside": bool(interval[0] <= truth <= interval[1]) if determined else None,
        "inside_corrected": bool(corrected[0] <= truth <= corrected[1]) if corrected else None,
        "total": error["total"],
        "parts": dishonest.parts(stated),
        "bias_noise": error["bias_noise"],
        "sampling": error["sampling"],
    }
