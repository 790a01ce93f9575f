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
SHARES = (("below 0.1", 0.0, 0.1), ("0.1 to 0.5", 0.1, 0.5), ("above 0.5", 0.5, 1.0))
SHARED = 0.5
"""Repeats are far from independent where the parameters have more of the variance than this."""
LEAST_BIAS = 0.1
"""Share of the stated total below which a part only counts within the total."""


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
    if not row.sampling:
        return "bias"
    ratio = row.bias / row.sampling
    return "sampling" if ratio < 1 / 3 else "bias" if ratio > 3 else "both"


def total_over_error(row: Row) -> float | None:
    """Stated total over true error."""
    if row.inside is None or row.total is None or row.value is None or row.value == row.truth:
        return None
    return row.total / abs(row.value - row.truth)


def cell(
    name: str,
    rows: Sequence[Row],
    hit: Callable[[Row], float | None] = lambda r: r.inside,
    ratio: Callable[[Row], float | None] = total_over_error,
) -> Cell:
    """Coverage over instances of the rows that are determined; `hit` tells whether, or how often, one holds."""
    shares: dict[int, list[float]] = {}
    for row in rows:
        if (held := hit(row)) is not None:
            shares.setdefault(row.instance, []).append(float(held))
    if not shares:
        return Cell(name, 0, np.nan, 0.0, np.nan)
    coverage = float(np.mean([np.mean(v) for v in shares.values()]))
    ratios = [found for r in rows if (found := ratio(r)) is not None]
    number = len(shares)
    return Cell(name, number, coverage, floor(number), float(np.median(ratios)) if ratios else np.nan)


def group(row: Row) -> str:
    """Statistic without its level."""
    return " ".join(word for word in row.statistic.split() if word.isalpha())


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
    yield cell("mean, corrected", rows, lambda r: r.inside_corrected, ratio=lambda _: None)


def strata_of_noise(rows: Sequence[Row]) -> Iterator[Cell]:
    """The cells of `strata`, and those by noise paths and by the true share of the parameters in the variance."""
    yield from strata(rows)
    for repeats in sorted({r.repeats for r in rows}):
        yield cell(f"noise repeats: {repeats}", [r for r in rows if r.repeats == repeats])
    parted = [r for r in rows if group(r).startswith("variance") and r.share is not None]
    for statistic in sorted({group(r) for r in parted}):
        for label, low, high in SHARES:
            chosen = [r for r in parted if group(r) == statistic and low <= (r.share or 0.0) < high]
            yield cell(f"{statistic}, share of the parameters {label}", chosen)


def parts_of_noise(rows: Sequence[Row]) -> Iterator[Cell]:
    """Bias and sampling one by one, where the law of Euler-Maruyama itself is known and space is exact.

    The time part with its noise against the true bias, where that is a tenth of the stated total or more; the stated
    sampling half-width against the distance of the value from the statistic of the scheme.
    """
    known = [r for r in rows if r.stepped is not None and r.inside is not None]
    seen = [r for r in known if abs(true_bias(r)) > LEAST_BIAS * (r.total or 0.0)]
    for statistic in sorted({group(r) for r in known}):
        chosen = [r for r in seen if group(r) == statistic]
        yield cell(
            f"time part, {statistic}",
            chosen,
            lambda r: abs(true_bias(r)) <= r.parts["time"] + (r.bias_noise or 0.0),
            lambda r: r.parts["time"] / abs(true_bias(r)),
        )
    for statistic in sorted({group(r) for r in known}):
        chosen = [r for r in known if group(r) == statistic]
        yield cell(
            f"sampling, {statistic}",
            chosen,
            lambda r: scatter(r) <= (r.sampling or 0.0),
            lambda r: (r.sampling or 0.0) / scatter(r) if scatter(r) else None,
        )


def true_bias(row: Row) -> float:
    """Statistic of the scheme less the truth."""
    assert row.stepped is not None
    return row.stepped - row.truth


def scatter(row: Row) -> float:
    """Distance of the run's value from the statistic of the scheme."""
    assert row.stepped is not None
    assert row.value is not None
    return abs(row.value - row.stepped)


def controls(rows: Sequence[Row]) -> Iterator[Cell]:
    """Intervals that are known to be dishonest; a benchmark that passes one of them is too easy."""
    biased = [r for r in rows if dominance(r) != "sampling"]
    for name in ("sampling alone", "all parts in quadrature, no factors"):
        yield cell(name, biased, dishonest(name))


def controls_without_field() -> Iterator[Cell]:
    """Dishonest intervals of estimators alone."""
    yield simulated("normal interval of a probability of 0.02, 64 samples", wald)
    yield simulated("normal interval over 4 scramblings", four_scramblings)


def controls_of_noise(rows: Sequence[Row]) -> Iterator[Cell]:
    """Dishonest intervals of noisy fields, where what they leave out matters."""
    coarse = [r for r in rows if r.sampling and r.parts["time"] > r.sampling]
    shared = [r for r in rows if r.share is not None and r.share > SHARED]
    for name, chosen in (
        ("time part left out", coarse),
        ("realizations as if independent", shared),
        ("parameter part without the noise taken off", rows),
    ):
        yield cell(name, chosen, dishonest(name))


def dishonest(name: str) -> Callable[[Row], float | None]:
    """How often the interval of that name holds; None where there is none."""
    return lambda row: row.dishonest.get(name)


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
