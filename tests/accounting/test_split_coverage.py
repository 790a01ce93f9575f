"""The claim: intervals hold the truth at least as often as stated, and parts are what was planted.

Each coverage test fails with probability at most 1e-3 if the true coverage is 0.95 (exact binomial).  The
negative controls, a root-sum-square of all parts and sampling alone, must fail.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import pytest

from aleafield.accounting import Statement, quantity_statements
from tests.accounting.planted import random_field, truths
from tests.accounting.planted_occurrence import PlantedOccurrence, occurrence_truths
from tests.statistical.coverage import least_hits, normal_scramblings

TRIALS = 300
LEVEL = 1.5
PARTS = ("space", "quadrature", "time")


@dataclass
class Record:
    """Statements with their truths, by statistic."""

    found: dict[str, list[tuple[Statement, float]]] = field(default_factory=dict)

    def add(self, statistic: str, statement: Statement, truth: float) -> None:
        if statement.interval is not None:
            self.found.setdefault(statistic, []).append((statement, truth))

    def hits(self, statistic: str) -> tuple[int, int]:
        """Intervals that hold the truth, and intervals."""
        held = 0
        for statement, truth in self.found[statistic]:
            assert statement.interval is not None
            low, high = statement.interval
            assert low is not None
            assert high is not None
            held += low <= truth <= high
        return held, len(self.found[statistic])

    def errors(self, statistic: str) -> np.ndarray:
        """|value - truth| of each statement."""
        return np.array([abs((s.value or 0.0) - truth) for s, truth in self.found[statistic]])

    def members(self, statistic: str, keys: tuple[str, ...]) -> np.ndarray:
        """Members of the error, (statements, keys), null as 0."""
        return np.array([[s.error[key] or 0.0 for key in keys] for s, _ in self.found[statistic]])


def always(relative_bias: float, samples: int, scrambled: bool, seed: int) -> Record:
    """Random fields with three planted parts."""
    generator = np.random.default_rng(seed)
    draws = (
        normal_scramblings(TRIALS, samples // 16, 1, seed)[:, :, 0]
        if scrambled
        else generator.normal(size=(TRIALS, samples))
    )
    record = Record()
    for z in draws:
        planted = random_field(generator, relative_bias)
        level = planted.mean + 1.2 * planted.sd * float(generator.normal())
        found = quantity_statements(
            planted.sample(z, 16 if scrambled else 1), planted.parts(z), [0.05, 0.5, 0.95], [level], 0.95
        )
        truth = truths(planted, level)
        record.add("mean", found.mean, truth["mean"])
        assert found.mean.corrected is None or found.mean.corrected.interval is not None
        if found.mean.corrected is not None:
            record.add("corrected", found.mean.corrected, truth["mean"])
        record.add("sd", found.sd, truth["sd"])
        for p, name in ((0.05, "q05"), (0.5, "q50"), (0.95, "q95")):
            record.add(name, found.quantiles[p], truth[name])
        record.add("exceed", found.exceed[level], truth["exceed"])
    return record


def sometimes(size: float, samples: int, seed: int) -> Record:
    """Quantities that may not occur, planted errors in value and margin, 16 scramblings."""
    generator = np.random.default_rng(seed)
    truth, record = occurrence_truths(LEVEL), Record()
    for xy in normal_scramblings(TRIALS, samples // 16, 2, seed):
        planted = PlantedOccurrence(*(size * generator.normal(size=2)))
        found = quantity_statements(planted.sample(xy, 16), [planted.part(xy)], [0.5], [LEVEL], 0.95)
        assert found.occurs is not None
        record.add("mean", found.mean, truth["mean"])
        if found.mean.corrected is not None:
            record.add("corrected", found.mean.corrected, truth["mean"])
        record.add("sd", found.sd, truth["sd"])
        record.add("q50", found.quantiles[0.5], truth["q50"])
        record.add("exceed", found.exceed[LEVEL], truth["exceed"])
        record.add("occurs", found.occurs, truth["occurs"])
    return record


@pytest.fixture(scope="module")
def records() -> dict[str, Record]:
    """Sampling dominant, balanced, bias dominant, and a quantity that may not occur."""
    return {
        "sampling": always(0.02, 128, False, 31),
        "balanced": always(0.05, 512, True, 32),
        "bias": always(0.2, 512, True, 33),
        "may not occur": sometimes(0.1, 512, 34),
        "may not occur, bias": sometimes(0.4, 512, 35),
    }


@pytest.mark.parametrize("statistic", ["mean", "corrected", "sd", "q05", "q50", "q95", "exceed"])
@pytest.mark.parametrize("stratum", ["sampling", "balanced", "bias"])
def test_intervals_hold_the_truth(records: dict[str, Record], stratum: str, statistic: str) -> None:
    held, of = records[stratum].hits(statistic)
    assert of >= TRIALS * 0.9
    assert held >= least_hits(of)


@pytest.mark.parametrize("statistic", ["mean", "corrected", "sd", "q50", "exceed", "occurs"])
@pytest.mark.parametrize("stratum", ["may not occur", "may not occur, bias"])
def test_intervals_hold_the_truth_of_what_may_not_occur(
    records: dict[str, Record], stratum: str, statistic: str
) -> None:
    held, of = records[stratum].hits(statistic)
    assert of >= TRIALS * 0.9
    assert held >= least_hits(of)


@pytest.mark.parametrize("statistic", ["mean", "sd", "q50", "exceed"])
def test_root_sum_square_fails(records: dict[str, Record], statistic: str) -> None:
    """Negative control: biases added like independent noise."""
    record = records["bias"]
    members = record.members(statistic, (*PARTS, "bias_noise", "sampling"))
    held = int((record.errors(statistic) <= np.sqrt((members**2).sum(axis=1))).sum())
    assert held < least_hits(len(members))


@pytest.mark.parametrize("stratum", ["balanced", "bias"])
def test_sampling_alone_fails(records: dict[str, Record], stratum: str) -> None:
    """Negative control: an interval that knows nothing of the discretisation."""
    record = records[stratum]
    sampling = record.members("mean", ("sampling",))[:, 0]
    assert int((record.errors("mean") <= sampling).sum()) < least_hits(TRIALS) / 2


def test_parts_bound_the_planted_biases_and_are_not_wide() -> None:
    """Each part of the mean against the planted one: held as often as stated, median at most 1.7 times."""
    generator = np.random.default_rng(36)
    held = dict.fromkeys(PARTS, 0)
    ratio: dict[str, list[float]] = {name: [] for name in PARTS}
    for z in normal_scramblings(TRIALS, 32, 1, 36)[:, :, 0]:
        planted = random_field(generator, 0.1)
        mean = quantity_statements(planted.sample(z, 16), planted.parts(z), [], [], 0.95).mean
        for name in PARTS:
            one, _, square = planted.errors[name][1]
            truth = abs((one + square) * (1.0 + planted.higher))
            size, noise = mean.error[name], mean.error["bias_noise"]
            assert size is not None
            assert noise is not None
            held[name] += truth <= size + noise
            ratio[name].append(size / truth)
    for name in PARTS:
        assert held[name] >= least_hits(TRIALS)
        assert 1.0 <= np.median(ratio[name]) <= 1.7


def test_sharp_where_sampling_dominates(records: dict[str, Record]) -> None:
    """An exact 95 % normal interval has a median total over error of 1.96 / 0.674 = 2.9."""
    record = records["sampling"]
    ratio = np.median(record.members("mean", ("total",))[:, 0] / record.errors("mean"))
    assert 2.5 <= ratio <= 4.0
