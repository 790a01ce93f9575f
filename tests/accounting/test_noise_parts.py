"""Noise in the tissue: the time part under Euler-Maruyama, parts of the variance, open sides, known factors.

Tests of coverage fail with probability at most 1e-3 if the true coverage is 0.95 (exact binomial).
"""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import norm

from aleafield.accounting import (
    MEAN,
    SD,
    Clusters,
    LevelValues,
    Pair,
    PartDifferences,
    QuantityStatements,
    Statement,
    exceed,
    quantile,
    quantity_statements,
    split_error,
)
from aleafield.accounting.measured import MeasuredPart
from aleafield.accounting.statistic import OCCURS, Statistic
from aleafield.estimates import Sample
from tests.accounting.noisy_mode import STEP, NoisyMode
from tests.accounting.planted import PlantedField
from tests.accounting.planted_occurrence import PlantedOccurrence
from tests.statistical.coverage import least_hits

TRIALS, LEVEL = 200, 1.3
MODES = {
    "clusters": NoisyMode(0.5, 1.5, 512, 2, 64),
    "single paths": NoisyMode(0.5, 1.5, 512, 1, 64),
    "no input": NoisyMode(1.0, 1.0, 512, 1, 64),
}
STATISTICS = ("mean", "sd", "q05", "q50", "q95", "exceed")
MEMBERS = ("parameters", "noise", "share", "total")


def flat(found: QuantityStatements) -> dict[str, Statement]:
    """Statements by the names that truths have; those that are stated."""
    assert found.variance is not None
    by_name = {"mean": found.mean, "sd": found.sd, "exceed": found.exceed[LEVEL]}
    by_name |= {f"q{round(100 * p):02d}": one for p, one in found.quantiles.items()}
    by_name |= {name: one for name in MEMBERS if (one := getattr(found.variance, name)) is not None}
    return {name: one for name, one in by_name.items() if one.interval is not None}


@pytest.fixture(scope="module")
def statements() -> dict[str, list[dict[str, Statement]]]:
    found: dict[str, list[dict[str, Statement]]] = {}
    for name, mode in MODES.items():
        generator = np.random.default_rng(71)
        found[name] = []
        for _ in range(TRIALS):
            sample, part, clusters = mode.draw(generator)
            one = quantity_statements(sample, [part], [0.05, 0.5, 0.95], [LEVEL], 0.95, clusters)
            found[name].append(flat(one))
    return found


def held(statement: Statement, truth: float) -> bool:
    assert statement.interval is not None
    low, high = statement.interval
    return low is not None and high is not None and low <= truth <= high


def test_the_problem_is_that_of_the_published_digits() -> None:
    """Problem 5.1 at dt = 0.25: the stationary variance is q / (2 kap - kap^2 dt)."""
    long = np.polynomial.polynomial.polyval(STEP, [2.0, -1.0])
    assert NoisyMode(1.0, 1.0, 1, 1, 1).truths(LEVEL, STEP)["total"] == pytest.approx(0.3 / long, rel=1e-3)


@pytest.mark.parametrize(
    ("kind", "name"),
    [(kind, name) for kind in MODES for name in STATISTICS]
    + [("clusters", name) for name in MEMBERS]
    + [("no input", name) for name in ("noise", "total")],
)
def test_intervals_hold_the_limit(
    statements: dict[str, list[dict[str, Statement]]], kind: str, name: str
) -> None:
    truth = MODES[kind].truths(LEVEL)[name]
    assert sum(held(one[name], truth) for one in statements[kind]) >= least_hits(TRIALS)


@pytest.mark.parametrize("name", ["sd", "noise"])
def test_sampling_alone_misses_the_limit(
    statements: dict[str, list[dict[str, Statement]]], name: str
) -> None:
    """Negative control: the error of the step is there, and must be allowed for."""
    truth, caught = MODES["clusters"].truths(LEVEL)[name], 0
    for one in statements["clusters"]:
        value, sampling = one[name].value, one[name].error["sampling"]
        assert value is not None
        assert sampling is not None
        caught += abs(value - truth) <= sampling
    assert caught < least_hits(TRIALS) - TRIALS / 20


@pytest.mark.parametrize("name", ["sd", "noise", "total"])
def test_the_time_part_finds_the_bias_of_the_variance(
    statements: dict[str, list[dict[str, Statement]]], name: str
) -> None:
    """Against the discrete law: held with its noise as often as stated, in size 1 to 1.7 times the bias."""
    mode = MODES["clusters"]
    bias = abs(mode.truths(LEVEL, STEP)[name] - mode.truths(LEVEL)[name])
    sizes = np.array([one[name].error["time"] for one in statements["clusters"]], dtype=float)
    noises = np.array([one[name].error["bias_noise"] for one in statements["clusters"]], dtype=float)
    assert (sizes + noises >= bias).sum() >= least_hits(TRIALS)
    assert 1.0 <= np.median(sizes) / bias <= 1.7


def test_noise_of_a_regression_is_that_of_its_mean() -> None:
    """The residuals of noisy differences average out: the noise falls with the root of the number of probes."""
    generator = np.random.default_rng(72)
    at, widths = np.array([1.0]), []
    for probes in (32, 512):
        sample, part, _ = replace(MODES["single paths"], clusters=2048, probes=probes).draw(generator)
        fits = [MeasuredPart(sample, replace(part, noisy=noisy)).fits[0] for noisy in (True, False)]
        widths.append([float(fit.half_width(0.95, 1.0)(at)[0]) for fit in fits])
    (mean_few, residual_few), (mean_many, residual_many) = widths
    # (32 / 512)^(1/2) = 1/4, and the chance of 32 probes
    assert 0.15 < mean_many / mean_few < 0.4
    assert 0.6 < residual_many / residual_few < 1.5
    assert mean_many < 0.2 * residual_many


def planted_clusters(extra: float, spread: float) -> tuple[Sample, PartDifferences, Clusters]:
    """Finer levels scale the noise by 1 + extra and the parameter by 1 + spread: V_W and V_B are planted."""
    generator = np.random.default_rng(73)
    mean = np.repeat(generator.normal(size=200), 3)
    noise = generator.normal(size=600)
    run, finer = mean + noise, (1.0 + spread) * mean + (1.0 + extra) * noise
    pair = Pair(LevelValues.of(run), LevelValues.of(finer))
    part = PartDifferences("time", np.arange(600), pair, None, known_factor=1.25, noisy=True)
    cluster = np.arange(600) // 3
    sample = Sample.of(run, replicate=cluster, replicates=200, clustered=True)
    return sample, part, Clusters(cluster, 3, True)


@pytest.mark.parametrize(("extra", "spread"), [(0.1, 0.0), (0.0, 0.1), (-0.05, 0.1)])
def test_each_part_of_the_variance_has_its_own_bias(extra: float, spread: float) -> None:
    """All samples are probes: F times the difference of the parts at the two levels, without noise."""
    sample, part, clusters = planted_clusters(extra, spread)
    found = quantity_statements(sample, [part], [], [], 0.95, clusters).variance
    assert found is not None

    def parts(values: np.ndarray) -> tuple[float, float]:
        rows = values.reshape(200, 3)
        within = rows.var(axis=1, ddof=1).mean()
        # as an influence: deviations from the mean, divided by the number of clusters
        return rows.mean(axis=1).var() - within / 3, within

    run, finer = parts(part.fine.coarser.values), parts(part.fine.finer.values)
    expected = [1.25 * abs(a - b) for a, b in zip(run, finer, strict=True)]
    # psi of V_B takes the deviations from each level's own mean; its divisor is the number of clusters
    for statement, size in zip((found.parameters, found.noise), expected, strict=True):
        assert statement is not None
        assert statement.error["time"] == pytest.approx(size, rel=1e-9, abs=1e-11)
        assert statement.error["bias_noise"] == 0.0
    change = run[0] - finer[0] + run[1] - finer[1]
    assert found.total.error["time"] == pytest.approx(1.25 * abs(change), rel=1e-9)
    assert found.share is not None
    assert found.share.value is not None
    assert found.total.value is not None
    of_share = (run[0] - finer[0] - found.share.value * change) / found.total.value
    assert found.share.error["time"] == pytest.approx(1.25 * abs(of_share), rel=1e-9)
    assert found.share.interval is not None
    assert found.share.interval[1] is not None
    assert found.share.interval[1] <= 1.0


def test_a_failed_probe_takes_its_parameter_sample_with_it() -> None:
    sample, part, clusters = planted_clusters(0.1, 0.0)
    finer = part.fine.finer.values.copy()
    finer[0] = np.nan
    valid = np.isfinite(finer)
    failed = replace(part, fine=Pair(part.fine.coarser, LevelValues.of(finer, valid=valid)))
    found = quantity_statements(sample, [failed], [], [], 0.95, clusters).variance
    assert found is not None
    rows = [level.values.reshape(200, 3)[1:] for level in (part.fine.coarser, part.fine.finer)]
    change = np.subtract(*(r.var(axis=1, ddof=1).mean() for r in rows))
    assert found.noise.error["time"] == pytest.approx(1.25 * abs(change), rel=1e-9)


def test_one_path_a_parameter_sample_parts_nothing() -> None:
    mode = NoisyMode(0.5, 1.5, 64, 1, 32)
    sample, part, clusters = mode.draw(np.random.default_rng(74))
    found = quantity_statements(sample, [part], [], [], 0.95, clusters).variance
    assert found is not None
    for name in MEMBERS:
        statement = getattr(found, name)
        assert statement.value is None
        assert statement.interval is None
        assert "noise_repeats = 1" in statement.reason


def test_without_inputs_all_variance_is_noise() -> None:
    sample, part, clusters = MODES["no input"].draw(np.random.default_rng(75))
    found = quantity_statements(sample, [part], [], [], 0.95, clusters)
    assert found.variance is not None
    shape = json.loads(json.dumps(found.as_json("mV"), allow_nan=False))["variance"]
    assert list(shape) == ["parameters", "noise", "share", "total"]
    assert shape["parameters"] is None
    assert shape["share"] is None
    assert shape["noise"] == shape["total"]
    assert found.sd.value is not None
    assert shape["noise"]["value"] == pytest.approx(found.sd.value**2, rel=1e-12)
    assert quantity_statements(sample, [part], [], [], 0.95).as_json("mV")["variance"] is None


PLANTED = PlantedField(2.0, 0.5, {"time": (1.0, np.array([0.05, 0.01, 0.0]))}, higher=0.0)
DRAWS = np.random.default_rng(76).normal(size=256)


def test_a_known_factor_needs_no_coarser_level() -> None:
    """Half of the dropped variance is dropped still at the finer level: F = 1.25 s / (s - s / 2)."""
    part = replace(PLANTED.part("time", DRAWS), name="noise_modes", coarse=None, known_factor=2.5)
    found = split_error(PLANTED.sample(DRAWS), [part], MEAN, 0.95)
    difference = (0.05 + 0.01 * DRAWS[:32].mean()) / 2
    assert found.error["noise_modes"] == pytest.approx(2.5 * difference, rel=1e-9)
    assert (found.orders["noise_modes"].observed, found.orders["noise_modes"].factor) == (None, 2.5)
    assert found.corrected is not None
    assert found.corrected.value == pytest.approx(PLANTED.values(DRAWS).mean() - 2.0 * difference, rel=1e-9)
    observed = replace(part, coarse=PLANTED.part("time", DRAWS).coarse)
    assert split_error(PLANTED.sample(DRAWS), [observed], MEAN, 0.95).error == found.error


@pytest.mark.parametrize("side", ["above", "below"])
@pytest.mark.parametrize("statistic", [MEAN, quantile(0.5), exceed(2.1)])
def test_an_open_side_has_no_bound(side: str, statistic: Statistic) -> None:
    """The other side allows for the part at order 1, F = 2.25, whatever order is seen."""
    sample, part = PLANTED.sample(DRAWS), PLANTED.part("time", DRAWS)
    closed = split_error(sample, [part], statistic, 0.95)
    assert closed.orders["time"].factor == pytest.approx(2.25)
    # a coarser difference as of order 1/2
    slow = replace(part, open_side=side, coarse=Pair(part.fine.coarser, part.fine.finer))
    found = split_error(sample, [slow], statistic, 0.95)
    assert closed.interval is not None
    assert found.interval is not None
    at = ("below", "above").index(side)
    assert found.interval[at] is None
    assert found.interval[1 - at] == pytest.approx(closed.interval[1 - at], rel=1e-12)
    assert (found.error["time"], found.error["total"]) == (None, None)
    assert found.error["sampling"] == closed.error["sampling"]
    assert found.error["bias_noise"] == pytest.approx(closed.error["bias_noise"])
    assert found.value == closed.value
    assert found.corrected is None
    assert found.orders == {}
    assert found.notes[0].startswith(f"time: no bound {side} the stated value: extremes over a window")
    shape = json.loads(json.dumps(found.as_json(), allow_nan=False))
    assert shape["interval"][at] is None
    assert shape["error"]["total"] is None


def test_spread_is_not_determined_where_a_side_is_open() -> None:
    sample, part, clusters = planted_clusters(0.1, 0.0)
    found = quantity_statements(sample, [replace(part, open_side="above")], [], [], 0.95, clusters)
    assert found.variance is not None
    for statement in (found.sd, *(getattr(found.variance, name) for name in MEMBERS)):
        assert (statement.value, statement.interval) == (None, None)
        assert statement.reason.startswith("the time part gives no bound: extremes over a window")
        assert statement.error["sampling"] is not None


def test_a_passage_is_judged_by_its_margin() -> None:
    """Its differences fall like the root of the step, since few paths jump far; the margin's fall like the step."""
    margin = np.full(64, 1.0)
    jumps = np.where(np.arange(64) % 16 == 0, 1.0, 0.0)

    def level(size: float) -> LevelValues:
        return LevelValues.of(DRAWS[:64] + np.sqrt(size) * jumps, margin + 0.1 * size)

    sample = Sample.of(DRAWS[:64] + jumps, margin=margin + 0.1)
    fine, coarse = Pair(level(1.0), level(0.5)), Pair(level(2.0), level(1.0))
    part = PartDifferences("time", np.arange(64), fine, coarse, expected_order=1.0)
    assert MeasuredPart(sample, part).order.observed == pytest.approx(0.5)
    passage = MeasuredPart(sample, replace(part, passage=True))
    assert passage.order.observed == pytest.approx(1.0)
    assert passage.conditional_order.factor == pytest.approx(2.25)


XY = np.random.default_rng(77).normal(size=(512, 2))


def test_an_occurrence_that_is_open() -> None:
    """Seen at the ends of steps only it may occur more often: what is given that it occurs has no bound."""
    planted = PlantedOccurrence(0.1, 0.1)
    sample, part = (
        planted.sample(XY),
        replace(planted.part(XY), name="time", open_side="above", open_occurrence="above"),
    )
    for statistic in (OCCURS, exceed(1.0)):
        found = split_error(sample, [part], statistic, 0.95)
        assert found.interval is not None
        assert found.interval[0] is not None
        assert found.interval[1] is None
    for statistic in (MEAN, SD, quantile(0.5)):
        assert split_error(sample, [part], statistic, 0.95).value is None


def test_an_occurrence_that_is_open_on_the_other_side() -> None:
    """The smallest value over a window of something that occurs once it does at any time."""
    planted = PlantedOccurrence(0.1, 0.1)
    part = replace(planted.part(XY), name="time", open_side="below", open_occurrence="above")
    assert split_error(planted.sample(XY), [part], exceed(1.0), 0.95).interval is None
    occurs = split_error(planted.sample(XY), [part], OCCURS, 0.95).interval
    assert occurs is not None
    assert occurs[0] is not None
    assert occurs[1] is None


def test_what_occurs_in_all_samples_cannot_be_joined_by_others() -> None:
    """Where the truth can only add occurrences and none is missing, a mean over the window is closed."""
    margin = np.full(64, 1.0)
    level = LevelValues.of(DRAWS[:64], margin)
    part = PartDifferences("time", np.arange(64), Pair(level, level), None, open_occurrence="above")
    sample = Sample.of(DRAWS[:64], margin=margin)
    found = split_error(sample, [part], MEAN, 0.95).interval
    assert found is not None
    assert None not in found
    may_cease = replace(part, open_occurrence="below")
    assert split_error(sample, [may_cease], MEAN, 0.95).interval is None


def test_normal_law_of_the_limit() -> None:
    """The truths of this module are those of a normal law where kap is known."""
    mode = MODES["no input"]
    weight, mean, variance = mode.conditional()
    truth = mode.truths(LEVEL)
    assert truth["q95"] == pytest.approx(norm.ppf(0.95, weight @ mean, np.sqrt(weight @ variance)))
