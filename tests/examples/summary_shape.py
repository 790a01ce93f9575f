"""The shape of summary.json, checked strictly: members, types, ranges, and the sums that they must obey.

The rules are those of the documentation ("Reading a report"): nothing here looks at the code that writes it.
"""

from __future__ import annotations

import json
import math
from collections.abc import Mapping, Sequence
from itertools import pairwise
from typing import Any, NoReturn

import pytest

BIASES = ("space", "quadrature", "time", "noise_modes", "surrogate")
ERROR = {*BIASES, "bias_noise", "sampling", "total"}
QUANTITY = {"units", "mean", "sd", "quantiles", "exceed", "occurs", "sensitivity", "variance"}
CAUSES = {"measure_next", "pin_down", "ranking", "notes"}
"""Members of a quantity besides, where the study has a section [sensitivity]."""
DOCUMENT = {
    *("schema", "title", "quantities", "field", "inputs", "scheme", "sampling", "aim", "plan", "cost"),
    *("failed", "confidence", "warnings"),
}


def read_summary(text: str) -> dict[str, Any]:
    """The document of a text that holds one, its shape checked."""

    def refuse(word: str) -> NoReturn:
        raise AssertionError(f"{word} is not JSON")

    try:
        document: dict[str, Any] = json.loads(text, parse_constant=refuse)
    except ValueError as error:
        raise AssertionError(f"not one JSON document: {error}") from error
    assert_is_summary(document)
    return document


def assert_is_summary(document: Mapping[str, Any]) -> None:
    """Raise AssertionError, naming the place, where a document is no summary."""
    assert set(document) == DOCUMENT
    assert document["schema"] == 1
    assert 0 < number(document["confidence"], "confidence") < 1
    assert document["quantities"], "no quantity"
    noise = document["scheme"]["noise"]
    for name, entry in document["quantities"].items():
        assert_is_quantity(entry, name)
        assert_are_causes(entry, name, set(document["inputs"]), noise is not None)
        if document["sampling"] is None or document["sampling"]["asked"] != "polynomial chaos":
            assert_has_no(entry, name, "surrogate")
        if noise is None:
            assert_has_no(entry, name, "noise_modes")
        assert_is_variance(entry["variance"], name, noise is not None, bool(document["inputs"]))
    assert_is_field(document["field"], noise is not None)
    for path, entry in document["inputs"].items():
        assert set(entry) == {"law", "units", "mean", "sd"}, path
        assert entry["sd"] is None or number(entry["sd"], path) >= 0
        assert entry["mean"] is None or math.isfinite(number(entry["mean"], path))
        assert all(text(entry[key]) for key in ("law", "units")), path
    assert_is_scheme(document["scheme"])
    assert_is_sampling(document["sampling"], noise is not None or bool(document["inputs"]))
    assert_is_cost(document["cost"], document["sampling"])
    assert_are_failures(document["failed"], document["cost"], set(document["inputs"]))
    assert_is_aim(document["aim"], document["quantities"])
    assert all(text(warning) for warning in document["warnings"])


def text(value: object) -> bool:
    """Whether a value is a text that says something."""
    return isinstance(value, str) and value.strip() != ""


def number(value: object, place: str) -> float:
    """A finite number; neither a truth value nor a text."""
    assert isinstance(value, int | float), f"{place}: {value!r}"
    assert not isinstance(value, bool), place
    assert math.isfinite(value), place
    return float(value)


def count(value: object, place: str) -> int:
    """A whole number that is not negative."""
    assert isinstance(value, int), f"{place}: {value!r}"
    assert not isinstance(value, bool), place
    assert value >= 0, place
    return value


def assert_is_quantity(entry: Mapping[str, Any], name: str) -> None:
    """Statistics of one quantity."""
    assert set(entry) in (QUANTITY, QUANTITY | CAUSES), name
    assert text(entry["units"]), name
    assert_is_statistic(entry["mean"], f"{name}.mean")
    assert_is_statistic(entry["sd"], f"{name}.sd", low=0.0)
    if entry["occurs"] is not None:
        assert_is_statistic(entry["occurs"], f"{name}.occurs", 0.0, 1.0)
    for key, group, bounds in (
        ("quantiles", entry["quantiles"], ()),
        ("exceed", entry["exceed"], (0.0, 1.0)),
    ):
        for label, statistic in group.items():
            assert repr(float(label)) == label, f"{name}.{key}: {label!r} is not how Python prints a number"
            assert_is_statistic(statistic, f"{name}.{key}.{label}", *bounds)
    assert all(0 < float(p) < 1 for p in entry["quantiles"]), name
    assert_goes(entry["quantiles"], 1.0, f"{name}.quantiles")
    assert_goes(entry["exceed"], -1.0, f"{name}.exceed")


def assert_has_no(entry: Mapping[str, Any], name: str, part: str) -> None:
    """No statistic has an error from what the run does not have."""
    groups = [{"mean": entry["mean"], "sd": entry["sd"]}, entry["quantiles"], entry["exceed"]]
    for group in groups:
        for label, statistic in group.items():
            assert statistic["error"][part] is None, f"{name}.{label}: there is no {part}"


def assert_are_causes(entry: Mapping[str, Any], name: str, inputs: set[str], noisy: bool) -> None:
    """What [sensitivity] asked: indices by input, what to measure next, what to pin down, how sure the order is."""
    sensitivity = entry["sensitivity"]
    asked = set(entry) >= CAUSES
    assert asked or sensitivity == {}, name
    assert set(sensitivity) <= inputs | ({"noise"} if noisy else set()), name
    for path, indices in sensitivity.items():
        place = f"{name}.sensitivity.{path}"
        assert set(indices) <= ({"total"} if path == "noise" else {"first", "total", "second", "shapley"}), (
            place
        )
        for kind, index in indices.items():
            if kind != "second":
                assert_is_index(index, f"{place}.{kind}")
                continue
            assert set(index) <= inputs - {path}, place
            for other, pair in index.items():
                assert_is_index(pair, f"{place}.second.{other}")
                assert pair == sensitivity[other]["second"][path], f"{place}.second.{other} is not symmetric"
    if not asked:
        return
    assert set(entry["measure_next"]) == inputs, name
    for path, gain in entry["measure_next"].items():
        assert set(gain) == {"remaining_sd_known", "remaining_sd_halved", "may_be_fixed"}, f"{name}.{path}"
        assert gain["may_be_fixed"] in (True, False, None), f"{name}.{path}"
        for kind in ("remaining_sd_known", "remaining_sd_halved"):
            assert_is_statistic(gain[kind], f"{name}.measure_next.{path}.{kind}", low=0.0)
    for one in entry["pin_down"]:
        assert set(one) <= {"inputs", "remaining_sd", "wanted_sd", "exhaustive", "reason"}, name
        if one["inputs"] is None:
            assert text(one["reason"]), name
            continue
        assert set(one["inputs"]) <= inputs, name
        assert 0 <= number(one["remaining_sd"], name) <= number(one["wanted_sd"], name)
    ranking = entry["ranking"]
    if ranking is not None:
        assert ranking["by"] in ("first", "total", "shapley"), name
        assert sorted(ranking["order"]) == sorted(inputs), name
        assert len(ranking["above_next"]) == len(inputs) - 1, name
        assert all(0 <= number(p, name) <= 1 for p in (*ranking["above_next"], ranking["first_is_largest"]))
    assert all(text(note) for note in entry["notes"]), name


def assert_is_index(entry: Mapping[str, Any], place: str) -> None:
    """A share of the variance: its interval lies in [0, 1]; its estimate need not."""
    assert_is_statistic(entry, place, 0.0, 1.0, beyond=True)


def assert_is_variance(variance: Mapping[str, Any] | None, name: str, noisy: bool, parameters: bool) -> None:
    """Null without noise; else four statistics, two of them null where nothing but the noise is uncertain."""
    assert (variance is None) == (not noisy), name
    if variance is None:
        return
    assert set(variance) == {"parameters", "noise", "share", "total"}, name
    for key, entry in variance.items():
        if key in ("parameters", "share") and not parameters:
            assert entry is None, f"{name}.variance.{key}"
        else:
            bounds = (0.0, 1.0) if key == "share" else (0.0,)
            assert_is_statistic(entry, f"{name}.variance.{key}", *bounds)


def assert_is_field(field: Sequence[Mapping[str, Any]] | None, noisy: bool) -> None:
    """Null without noise; else variance and correlation length at 1 to 16 times, increasing."""
    assert (field is None) == (not noisy)
    if field is None:
        return
    assert 1 <= len(field) <= 16
    times = [number(entry["time"], "field.time") for entry in field]
    assert times == sorted(set(times))
    for entry in field:
        assert set(entry) == {"time", "variance", "correlation_length"}
        for key in ("variance", "correlation_length"):
            assert_is_of_sampling(entry[key], f"field.{key}")


def assert_is_of_sampling(entry: Mapping[str, Any], place: str) -> None:
    """A statistic of which the sampling error alone is known: an interval, no total, and a note that says so."""
    error = entry["error"]
    assert set(error) == ERROR, place
    assert [key for key, part in error.items() if part is not None] == (
        ["sampling"] if entry["interval"] else []
    ), place
    if entry["interval"] is None:
        assert entry["value"] is None, place
        assert text(entry["reason"]), place
        return
    low, high = entry["interval"]
    assert 0.0 <= low <= entry["value"] <= high, place
    assert error["sampling"] == pytest.approx(max(entry["value"] - low, high - entry["value"])), place
    assert any("sampling error alone" in note for note in entry["notes"]), place


def assert_goes(group: Mapping[str, Any], direction: float, place: str) -> None:
    """Quantiles grow with their probability, probabilities fall with their level."""
    known = sorted((float(key), one["value"]) for key, one in group.items() if one["value"] is not None)
    for (_, before), (_, after) in pairwise(known):
        assert direction * (after - before) >= 0, place


def assert_is_statistic(
    entry: Mapping[str, Any],
    place: str,
    low: float = -math.inf,
    high: float = math.inf,
    *,
    beyond: bool = False,
) -> None:
    """{value, error, interval}, both ends within [low, high], and the value too unless it may lie beyond.

    A mean may have `corrected`.
    """
    assert {"value", "error", "interval"} <= set(entry), place
    assert set(entry) <= {"value", "error", "interval", "corrected", "reason", "orders", "notes"}, place
    assert_is_error(entry["error"], place)
    if entry["interval"] is None or entry["value"] is None:
        assert entry["interval"] is None, f"{place}: an interval of nothing"
        assert entry["error"]["total"] is None, place
        assert text(entry["reason"]), f"{place}: nothing is said and no reason given"
    else:
        assert "reason" not in entry, place
        assert_is_interval(entry, place, low, high, beyond)
    if "corrected" in entry:
        assert place.endswith(".mean"), place
        assert set(entry["corrected"]) == {"value", "error", "interval"}, place
        assert_is_statistic(entry["corrected"], f"{place}.corrected", low, high)
    for part, order in entry.get("orders", {}).items():
        assert part in BIASES, place
        assert set(order) == {"observed", "expected", "factor"}, place
        assert number(order["factor"], place) > 1, f"{place}.{part}: no safety"
    assert all(text(note) for note in entry.get("notes", [])), place


def assert_is_error(error: Mapping[str, Any], place: str) -> None:
    """All parts are there; each is null or a number that is not negative."""
    assert set(error) == ERROR, place
    for key, value in error.items():
        assert value is None or number(value, f"{place}.{key}") >= 0, f"{place}.{key}"


def assert_is_interval(
    entry: Mapping[str, Any], place: str, low: float, high: float, beyond: bool = False
) -> None:
    """Ordered ends about the value, within the bounds, no longer than `total`, which is the sum it must be.

    total = B + sqrt(sampling^2 + bias_noise^2), B the sum of the biases, null counted as 0.
    """
    value = number(entry["value"], place)
    assert isinstance(entry["interval"], Sequence), place
    left, right = entry["interval"]
    ends = (
        number(left, place) if left is not None else -math.inf,
        number(right, place) if right is not None else math.inf,
    )
    inside = min(max(value, low), high) if beyond else value
    assert max(ends[0], low) <= inside <= min(ends[1], high), place
    assert left is None or left >= low, place
    assert right is None or right <= high, place
    if left is None or right is None:
        assert entry["error"]["total"] is None, f"{place}: a total, but no bound on one side"
        return
    error = {key: part or 0.0 for key, part in entry["error"].items()}
    bias = math.fsum(error[part] for part in BIASES)
    total = bias + math.hypot(error["sampling"], error["bias_noise"])
    assert error["total"] == pytest.approx(total, rel=1e-9, abs=1e-300), place
    rounding = 1e-12 * (abs(value) + total)
    longer = max(value - ends[0], ends[1] - value)
    assert longer <= total + rounding, place
    if ends[0] > low and ends[1] < high:
        assert longer == pytest.approx(total, rel=1e-9, abs=rounding), (
            f"{place}: total is not the longer side"
        )


def assert_is_scheme(scheme: Mapping[str, Any]) -> None:
    """Scheme, counts, operators with their reasons, parts of the split."""
    words = {"projector", "method", "quadrature"}
    numbers = {"nodes", "quadrature_points", "time_step", "probes"}
    assert words | numbers | {"operators", "parts", "noise"} == set(scheme)
    assert all(text(scheme[key]) for key in words)
    assert all(count(scheme[key], key) > 0 for key in ("nodes", "quadrature_points"))
    assert number(scheme["time_step"], "time_step") > 0
    count(scheme["probes"], "probes")
    assert scheme["operators"]
    for operator in scheme["operators"]:
        assert set(operator) == {"part", "operator", "error", "reason"}
        assert all(text(operator[key]) for key in ("part", "operator", "reason"))
        assert number(operator["error"], "operator") >= 0
    assert set(scheme["parts"]) <= set(BIASES)
    assert ("noise_modes" in scheme["parts"]) <= (scheme["noise"] is not None)
    if scheme["noise"] is not None:
        assert_is_noise(scheme["noise"])


def assert_is_noise(noise: Mapping[str, Any]) -> None:
    """Form of the correlation, modes that are kept, and what they lack."""
    shares = {"dropped_share", "dropped_share_finer", "image_error"}
    assert set(noise) == {"correlation", "modes", "ring_length", "note"} | shares
    assert noise["correlation"] in ("gaussian", "exponential", "cosine", "white")
    assert count(noise["modes"], "modes") % 2 == 1, "pairs and the constant"
    assert number(noise["ring_length"], "ring_length") > 0
    for key in shares:
        assert noise[key] is None or 0 <= number(noise[key], key) <= 1, key
    assert isinstance(noise["note"], str)


def assert_is_sampling(sampling: Mapping[str, Any] | None, uncertain: bool) -> None:
    """Null where nothing is uncertain, else counts that agree."""
    assert (sampling is None) == (not uncertain)
    if sampling is None:
        return
    counts = {"samples", "replicates", "points_per_replicate", "noise_repeats"}
    assert set(sampling) == counts | {"method", "asked", "further_runs"}
    assert sampling["asked"] in ("auto", "monte carlo", "quasi-monte carlo", "polynomial chaos")
    assert set(sampling["further_runs"]) <= {"held out", "exchange", "screening"}
    assert all(count(runs, family) > 0 for family, runs in sampling["further_runs"].items())
    points, replicates = sampling["points_per_replicate"], sampling["replicates"]
    assert sampling["samples"] == points * replicates
    assert count(sampling["noise_repeats"], "noise_repeats") >= 1
    if sampling["method"] == "quasi-monte carlo":
        assert replicates == 16
        assert points >= 4
        assert points & (points - 1) == 0, "a power of two"
    else:
        assert (sampling["method"], replicates) == ("monte carlo", 1)


def assert_is_cost(cost: Mapping[str, Any], sampling: Mapping[str, Any] | None) -> None:
    """Seconds, and the number of samples."""
    seconds = {"predicted_s", "measured_s", "processor_s"}
    assert set(cost) == seconds | {"samples", "realizations", "split_share"}
    assert cost["predicted_s"] is None or number(cost["predicted_s"], "cost") > 0
    assert number(cost["measured_s"], "cost") > 0
    assert number(cost["processor_s"], "cost") > 0
    assert 0 <= number(cost["split_share"], "cost") < 1
    assert cost["samples"] == (1 if sampling is None else sampling["samples"])
    assert cost["realizations"] == cost["samples"] * (1 if sampling is None else sampling["noise_repeats"])


def assert_are_failures(failed: Mapping[str, Any], cost: Mapping[str, Any], inputs: set[str]) -> None:
    """As many reasons as failures, and the failures with their inputs."""
    assert set(failed) == {"count", "reasons", "listed", "list"}
    assert count(failed["count"], "failed") <= cost["realizations"]
    assert sum(failed["reasons"].values()) == failed["count"]
    assert len(failed["list"]) == failed["listed"] == min(failed["count"], 100)
    for entry in failed["list"]:
        assert set(entry) == {"sample", "repeat", "reason", "time", "inputs"}
        assert count(entry["sample"], "failed") < cost["samples"]
        assert count(entry["repeat"], "failed") < cost["realizations"] // cost["samples"]
        assert entry["reason"] in failed["reasons"]
        assert set(entry["inputs"]) == inputs


def assert_is_aim(aim: Mapping[str, Any] | None, quantities: Mapping[str, Any]) -> None:
    """What was demanded, what was reached, and whether that is enough."""
    if aim is None:
        return
    assert set(aim) == {"tolerance", "quantity", "half_width", "allowed", "met", "reason"}
    assert text(aim["tolerance"])
    assert text(aim["reason"])
    assert aim["half_width"] == quantities[aim["quantity"]]["mean"]["error"]["total"]
    known = aim["half_width"] is not None and aim["allowed"] is not None
    assert aim["met"] is (known and aim["half_width"] <= aim["allowed"])
