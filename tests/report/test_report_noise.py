"""What the report of a noisy field adds: causes of variance, fans in time, open ends, methods."""

from __future__ import annotations

import copy
import re
import xml.etree.ElementTree as ElementTree
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.report.data import ReportData
from aleafield.report.figures import figure_files, report_figures
from aleafield.report.figures.distribution import distribution
from aleafield.report.figures.error_split import error_split
from aleafield.report.figures.fan import fan, stretches
from aleafield.report.figures.variance_parts import variance_parts
from aleafield.report.findings import QuantityFindings, quantity_findings
from aleafield.report.page import SECTIONS
from aleafield.report.parting import consequence, parting
from aleafield.report.rounding import DASH
from aleafield.report.terminal import result_lines
from aleafield.report.verdict import spread
from tests.report.reading import SVG, number, page_tree, read_back, rows, section, words
from tests.report.sample_report import noisy_report, noisy_summary, one_sided, undetermined
from tests.report.test_report_page import changed, page_of


@pytest.fixture(scope="module")
def data() -> ReportData:
    return noisy_report()


@pytest.fixture(scope="module")
def findings(data: ReportData) -> list[QuantityFindings]:
    return quantity_findings(data.summary)


@pytest.fixture(scope="module")
def tree(data: ReportData) -> ElementTree.Element:
    return page_tree(page_of(data))


def points(path: ElementTree.Element) -> FloatArray:
    """Vertices of a path, shape (P, 2), px."""
    return np.array([[float(n) for n in p.split()] for p in (path.get("d") or "").strip("MZ").split("L")])


def of_kind(root: ElementTree.Element, kind: str) -> list[ElementTree.Element]:
    """All elements of a class, in drawing order."""
    return [e for e in root.iter() if e.get("class") == kind]


def scale(root: ElementTree.Element, anchor: str, along: str) -> tuple[float, float]:
    """Offset and slope of the axis, px against the numbers of its ticks: what a reader takes a curve for."""
    ticks = [
        (number(words(t)), float(t.get(along) or 0))
        for t in root.iter(f"{SVG}text")
        if t.get("class") == "quiet"
        and t.get("text-anchor") == anchor
        and re.fullmatch("[\N{MINUS SIGN}0-9.]+", words(t))
    ]
    values, places = np.array(ticks).T
    slope, offset = np.polyfit(values, places, 1)
    return float(offset), float(slope)


def test_every_section_is_linked_and_small(data: ReportData, tree: ElementTree.Element) -> None:
    """Also with twenty quantities the page stays below a megabyte."""
    targets = {(e.get("href") or "")[1:] for e in tree.iter("a")}
    assert targets == {name for name, _ in SECTIONS} - {"causes", "next"}  # not asked
    assert targets <= {e.get("id") for e in tree.iter("section")}
    many = dict(data.summary)
    drift, history = data.summary["quantities"]["drift"], data.histories["drift"]
    many["quantities"] = {f"drift {i}": drift for i in range(20)}
    values = dict.fromkeys(many["quantities"], data.values["drift"])
    histories = dict.fromkeys(many["quantities"], history)
    text = page_of(changed(data, many, values=values, histories=histories))
    assert len(text.encode()) < 1_000_000


def test_figures_of_noise_are_files_that_speak(data: ReportData) -> None:
    files = figure_files(report_figures(data, quantity_findings(data.summary)))
    assert {"fan-drift.svg", "fan-highest.svg", "variance-causes.svg"} <= set(files)
    for name, text in files.items():
        root = ElementTree.fromstring(text)
        named = {e.get("id"): words(e) for e in root if e.tag in (f"{SVG}title", f"{SVG}desc")}
        assert all(named[key] for key in (root.get("aria-labelledby") or "").split()), name
        assert "nan" not in text.lower().replace("dominant", ""), name


def test_causes_of_variance_equal_the_summary(data: ReportData, tree: ElementTree.Element) -> None:
    """Each row to the digits that its half-width leaves, its ends rounded outwards."""
    names = {
        "from the parameters": "parameters",
        "from noise": "noise",
        "total": "total",
        "share of the parameters": "share",
    }
    found = rows(tree, "Variance by its causes")
    assert [(row[0], names[row[1]]) for row in found] == [
        (quantity, part)
        for quantity in ("drift", "highest")
        for part in ("parameters", "noise", "total", "share")
    ]
    for quantity, part, value, interval, half_width in found:
        stated = data.summary["quantities"][quantity]["variance"][names[part]]
        units = "" if names[part] == "share" else {"drift": " mm2", "highest": " mV2"}[quantity]
        assert value.endswith(units)
        total = stated["error"]["total"]
        assert abs(number(value.removesuffix(units)) - stated["value"]) <= 0.05 * total
        low, high = (number(end) for end in interval.removesuffix(units).split(" to "))
        assert stated["interval"][0] - 0.1 * total < low <= stated["interval"][0] + 1e-15
        assert stated["interval"][1] - 1e-15 <= high < stated["interval"][1] + 0.1 * total
        assert total <= number(half_width) <= 1.1 * total


def test_the_answer_says_how_much_could_be_learnt(tree: ElementTree.Element) -> None:
    """0.6147 (0.5165 to 0.7058, outwards) of 0.316 mm2; sqrt(0.12175) = 0.34893, sqrt(0.00264) = 0.05138."""
    said = words(section(tree, "noise"))
    share = "About 61.5 % (51.6 % to 70.6 %) of the variance of drift comes from the parameters, the rest from noise."
    assert share in said
    assert share in words(section(tree, "answers"))
    assert "can remove at most that much; noise alone leaves a standard deviation of 0.3489 mm." in said
    assert "No variance of highest is seen to come from the parameters, and at most 4.5 % of it can." in said
    assert (
        "Measuring the parameters better hardly narrows it; noise alone leaves a standard deviation of 0.0514"
        in said
    )


def test_variance_without_inputs_or_repeats() -> None:
    summary = noisy_summary()
    drift = summary["quantities"]["drift"]
    drift["variance"] |= {"parameters": None, "share": None}
    one = undetermined("one noise path for each sample: set noise_repeats to 2 or more")
    summary["quantities"]["highest"]["variance"] = dict.fromkeys(
        ("parameters", "noise", "share", "total"), one
    )
    first, second = quantity_findings(summary)
    assert parting(first) == "No input is uncertain: all of the variance of drift (0.316 mm2) is noise."
    assert parting(second).endswith(
        "is not determined: one noise path for each sample: set noise_repeats to 2 or more."
    )
    assert consequence(first) == consequence(second) == ""
    assert variance_parts([first, second], "v") is None
    lines = result_lines(summary)
    assert (
        "noise or ignorance of highest: one noise path for each sample: set noise_repeats to 2 or more"
        in lines
    )
    row = next(line for line in lines if line.startswith("drift  ") and "mm2" in line)
    assert row.split("  ")[-1] == "0 % (no uncertain inputs)"


def test_bars_of_variance_are_cut_at_the_share(data: ReportData, findings: list[QuantityFindings]) -> None:
    root = read_back(variance_parts(findings, "v"))
    offset, slope = scale(root, "middle", "x")
    share = data.summary["quantities"]["drift"]["variance"]["share"]
    first = next(r for r in root.iter(f"{SVG}rect") if "of the variance of drift" in words(r))
    assert first.get("class") == "part-parameters"
    start, width = float(first.get("x") or 0), float(first.get("width") or 0) + 1  # a gap of 1 px
    assert start == pytest.approx(offset, abs=0.02)
    assert width == pytest.approx(slope * 100 * share["value"], abs=0.05)
    whisker = of_kind(root, "whisker")[0]
    ends = [float(whisker.get(key) or 0) for key in ("x1", "x2")]
    assert ends == pytest.approx([offset + slope * 100 * end for end in share["interval"]], abs=0.05)


def test_a_fan_shows_its_quantiles_where_the_axis_says(data: ReportData) -> None:
    """Median, both bands and every path, read against the labels of the axes."""
    record = data.histories["drift"]
    root = read_back(fan("f", "drift", record, data.units))
    assert [words(t) for t in root.iter(f"{SVG}text")][-1] == "t (ms)"
    assert "displacement since t = 0 (mm)" in [words(t) for t in root.iter(f"{SVG}text")]
    x_offset, x_slope = scale(root, "middle", "x")
    y_offset, y_slope = scale(root, "end", "y")
    y_offset -= 4  # labels stand 4 px below their line
    assert y_slope < 0

    def curve(values: FloatArray) -> FloatArray:
        return np.stack([x_offset + x_slope * record.t, y_offset + y_slope * values], axis=1)

    def same(seen: FloatArray, values: FloatArray) -> None:
        np.testing.assert_allclose(seen, curve(values), rtol=0, atol=0.03)  # px, written to 0.01

    same(points(of_kind(root, "curve")[0]), record.fan[2])
    (outer,), (inner,) = of_kind(root, "fan"), of_kind(root, "fan inner")
    same(points(outer)[:41], record.fan[0])
    same(points(outer)[41:][::-1], record.fan[4])
    same(points(inner)[:41], record.fan[1])
    same(points(inner)[41:][::-1], record.fan[3])
    singles = of_kind(root, "single")
    assert len(singles) == 6
    for path, values in zip(singles, record.paths, strict=True):
        same(points(path), values)
    kinds = [e.get("class") for e in root.iter(f"{SVG}path")]
    assert kinds == ["single"] * 6 + ["fan", "fan inner", "curve"]  # the paths lie under the bands


def test_a_fan_has_gaps_where_a_quantity_does_not_occur(data: ReportData) -> None:
    record = data.histories["drift"]
    quantiles, paths = record.fan.copy(), record.paths.copy()
    quantiles[:, 10:13] = np.nan
    paths[0, :20] = np.nan
    paths[1] = np.nan
    root = read_back(fan("f", "drift", replace(record, fan=quantiles, paths=paths), data.units))
    assert [len(points(p)) for p in of_kind(root, "curve")] == [10, 28]
    assert [len(points(p)) for p in of_kind(root, "single")] == [21, 41, 41, 41, 41]
    assert fan("f", "drift", replace(record, fan=np.full_like(quantiles, np.nan)), data.units) is None
    present = np.array([True, True, False, True, False, True, True, True])
    assert list(stretches(present)) == [slice(0, 2), slice(5, 8)]
    missing = page_of(replace(data, histories={}))
    assert "No quantity of this study is one number" in words(section(page_tree(missing), "time"))


def test_open_ends_by_hand(findings: list[QuantityFindings]) -> None:
    """0.8213 with 0.012 of space and 0.009 of sampling below it, and nothing above."""
    mean, sd = findings[1].mean, findings[1].sd
    assert (mean.open_side, sd.open_side, findings[0].mean.open_side) == ("above", "below", None)
    assert mean.reach == pytest.approx(0.021)
    assert {part.key: share for part, share in mean.shares().items()} == pytest.approx(
        {"space": 0.012 / 0.021, "sampling": 0.009 / 0.021}
    )
    assert sd.reach == pytest.approx(0.0012 + 0.0031)


def test_a_spread_without_a_standard_deviation() -> None:
    """Open on both sides the sd is not determined; the quantiles are still told."""
    summary = noisy_summary()
    highest = summary["quantities"]["highest"]
    highest["sd"] = undetermined("the time part gives no bound")
    highest["quantiles"]["0.05"] = one_sided(
        0.7371, note="the path is not seen", space=0.0014, sampling=0.0034
    )
    assert spread(quantity_findings(summary)[1]) == "90 % of runs lie between 0.7371 mV and 0.9102 mV."


def test_open_ends_read_well(tree: ElementTree.Element) -> None:
    answers = words(section(tree, "answers"))
    assert "The mean of highest is 0.821 mV; with 95 % confidence it is at least 0.800 mV." in answers
    table = rows(tree, "How uncertain highest is")
    assert [row[:4] for row in table] == [
        ["mean", "0.821 mV", "at least 0.800 mV", "open above"],
        ["standard deviation", "0.0514 mV", "at most 0.0557 mV", "open below"],
        ["quantile 0.95", "0.9102 mV", "at least 0.9036 mV", "open above"],
    ]
    error = words(section(tree, "error"))
    assert (
        "bounded on one side only: nothing bounds how far above 0.821 mV the truth lies. 57 % of the other side "
        "(0.021 mV) comes from space." in error
    )
    assert "open above: what the path does between the ends of its steps is not seen" in error
    assert "mean: time: no bound above: the path between the ends of the steps is not seen" in error
    parts = rows(tree, "Error parts of highest (mV; probabilities without unit)")
    # space, quadrature, time, noise modes, surrogate, noise of the biases, sampling, total
    assert parts[0][1:] == ["0.012", DASH, DASH, DASH, DASH, DASH, "0.009", "open above"]


def test_open_ends_are_drawn_open(data: ReportData, findings: list[QuantityFindings]) -> None:
    """In the error split an arrow fills the bar's length; in the distribution it runs to the open side."""
    root = read_back(error_split(findings[1], "e"))
    bars = [r for r in root.iter(f"{SVG}rect") if words(r).endswith("of the bounded side")]
    first = [r for r in bars if r.get("y") == bars[0].get("y")]
    widths = [float(r.get("width") or 0) + 1.5 for r in first]
    assert widths[0] / widths[1] == pytest.approx(0.012 / 0.009, abs=0.001)
    tips = [points(p)[1, 0] for p in root.iter(f"{SVG}path")]
    left = float(first[0].get("x") or 0)
    assert tips == pytest.approx([left + 640.0] * 3)
    assert sum(widths) < 640.0
    labels = [words(t) for t in root.iter(f"{SVG}text") if t.get("class") == "strong"]
    assert labels == ["open above", "open below", "open above"]
    drawn = read_back(distribution(findings[1], data.values["highest"], "d"))
    places = [points(p) for p in drawn.iter(f"{SVG}path")]
    assert len(places) == 2  # mean and quantile; both open above
    for place in places:
        assert place[1, 0] == pytest.approx(900.0)  # the right edge of the frame: 120 + 780
        assert place[0, 0] < place[1, 0]
    whisker = of_kind(drawn, "whisker")[0]
    dot = of_kind(drawn, "dot")
    centre = next(float(e.get("cx") or 0) for e in dot if e.tag == f"{SVG}circle")
    assert float(whisker.get("x2") or 0) == pytest.approx(centre, abs=0.02)


def test_noise_modes_have_a_known_factor(tree: ElementTree.Element) -> None:
    orders = {row[0]: row[1:] for row in rows(tree, "Orders behind the parts of the mean of drift")}
    assert orders["time"][:3] == ["0.93", "1", "2.25"]
    assert orders["noise modes"] == [
        DASH,
        "none: the factor is known",
        "1.26",
        "the dropped variance is known",
    ]
    error = words(section(tree, "error"))
    assert (
        "noise modes (26 %): the modes that are kept follow from the correlation length and the mesh" in error
    )


def test_the_field_has_its_variance(data: ReportData, tree: ElementTree.Element) -> None:
    found = rows(tree, "Variance and correlation length of the field")
    assert len(found) == 2
    for row, entry in zip(found, data.summary["field"], strict=True):
        assert number(row[0]) == entry["time"]
        assert number(row[1].removesuffix(" mV2")) == pytest.approx(entry["variance"]["value"], rel=0.001)
        assert number(row[3].removesuffix(" mm")) == entry["correlation_length"]["value"]
        low, high = (number(end) for end in row[4].removesuffix(" mm").split(" to "))
        assert (low, high) == pytest.approx(entry["correlation_length"]["interval"], abs=0.001)


def test_runs_are_counted_as_samples_and_paths(tree: ElementTree.Element) -> None:
    facts = [words(li) for li in tree.find(".//header/ul") or ()]
    assert "512 samples \N{MULTIPLICATION SIGN} 4 noise paths, Monte Carlo" in facts
    assert "1 realization failed" in facts
    said = words(section(tree, "failures"))
    assert "1 of 2048 realizations failed" in said
    assert rows(tree, "Failed realizations") == [["411", "2", "3.5", "0.2513", "13.91"]]


def test_methods_tell_the_noise(data: ReportData, tree: ElementTree.Element) -> None:
    said = words(section(tree, "methods"))
    for needed in (
        "\N{GREEK SMALL LETTER SIGMA} dW(x, t)",
        "gaussian (strength 0.02 mV, correlation length 0.5 mm), 65 modes of a ring of 40 mm",
        "expanded in 65 sines and cosines of a ring of length 40 mm",
        "the modes left out hold 6.3 \N{MULTIPLICATION SIGN} 10⁻⁵ of its variance",
        "by at most 4.1 \N{MULTIPLICATION SIGN} 10⁻⁷",
        "Euler-Maruyama method",
        "follow the same paths",
        "Each sample had 4 independent noise paths",
        "1.25 s(m)/(s(m) \N{MINUS SIGN} s(2m + 1))",
        "balanced one-way analysis of variance",
        "by Williams",
    ):
        assert needed in said
    assert "Runge-Kutta" not in said
    assert "Brownian bridge" not in said
    cited = {int(n) for group in re.findall(r"\[([\d, ]+)\]", said) for n in group.split(",")}
    sources = section(tree, "methods").findall(".//ol/li")
    assert cited == set(range(1, len(sources) + 1))
    bridged = methods_of(replace(data, model=replace(data.model, bridged=("latency",))))
    assert (
        "Between the ends of a step latency saw the extremes and first passages of the Brownian bridge"
        in bridged
    )
    assert "Gobet" in bridged


def methods_of(data: ReportData) -> str:
    """The methods of a report in words."""
    return words(section(page_tree(page_of(data)), "methods"))


def test_methods_of_other_noisy_runs(data: ReportData) -> None:
    """Quasi-Monte Carlo; without inputs; one path a sample; white noise."""
    summary: dict[str, Any] = copy.deepcopy(dict(data.summary))
    summary["sampling"] |= {"method": "quasi-monte carlo", "replicates": 16, "points_per_replicate": 32}
    said = methods_of(changed(data, summary))
    assert "Its intervals come from a jackknife over the scramblings." in said
    assert "Williams" not in said
    summary["sampling"] |= {"method": "monte carlo", "noise_repeats": 1}
    summary["inputs"] = {}
    summary["scheme"]["noise"] |= {"correlation": "white", "dropped_share": None, "image_error": 0.0}
    del summary["scheme"]["parts"]["noise_modes"]
    summary["quantities"]["drift"]["mean"]["orders"] = {}
    summary["failed"] = {"count": 0, "reasons": {}, "listed": 0, "list": []}
    said = methods_of(changed(data, summary))
    assert (
        "No input of the model is uncertain; 512 samples differ by their noise. Each sample had one noise path"
        in said
    )
    assert "min(s, t) δ(x \N{MINUS SIGN} y)" in said
    assert "of its variance" not in said
    assert "analysis of variance" not in said
    assert "modes that were left out" not in said


def test_the_terminal_has_a_block_on_noise() -> None:
    lines = result_lines(noisy_summary(), ["report.html"])
    head = next(i for i, line in enumerate(lines) if line.startswith("noise or ignorance"))
    starts = [lines[head].index(word) for word in ("variance", "of which noise", "share of the parameters")]
    first, second = lines[head + 1 : head + 3]
    cells = [first[a:b].strip() for a, b in zip(starts, [*starts[1:], None], strict=True)]
    assert cells == ["0.316 mm2 [0.290, 0.342]", "0.1218 mm2 [0.1168, 0.1267]", "61.5 % (51.6 % to 70.6 %)"]
    assert second.startswith("highest")
    assert lines[head + 3] == ""
    text = "\n".join(lines)
    assert "0.821 mV, at least 0.800" in text
    assert "open above; below: space 57 %, sampling 43 %" in text
    assert "512 samples x 4 noise paths (Monte Carlo), 1 failed" in text
    assert text.isascii()
    assert "inf" not in text
