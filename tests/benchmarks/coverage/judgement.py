"""Strata, binomial floors and negative controls of a coverage run."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from scipy import stats

from tests.benchmarks.coverage.experiment import Row

STATED = 0.95
FALSE_ALARM = 1e-3
"""One-sided, per cell: a true coverage of 0.95 falls below the floor with this probability."""
TRIALS = 400
"""Trials of the controls that need no field."""
LEAST_INSTANCES = 20
"""Cells of fewer instances are not judged."""


@dataclass(frozen=True)
class Cell:
    """Coverage and sharpness of one stratum.

    Attributes
    ----------
    name : str
    instances : int
        Number of independent problems in the stratum (rows of one problem are correlated).
    coverage : float
        Mean over instances of the share of its rows that contain the truth.
    floor : float
        Exact binomial floor for that many instances.
    ratio : float
        Median of stated total over true error.
    """

    name: str
    instances: int
    coverage: float
    floor: float
    ratio: float

    @property
    def passed(self) -> bool:
        """Whether the coverage is not below the floor."""
        return self.instances < LEAST_INSTANCES or self.coverage >= self.floor


def floor(instances: int) -> float:
    """Share of hits below which a true coverage of 0.95 falls with probability 0.001 (exact binomial)."""
    return float(stats.binom.ppf(FALSE_ALARM, instances, STATED)) / instances


def dominance(row: Row) -> str:
    """Which of the two dominates the stated error."""
    if not row.sampling or row.bias is None:
        return "bias"
    ratio = row.bias / row.sampling
    return "sampling" if ratio < 1 / 3 else "bias" if ratio > 3 else "both"


def cell(name: str, rows: Sequence[Row], hit: Callable[[Row], bool | None] = lambda r: r.inside) -> Cell:
    """Coverage over instances of the rows that are determined."""
    judged = [(r.instance, hit(r)) for r in rows if hit(r) is not None]
    instances = sorted({i for i, _ in judged})
    if not instances:
        return Cell(name, 0, np.nan, 0.0, np.nan)
    shares = {i: [] for i in instances}  # type: dict[int, list[bool]]
    for i, inside in judged:
        shares[i].append(bool(inside))
    coverage = float(np.mean([np.mean(v) for v in shares.values()]))
    ratios = [
        r.total / abs(r.value - r.truth)
        for r in rows
        if r.inside is not None and r.total is not None and r.value is not None and r.value != r.truth
    ]
    return Cell(
        name, len(instances), coverage, floor(len(instances)), float(np.median(ratios)) if ratios else np.nan
    )


def group(row: Row) -> str:
    """Statistic without its level."""
    return row.statistic.split()[0]


def strata(rows: Sequence[Row]) -> Iterator[Cell]:
    """All cells that are judged: by statistic, method, dominance, family and their pairs."""
    yield cell("all", rows)
    keys: dict[str, Callable[[Row], str]] = {
        "statistic": group,
        "method": lambda r: r.method,
        "samples": lambda r: str(r.samples),
        "dominated by": dominance,
        "family": lambda r: r.family,
    }
    for label, key in keys.items():
        for value in sorted({key(r) for r in rows}):
            yield cell(f"{label}: {value}", [r for r in rows if key(r) == value])
    for statistic in sorted({group(r) for r in rows}):
        for method in sorted({r.method for r in rows}):
            chosen = [r for r in rows if group(r) == statistic and r.method == method]
            yield cell(f"{statistic}, {method}", chosen)
        for side in ("sampling", "both", "bias"):
            chosen = [r for r in rows if group(r) == statistic and dominance(r) == side]
            yield cell(f"{statistic}, dominated by {side}", chosen)


def controls(rows: Sequence[Row]) -> Iterator[Cell]:
    """Intervals that are known to be dishonest; a benchmark that passes one of them is too easy."""
    biased = [r for r in rows if dominance(r) != "sampling"]
    yield cell("sampling alone", biased, lambda r: r.inside_sampling)
    yield cell("all parts in quadrature, no factors", biased, lambda r: r.inside_rss)
    yield simulated("normal interval of a probability of 0.02, 64 samples", wald)
    yield simulated("normal interval over 4 scramblings", four_scramblings)


def simulated(name: str, holds: Callable[[np.random.Generator], bool]) -> Cell:
    """A cell of independent trials that need no field."""
    hits = [holds(np.random.default_rng([9, trial])) for trial in range(TRIALS)]
    return Cell(name, TRIALS, float(np.mean(hits)), floor(TRIALS), np.nan)


def wald(rng: np.random.Generator) -> bool:
    """Whether P +- z sqrt(P (1 - P) / S) holds a probability of 0.02."""
    share = rng.binomial(64, 0.02) / 64
    return bool(abs(share - 0.02) <= 1.96 * np.sqrt(share * (1 - share) / 64))


def four_scramblings(rng: np.random.Generator) -> bool:
    """Whether the mean of 4 scramblings of 64 points +- z s / 2 holds the integral of exp(x) (1 + y)."""
    points = [stats.qmc.Sobol(2, scramble=True, rng=rng).random(64) for _ in range(4)]
    means = np.array([np.mean(np.exp(p[:, 0]) * (1 + p[:, 1])) for p in points])
    return bool(abs(means.mean() - 1.5 * (np.e - 1)) <= 1.96 * means.std(ddof=1) / 2)
