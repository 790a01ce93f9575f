"""Parts, noises and totals of one statement against sums written out here."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import t as student_t
from scipy.stats import ttest_1samp

from aleafield.accounting import (
    MEAN,
    OCCURS,
    SD,
    LevelValues,
    Pair,
    PartDifferences,
    Statement,
    Statistic,
    exceed,
    quantile,
    quantity_statements,
    split_error,
)
from aleafield.estimates import Sample, estimate_exceedance, estimate_mean
from tests.accounting.planted import PlantedField
from tests.accounting.planted_occurrence import PlantedOccurrence

PLANTED = PlantedField(
    3.0,
    0.5,
    {
        "space": (2.0, np.array([0.06, 0.02, 0.0])),
        "quadrature": (2.0, np.array([-0.03, 0.0, 0.01])),
        "time": (4.0, np.array([0.004, 0.001, 0.0])),
    },
    higher=0.0,
)
DRAWS = np.random.default_rng(21).normal(size=512)
PARTS = ("space", "quadrature", "time")


def part_of(statement: Statement, key: str) -> float:
    """One member of the error, which must be a number."""
    found = statement.error[key]
    assert found is not None
    return found


def factor(order: float) -> float:
    """F of the recipe where expected and observed order agree, ratio 2."""
    return 1.0 + 1.25 / (float(2.0**order) - 1.0)


def differences(name: str) -> np.ndarray:
    """The planted differences on the 32 probes: error(run) - error(finer)."""
    order = PLANTED.errors[name][0]
    return np.asarray(PLANTED.error(name, DRAWS[:32], 1.0) * (1.0 - 2.0**-order))


def test_mean_by_hand() -> None:
    sample = PLANTED.sample(DRAWS)
    statement = split_error(sample, PLANTED.parts(DRAWS), MEAN, 0.95)
    sampling = ttest_1samp(sample.values, 0.0).confidence_interval(0.95)
    noise = 0.0
    for name in PARTS:
        difference, f = differences(name), factor(PLANTED.errors[name][0])
        assert part_of(statement, name) == pytest.approx(f * abs(difference.mean()) + 1e-13 * 5, rel=1e-9)
        half = student_t.ppf(0.975, 31) * difference.std(ddof=1) / np.sqrt(32) * np.sqrt(1 - 32 / 512)
        noise += (f * half) ** 2
    assert part_of(statement, "bias_noise") == pytest.approx(np.sqrt(noise), rel=1e-9)
    assert part_of(statement, "sampling") == pytest.approx((sampling.high - sampling.low) / 2, rel=1e-9)
    total = sum(part_of(statement, name) for name in PARTS)
    total += np.hypot(part_of(statement, "sampling"), part_of(statement, "bias_noise"))
    assert part_of(statement, "total") == pytest.approx(total, rel=1e-12)
    assert statement.value is not None
    assert statement.interval == pytest.approx((statement.value - total, statement.value + total), rel=1e-12)
    assert statement.error["noise_modes"] is None
    assert statement.error["surrogate"] is None
    assert {name: order.observed for name, order in statement.orders.items()} == pytest.approx(
        {"space": 2.0, "quadrature": 2.0, "time": 4.0}, abs=1e-6
    )


def test_sd_by_hand() -> None:
    sample = PLANTED.sample(DRAWS)
    q, m, s = sample.values[:32], sample.values.mean(), sample.values.std(ddof=1)
    statement = split_error(sample, PLANTED.parts(DRAWS), SD, 0.95)
    for name in PARTS:
        d = differences(name)
        psi = ((q - m) ** 2 - (q - d - m + d.mean()) ** 2) / (2 * s)
        expected = factor(PLANTED.errors[name][0]) * abs(psi.mean())
        assert part_of(statement, name) == pytest.approx(expected, rel=1e-7)


def test_probes_of_scramblings_give_t_over_their_means() -> None:
    sample = PLANTED.sample(DRAWS, replicates=16)
    statement = split_error(sample, [PLANTED.part("space", DRAWS)], MEAN, 0.95)
    means = differences("space").reshape(2, 16).mean(axis=0)
    half = student_t.ppf(0.975, 15) * means.std(ddof=1) / 4
    assert part_of(statement, "bias_noise") == pytest.approx(factor(2.0) * half, rel=1e-9)


@pytest.mark.parametrize("statistic", [quantile(0.1), quantile(0.5), exceed(3.2)])
def test_quantiles_and_probabilities_of_an_exact_regression(statistic: Statistic) -> None:
    """D is exactly quadratic in z, nearly in Q: the shifted sample is the one at F times the difference."""
    planted = PlantedField(3.0, 0.5, {"space": (2.0, np.array([0.06, 0.02, 0.0]))}, higher=0.0)
    sample = planted.sample(DRAWS)
    statement = split_error(sample, [planted.part("space", DRAWS)], statistic, 0.95)
    shifted = sample.values - factor(2.0) * 0.75 * planted.error("space", DRAWS, 1.0)
    if statistic.kind == "quantile":
        change = np.quantile(sample.values, statistic.at, method="median_unbiased")
        change -= np.quantile(shifted, statistic.at, method="median_unbiased")
    else:
        change = (sample.values > statistic.at).mean() - (shifted > statistic.at).mean()
    assert part_of(statement, "space") == pytest.approx(abs(change), rel=1e-9)
    assert part_of(statement, "bias_noise") < 1e-9


def test_residual_noise_shifts_the_quantile() -> None:
    generator = np.random.default_rng(5)
    q = generator.normal(size=256)
    d = 0.1 + 0.02 * generator.normal(size=32)
    part = PartDifferences(
        "time", np.arange(32), Pair(LevelValues.of(q[:32]), LevelValues.of(q[:32] - d)), None
    )
    z = (q - q.mean()) / q.std(ddof=1)
    coefficients = np.polynomial.polynomial.polyfit(z[:32], d, 2)
    left = d - np.polynomial.polynomial.polyval(z[:32], coefficients)
    residual = np.sqrt((left**2).sum() / 29)
    statement = split_error(Sample.of(q), [part], quantile(0.5), 0.95)
    assert part_of(statement, "bias_noise") == pytest.approx(2.0 * residual, rel=1e-6)
    at_99 = split_error(Sample.of(q), [part], quantile(0.5), 0.99)
    assert part_of(at_99, "bias_noise") == pytest.approx(2.0 * residual * 2.5758293 / 1.9599640, rel=1e-6)


@pytest.mark.parametrize("rank", [-6, -1])
def test_intervals_stay_asymmetric_and_probabilities_within_bounds(rank: int) -> None:
    sample = PLANTED.sample(DRAWS)
    level = float(np.sort(sample.values)[rank])
    statement = split_error(sample, PLANTED.parts(DRAWS), exceed(level), 0.95)
    sampled = estimate_exceedance(sample, level, 0.95)
    assert sampled.value is not None
    assert sampled.low is not None
    assert sampled.high is not None
    bias = sum(part_of(statement, name) for name in PARTS)
    right = bias + np.hypot(sampled.high - sampled.value, part_of(statement, "bias_noise"))
    left = bias + np.hypot(sampled.value - sampled.low, part_of(statement, "bias_noise"))
    assert right > left
    assert statement.interval == pytest.approx((max(0.0, sampled.value - left), sampled.value + right))
    assert part_of(statement, "total") == pytest.approx(right)


def test_three_shifts_into_a_tail_count_jointly() -> None:
    """Three equal shifts of 0.2: together they change a tail probability by more than three times one."""
    errors = {name: (2.0, np.array([-0.2, 0.0, 0.0])) for name in PARTS}
    planted = PlantedField(0.0, 1.0, errors, higher=0.0)
    sample = planted.sample(DRAWS)
    statement = split_error(sample, planted.parts(DRAWS), exceed(1.0), 0.95)
    shift = factor(2.0) * 0.75 * -0.2
    alone = ((sample.values - shift > 1.0).mean() - (sample.values > 1.0).mean()) * 3
    together = (sample.values - 3 * shift > 1.0).mean() - (sample.values > 1.0).mean()
    assert together > 1.2 * alone
    assert sum(part_of(statement, name) for name in PARTS) == pytest.approx(together, rel=1e-9)


def test_corrected_mean() -> None:
    sample = PLANTED.sample(DRAWS)
    statement = split_error(sample, PLANTED.parts(DRAWS), MEAN, 0.95)
    corrected = statement.corrected
    assert corrected is not None
    limits = {"space": 4 / 3, "quadrature": 4 / 3, "time": 16 / 15}
    expected = sample.values.mean() - sum(f * differences(name).mean() for name, f in limits.items())
    assert corrected.value == pytest.approx(expected, rel=1e-12)
    bias = 0.25 * sum(part_of(statement, name) for name in PARTS)
    total = bias + np.hypot(part_of(statement, "sampling"), part_of(statement, "bias_noise"))
    assert part_of(corrected, "total") == pytest.approx(total, rel=1e-12)
    assert part_of(corrected, "space") == pytest.approx(0.25 * part_of(statement, "space"))


def test_no_correction_where_a_part_does_not_converge() -> None:
    stuck = PlantedField(0.0, 0.01, {"space": (0.2, np.array([0.5, 0.1, 0.0]))}, higher=0.0)
    part = stuck.part("space", DRAWS, expected_order=2.0)
    statement = split_error(stuck.sample(DRAWS), [part], MEAN, 0.95)
    assert statement.corrected is None
    assert any("not converging" in note for note in statement.notes)


def test_small_parts_are_below_the_resolution() -> None:
    statement = split_error(PLANTED.sample(DRAWS), PLANTED.parts(DRAWS), MEAN, 0.95)
    assert part_of(statement, "time") < 0.1 * part_of(statement, "total")
    assert "below the resolution of the split: time" in statement.notes


def test_the_peak_rule_takes_the_coarser_difference_where_the_finer_vanishes() -> None:
    q = np.random.default_rng(6).normal(size=64)
    zero, off = LevelValues.of(q), LevelValues.of(q + 0.08)
    settings = {
        "probes": np.arange(64),
        "fine": Pair(zero, zero),
        "coarse": Pair(off, zero),
        "round_off": 1e-9,
    }
    plain = split_error(Sample.of(q), [PartDifferences("space", **settings)], MEAN, 0.95)  # type: ignore[arg-type]
    assert part_of(plain, "space") < 1e-8
    part = PartDifferences("space", peak=True, **settings)  # type: ignore[arg-type]
    peak = split_error(Sample.of(q), [part], MEAN, 0.95)
    assert part_of(peak, "space") == pytest.approx(factor(2.0) * 0.08 / 4, rel=1e-6)
    for statistic in (quantile(0.5), SD):
        assert split_error(Sample.of(q), [part], statistic, 0.95).value is not None
    assert part_of(split_error(Sample.of(q), [part], quantile(0.5), 0.95), "space") == pytest.approx(
        factor(2.0) * 0.08 / 4, rel=1e-6
    )


def test_a_certain_run() -> None:
    """One deterministic run: sampling null, sd 0, biases from its single probe, no noise."""
    planted = PlantedField(3.0, 0.0, {"space": (2.0, np.array([0.06, 0.0, 0.0]))}, higher=0.0)
    sample = Sample.of(planted.values(np.zeros(1)), certain=True)
    found = quantity_statements(
        sample, [planted.part("space", np.zeros(1), 1)], [0.05], [2.9, 3.03, 3.2], 0.95
    )
    assert found.mean.error["sampling"] is None
    assert part_of(found.mean, "space") == pytest.approx(factor(2.0) * 0.045, rel=1e-9)
    assert found.mean.error["bias_noise"] == 0.0
    assert found.mean.interval is not None
    assert found.mean.interval[0] < 3.0 < 3.06 < found.mean.interval[1]  # type: ignore[operator]
    assert found.sd.value == 0.0
    assert found.sd.interval == (0.0, 0.0)
    assert found.sd.error["sampling"] is None
    assert found.quantiles[0.05].error["total"] == pytest.approx(part_of(found.mean, "total"), rel=1e-6)
    assert [found.exceed[c].interval for c in (2.9, 3.03, 3.2)] == [(1.0, 1.0), (0.0, 1.0), (0.0, 0.0)]


def test_without_parts_only_sampling_remains() -> None:
    sample = PLANTED.sample(DRAWS)
    statement = split_error(sample, [], MEAN, 0.9)
    sampled = estimate_mean(sample, 0.9)
    assert statement.interval == pytest.approx((sampled.low, sampled.high), rel=1e-12)
    assert statement.error["bias_noise"] is None
    assert statement.error["space"] is None
    assert statement.corrected is None


def test_failed_probes_are_left_out_and_said() -> None:
    part = PLANTED.part("space", DRAWS)
    finer = part.fine.finer
    valid = np.arange(32) % 4 != 0
    broken = LevelValues.of(np.where(valid, finer.values, np.nan), valid=valid)
    statement = split_error(
        PLANTED.sample(DRAWS), [replace(part, fine=Pair(part.fine.coarser, broken))], MEAN, 0.95
    )
    mean = differences("space")[valid].mean()
    assert part_of(statement, "space") == pytest.approx(factor(2.0) * abs(mean), rel=1e-9)
    assert "space: 8 of 32 probes failed and are left out" in statement.notes


def test_a_part_whose_probes_all_failed_leaves_no_statement() -> None:
    part = PLANTED.part("space", DRAWS)
    gone = LevelValues.of(np.full(32, np.nan), valid=np.zeros(32, dtype=bool))
    statement = split_error(
        PLANTED.sample(DRAWS), [replace(part, fine=Pair(part.fine.coarser, gone))], MEAN, 0.95
    )
    assert statement.value is None
    assert statement.interval is None
    assert statement.error["total"] is None
    assert statement.error["sampling"] is not None
    assert statement.reason == "the space part cannot be measured: every probe failed"


def test_too_few_occurrences_among_the_probes() -> None:
    """30 of 1000 samples, but only 1 probe: the mean is not determined, P(exceed) has a wide interval."""
    margin = -np.ones(1000)
    margin[[3, *range(100, 129)]] = 1.0
    values = np.where(margin >= 0, np.linspace(1.0, 2.0, 1000), np.nan)
    level = LevelValues.of(values[:32], margin[:32])
    part = PartDifferences("space", np.arange(32), Pair(level, level), Pair(level, level))
    sample = Sample.of(values, margin=margin)
    mean = split_error(sample, [part], MEAN, 0.95)
    assert mean.value is None
    assert mean.interval is None
    assert mean.reason == "the space part cannot be measured: the quantity occurs on too few probes"
    above = split_error(sample, [part], exceed(1.0), 0.95)
    assert above.value == 0.03
    assert part_of(above, "space") == pytest.approx(0.03)


def test_a_quantity_that_occurs_nowhere() -> None:
    planted = PlantedOccurrence(0.1, 0.1)
    xy = np.random.default_rng(8).normal(size=(128, 2)) - np.array([9.0, 0.0])
    found = quantity_statements(planted.sample(xy), [planted.part(xy)], [0.5], [0.0], 0.95)
    assert found.mean.reason == "not determined by 128 samples: it does not occur in any of them"
    assert found.occurs is not None
    assert found.occurs.value == 0.0
    assert found.exceed[0.0].value == 0.0
    assert found.exceed[0.0].interval is not None
    json.dumps(found.as_json("mm"), allow_nan=False)


def test_round_off_is_part_of_every_bias() -> None:
    q = 1e3 + np.random.default_rng(9).normal(size=128)
    same = LevelValues.of(q[:32])
    part = PartDifferences("space", np.arange(32), Pair(same, same), Pair(same, same), expected_order=None)
    floor = 1e-13 * q.max()
    for statistic in (MEAN, SD, quantile(0.5)):
        statement = split_error(Sample.of(q), [part], statistic, 0.95)
        assert part_of(statement, "space") == pytest.approx(floor, rel=0.2)
    assert part_of(split_error(Sample.of(q), [part], exceed(1e3), 0.95), "space") == 0.0
    assert part_of(split_error(Sample.of(q), [part], exceed(q.max()), 0.95), "space") == pytest.approx(
        1 / 128
    )


def test_equal_samples_have_spread_only_from_the_discretisation() -> None:
    q = np.full(128, 2.0)
    moved = LevelValues.of(q[:32] + np.linspace(-0.1, 0.1, 32))
    same = LevelValues.of(q[:32])
    part = PartDifferences("space", np.arange(32), Pair(same, moved), None)
    statement = split_error(Sample.of(q), [part], SD, 0.95)
    assert statement.value == 0.0
    assert statement.error["sampling"] == 0.0
    assert part_of(statement, "space") == pytest.approx(
        2.0 * np.linspace(-0.1, 0.1, 32).std(ddof=1), rel=1e-9
    )


def test_overflow_is_said_and_never_written() -> None:
    q = np.random.default_rng(10).normal(size=128) * 1e200
    same = LevelValues.of(q[:32])
    part = PartDifferences("space", np.arange(32), Pair(same, same), None)
    found = quantity_statements(Sample.of(q), [part], [0.5], [0.0], 0.95)
    assert found.sd.value is None
    assert found.sd.reason is not None
    json.dumps(found.as_json("1"), allow_nan=False)


def test_shape_of_the_summary() -> None:
    planted, xy = PlantedOccurrence(0.02, 0.02), np.random.default_rng(11).normal(size=(256, 2))
    found = quantity_statements(planted.sample(xy), [planted.part(xy)], [0.05, 0.5, 0.95], [1, 2.5], 0.95)
    shape = json.loads(json.dumps(found.as_json("mm"), allow_nan=False))
    assert list(shape) == ["units", "mean", "sd", "quantiles", "exceed", "occurs", "sensitivity", "variance"]
    assert list(shape["quantiles"]) == ["0.05", "0.5", "0.95"]
    assert list(shape["exceed"]) == ["1.0", "2.5"]
    assert shape["sensitivity"] == {}
    assert shape["variance"] is None
    keys = ["space", "quadrature", "time", "noise_modes", "bias_noise", "sampling", "surrogate", "total"]
    for statement in (shape["mean"], shape["sd"], shape["occurs"], shape["exceed"]["2.5"]):
        assert list(statement)[:3] == ["value", "error", "interval"]
        assert list(statement["error"]) == keys
    assert set(shape["mean"]["corrected"]) == {"value", "error", "interval"}
    assert set(shape["mean"]["orders"]["space"]) == {"observed", "expected", "factor"}
    always = quantity_statements(PLANTED.sample(DRAWS), [], [], [], 0.95).as_json("mm")
    assert always["occurs"] is None
    assert always["quantiles"] == {}


def test_occurrence_is_judged_by_its_margin() -> None:
    planted, xy = PlantedOccurrence(0.0, 0.1), np.random.default_rng(12).normal(size=(512, 2))
    statement = split_error(planted.sample(xy), [planted.part(xy)], OCCURS, 0.95)
    margin = planted.margin(xy, 1.0)
    change = (margin >= 0).mean() - (margin - factor(2.0) * 0.075 >= 0).mean()
    assert part_of(statement, "space") == pytest.approx(change, rel=1e-9)
    assert part_of(statement, "bias_noise") == 0.0


def test_parts_that_together_leave_nothing_are_said() -> None:
    """Every margin is 0.1; two parts of 0.06 each are harmless alone and not together."""
    margin = np.full(128, 0.1)
    q = np.random.default_rng(13).normal(size=128)
    coarse, fine = LevelValues.of(q[:32], margin[:32]), LevelValues.of(q[:32], margin[:32] - 0.03)
    parts = [PartDifferences(name, np.arange(32), Pair(coarse, fine), None) for name in ("space", "time")]
    sample = Sample.of(q, margin=margin)
    assert split_error(sample, parts[:1], quantile(0.5), 0.95).interval is not None
    both = split_error(sample, parts, quantile(0.5), 0.95)
    assert both.value is None
    assert both.interval is None
    assert both.reason == "with all parts together the quantity might not occur at all"
