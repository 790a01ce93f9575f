"""The parting of the variance against loops, published formulas and problem 5.7.

Each test of coverage fails with probability at most 1e-3 if the true coverage is 0.95.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import chi2, f

from aleafield.estimates import Estimate, Sample, VarianceParts, estimate_sd, estimate_variance_parts
from tests.statistical import noisy_mode
from tests.statistical.coverage import least_hits
from tests.statistical.noisy_mode import PARTS, Design

TRIALS = 300
MEMBERS = ("parameters", "noise", "share", "total")
DESIGNS = [
    Design(*size, noise, scrambled)
    for size, scrambled in (
        ((64, 4), False),
        ((128, 2), False),
        ((512, 2), False),
        ((128, 2), True),
        ((512, 2), True),
    )
    for noise in noisy_mode.NOISES
]


def parted(design: Design, sample: Sample) -> VarianceParts:
    return estimate_variance_parts(sample, design.cluster, design.repeats, 0.95)


def holds(estimate: Estimate, truth: float) -> bool:
    return estimate.low is not None and estimate.high is not None and estimate.low <= truth <= estimate.high


def covered(design: Design, truths: dict[str, float], samples: list[Sample]) -> dict[str, int]:
    """How many intervals of each member hold its truth."""
    found = [parted(design, sample) for sample in samples]
    return {name: sum(holds(getattr(one, name), truths[name]) for one in found) for name in MEMBERS}


def test_truths_are_those_of_the_problem() -> None:
    """The published digits of problem 5.7."""
    assert pytest.approx(0.8788898309345, abs=1e-12) == noisy_mode.MEAN
    assert pytest.approx(0.08088599841328, abs=1e-12) == PARTS["parameters"]
    assert pytest.approx(0.1647918433002, abs=1e-12) == PARTS["noise"]
    assert pytest.approx(0.3292360346751, abs=1e-12) == PARTS["share"]


@pytest.mark.parametrize("design", DESIGNS, ids=str)
def test_intervals_cover(design: Design) -> None:
    found = covered(design, PARTS, design.samples(TRIALS, seed=61))
    assert min(found.values()) >= least_hits(TRIALS), found


@pytest.mark.parametrize("scrambled", [False, True])
def test_intervals_cover_without_a_parameter_part(scrambled: bool) -> None:
    design = Design(128, 2, scrambled=scrambled)
    rows = np.random.default_rng(62).normal(size=(TRIALS, 256))
    truths = {"parameters": 0.0, "noise": 1.0, "share": 0.0, "total": 1.0}
    found = covered(design, truths, [design.sample(row) for row in rows])
    assert min(found.values()) >= least_hits(TRIALS), found


@pytest.mark.parametrize("scrambled", [False, True])
def test_intervals_cover_given_that_it_occurs(scrambled: bool) -> None:
    """It occurs with probability 3/4, independently of all else: every truth is as without."""
    design = Design(256, 3, scrambled=scrambled)
    margins = np.random.default_rng(63).uniform(-1.0, 3.0, size=(TRIALS, 768))
    values = np.where(margins >= 0.0, design.values(TRIALS, 64), np.nan)
    samples = [design.sample(row, margin=margin) for row, margin in zip(values, margins, strict=True)]
    found = covered(design, PARTS, samples)
    assert min(found.values()) >= least_hits(TRIALS), found


def test_naive_parts_fail() -> None:
    """Negative controls: the variance of cluster means as parameter part, chi-square for skew noise."""
    design = Design(128, 2, "skew")
    rows = design.values(TRIALS, 61).reshape(TRIALS, 128, 2)
    means, noise = rows.mean(axis=2).var(axis=1, ddof=1), rows.var(axis=2, ddof=1).mean(axis=1)
    low, high = (127 * means / chi2.ppf(tail, 127) for tail in (0.975, 0.025))
    assert ((low <= noisy_mode.PARAMETERS) & (high >= noisy_mode.PARAMETERS)).sum() < least_hits(TRIALS) / 2
    low, high = (128 * noise / chi2.ppf(tail, 128) for tail in (0.975, 0.025))
    assert ((low <= noisy_mode.NOISE) & (high >= noisy_mode.NOISE)).sum() < least_hits(TRIALS)


def test_balanced_analysis_of_variance() -> None:
    """Values against the table of the one-way layout; their sum is the square of the sd."""
    design = Design(80, 3)
    sample = design.samples(1, 65)[0]
    rows = sample.values.reshape(80, 3)
    found = parted(design, sample)
    noise = sum(((row - row.mean()) ** 2).sum() for row in rows) / (80 * 2)
    between = 3 * sum((row.mean() - rows.mean()) ** 2 for row in rows) / 79
    assert found.noise.value == pytest.approx(noise, rel=1e-12)
    assert found.parameters.value == pytest.approx((between - noise) / 3, rel=1e-12)
    assert found.total.value == pytest.approx((between - noise) / 3 + noise, rel=1e-12)
    sd = estimate_sd(sample, 0.95).value
    assert sd is not None
    assert found.total.value == pytest.approx(sd**2, rel=1e-12)
    assert found.share.value == pytest.approx((between - noise) / (between + 2 * noise), rel=1e-12)
    assert found.notes == ()


def test_williams_interval() -> None:
    """Uniform noise and means have light tails: the degrees of freedom are those of the table."""
    generator = np.random.default_rng(66)
    rows = generator.uniform(size=(100, 1)) + generator.uniform(size=(100, 4))
    design = Design(100, 4)
    found = parted(design, design.sample(rows.ravel()))
    within, between = rows.var(axis=1, ddof=1).mean(), 4 * rows.mean(axis=1).var(ddof=1)
    ratio = between / within
    tails = {tail: f.ppf(tail, 99, 300) for tail in (0.025, 0.975)}
    ends = [99 * between * (1 - tails[tail] / ratio) / chi2.ppf(tail, 99) / 4 for tail in (0.975, 0.025)]
    assert (found.parameters.low, found.parameters.high) == pytest.approx(ends, rel=1e-9)
    theta = np.array([(ratio / tails[tail] - 1) / 4 for tail in (0.975, 0.025)])
    assert (found.share.low, found.share.high) == pytest.approx(theta / (1 + theta), rel=1e-9)


def test_a_negative_part_stands_as_zero() -> None:
    """Cluster means that agree better than their noise lets them: an upper limit as if F were 1."""
    noise = np.random.default_rng(67).normal(size=100)
    design = Design(100, 2)
    found = parted(design, design.sample(np.column_stack([noise, -noise]).ravel()))
    assert (found.parameters.value, found.parameters.low) == (0.0, 0.0)
    assert (found.share.value, found.share.low) == (0.0, 0.0)
    assert found.parameters.high is not None
    assert found.noise.value is not None
    assert 0.1 * found.noise.value < found.parameters.high < found.noise.value
    assert found.notes == ("the parameter part is estimated below 0 and stands as 0",)


def test_no_noise_at_all() -> None:
    once = np.random.default_rng(68).normal(size=100)
    for scrambled in (False, True):
        design = Design(96, 2, scrambled=scrambled)
        found = parted(design, design.sample(np.repeat(once[:96], 2)))
        assert found.noise == Estimate(0.0, 0.0, 0.0)
        assert found.share == Estimate(1.0, 1.0, 1.0)
        assert found.parameters.value == pytest.approx(found.total.value)
        assert found.parameters.low is not None
        assert found.parameters.low > 0.3


def test_failed_clusters_are_left_out_whole() -> None:
    """As if the two parameter samples had not been drawn."""
    design, fewer = Design(100, 3), Design(98, 3)
    values = design.values(1, 69)[0]
    valid = np.ones(300, dtype=bool)
    valid[[5, 60, 61]] = False
    found = parted(design, design.sample(np.where(valid, values, np.nan), valid=valid))
    kept = ~np.isin(design.cluster, [1, 20])
    expected = parted(fewer, fewer.sample(values[kept]))
    for name in MEMBERS:
        one, other = getattr(found, name), getattr(expected, name)
        assert (one.value, one.low, one.high) == pytest.approx((other.value, other.low, other.high), rel=1e-9)
    assert found.notes == (
        "2 parameter samples with failed realizations are left out with all their repeats",
    )


def test_weights_where_it_does_not_always_occur() -> None:
    """The noise part and its jackknife over clusters, as loops."""
    design = Design(90, 3)
    values, margin = design.values(1, 70)[0], np.random.default_rng(71).normal(1.0, 1.0, 270)
    found = parted(design, design.sample(np.where(margin >= 0, values, np.nan), margin=margin))
    rows = [row[held] for row, held in zip(values.reshape(90, 3), margin.reshape(90, 3) >= 0, strict=True)]

    def noise_part(clusters: list[np.ndarray]) -> float:
        held = [row for row in clusters if len(row) >= 2]
        return float(sum(len(r) * r.var(ddof=1) for r in held) / sum(len(r) for r in held))

    assert found.noise.value == pytest.approx(noise_part(rows), rel=1e-12)
    rows = [row for row in rows if len(row)]
    logs = np.log([noise_part(rows[:k] + rows[k + 1 :]) for k in range(len(rows))])
    error = np.sqrt((len(rows) - 1) / len(rows) * ((logs - logs.mean()) ** 2).sum())
    from scipy.stats import t

    low = noise_part(rows) * np.exp(-t.ppf(0.975, len(rows) - 1) * error)
    assert found.noise.low == pytest.approx(low, rel=1e-9)
    assert found.total.value is not None
    assert found.parameters.value == pytest.approx(found.total.value - noise_part(rows), rel=1e-9)
    assert any("weighted by how often it occurs" in note for note in found.notes)


def test_too_little_is_refused() -> None:
    few = Design(63, 4)
    found = parted(few, few.samples(1, 72)[0])
    for name in MEMBERS:
        reason = getattr(found, name).reason
        assert reason is not None
        assert reason.startswith("not determined by 63 samples: parting the variance needs 64")
    flat = Design(64, 2)
    assert parted(flat, flat.sample(np.full(128, 0.1))).share.value is None
    failed = flat.sample(np.full(128, np.nan), valid=np.zeros(128, dtype=bool))
    assert parted(flat, failed).noise.reason == "not determined: all samples failed"
