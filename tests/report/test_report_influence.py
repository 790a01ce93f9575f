"""Which input causes it and what to measure next: figures, tables and sentences against the summary."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ElementTree
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from aleafield.report.data import ReportData
from aleafield.report.figures import figure_files, report_figures
from aleafield.report.figures.index_bars import MOST_INPUTS, index_bars
from aleafield.report.figures.remaining_spread import remaining_spread
from aleafield.report.findings import quantity_findings
from aleafield.report.influence import Influence, Measurement, influences, measurements
from aleafield.report.influence_words import fixing, leading, narrowing, order, pinned, together, undetermined
from aleafield.report.page import SECTIONS
from aleafield.report.terminal import result_lines
from tests.report.reading import SVG, axis_of, number, page_tree, read_back, rows, section, words
from tests.report.sample_influence import (
    GAIN,
    NO_EXCHANGE,
    STRENGTH,
    WIDTH,
    WIDTH_FIRST,
    WIDTH_TOTAL,
    H,
    dependent_report,
    index,
    influence_report,
    influence_summary,
    noisy_influence_report,
)
from tests.report.sample_report import undetermined as nothing
from tests.report.test_report_page import changed, page_of


@pytest.fixture(scope="module")
def data() -> ReportData:
    return influence_report()


@pytest.fixture(scope="module")
def tree(data: ReportData) -> ElementTree.Element:
    return page_tree(page_of(data))


def with_width(**members: Any) -> tuple[Influence, Measurement]:
    """What is said of width when members of its entry differ."""
    summary = influence_summary()
    summary["quantities"]["width"] |= members
    return influences(summary)[0], measurements(summary)[0]


def only_first(values: dict[str, dict[str, Any]]) -> Influence:
    """First-order indices by input, and no ranking."""
    return with_width(sensitivity={path: {"first": found} for path, found in values.items()}, ranking=None)[0]


def test_sections_stand_where_they_are_asked(tree: ElementTree.Element) -> None:
    names = [e.get("id") for e in tree.iter("section")]
    assert names == [name for name, _ in SECTIONS if name not in ("noise", "time")]
    quiet = influence_report()
    summary = influence_summary()
    for entry in summary["quantities"].values():
        entry |= {"sensitivity": {}, "measure_next": {}, "pin_down": [], "notes": []}
    names = [e.get("id") for e in page_tree(page_of(changed(quiet, summary))).iter("section")]
    assert not {"causes", "next"} & set(names)


def test_figures_are_files_that_speak(data: ReportData) -> None:
    for report in (data, dependent_report(), noisy_influence_report()):
        files = figure_files(report_figures(report, quantity_findings(report.summary)))
        first = next(iter(report.summary["quantities"]))
        assert {f"causes-{first}.svg", f"scatter-{first}.svg"} <= set(files)
        for name, text in files.items():
            root = ElementTree.fromstring(text)
            told = {e.get("id"): words(e) for e in root if e.tag in (f"{SVG}title", f"{SVG}desc")}
            assert all(told[key] for key in (root.get("aria-labelledby") or "").split()), name
            assert not re.search(r"\b(nan|inf)\b", text.lower()), name


def test_bars_have_their_lengths_and_order(data: ReportData) -> None:
    """Read off against the axis: 0.05 px of 600 for the whole range is 1e-4."""
    root = read_back(index_bars(influences(data.summary)[0], "bars"))
    offset, slope = axis_of(root, "middle", "x")
    for kind, stated in (("first", WIDTH_FIRST), ("total", WIDTH_TOTAL)):
        bars = [r for r in root.iter(f"{SVG}rect") if r.get("class") == f"part-index-{kind}"][
            1:
        ]  # the legend's
        found = [(float(r.get("x") or 0) - offset + float(r.get("width") or 0)) / slope for r in bars]
        expected = sorted(WIDTH_TOTAL, key=lambda path: -WIDTH_TOTAL[path])
        assert [words(r).split(", ")[1].split(":")[0] for r in bars] == expected
        np.testing.assert_allclose(found, [stated[path] for path in expected], rtol=0, atol=1e-3)


def test_whiskers_reach_their_ends(data: ReportData) -> None:
    """The ends of an interval, cut to what a share can be."""
    root = read_back(index_bars(influences(data.summary)[0], "bars"))
    offset, slope = axis_of(root, "middle", "x")
    lines = [e for e in root.iter(f"{SVG}line") if e.get("class") == "whisker" and e.get("y1") == e.get("y2")]
    found = [tuple((float(e.get(k) or 0) - offset) / slope for k in ("x1", "x2")) for e in lines]
    stated = data.summary["quantities"]["width"]["sensitivity"]
    paths = sorted(WIDTH_TOTAL, key=lambda path: -WIDTH_TOTAL[path])
    expected = [
        np.clip(stated[path][kind]["interval"], 0.0, 1.0) for path in paths for kind in ("first", "total")
    ]
    np.testing.assert_allclose(found, expected, rtol=0, atol=1e-3)


def test_noise_is_a_bar_of_its_own() -> None:
    report = noisy_influence_report()
    root = read_back(index_bars(influences(report.summary)[0], "bars"))
    bars = [r for r in root.iter(f"{SVG}rect") if r.get("class") == "part-noise"]
    assert [words(r) for r in bars][1] == "total, noise: 0.385, 0.291 to 0.479"
    assert "not determined" not in [words(t) for t in root.iter(f"{SVG}text")]  # totals have no bars at all
    said = words(section(page_tree(page_of(report)), "causes"))
    assert "The noise holds 0.385 (0.291 to 0.479) of the variance" in said
    assert "Total indices for drift: not determined under noise: it depends on how paths are coupled." in said


def test_tables_hold_what_the_summary_has(data: ReportData, tree: ElementTree.Element) -> None:
    stated = data.summary["quantities"]["width"]
    found = rows(tree, "Indices of width")
    assert [row[0] for row in found] == [H, WIDTH, GAIN, STRENGTH]
    for path, first, total, _ in found:
        for kind, cell in (("first", first), ("total", total)):
            value, low, high = (number(n) for n in re.findall(r"[0-9.]+", cell))
            entry = stated["sensitivity"][path][kind]
            assert abs(value - entry["value"]) <= 0.0005
            assert entry["interval"][1] <= high < entry["interval"][1] + 0.001
            assert max(entry["interval"][0], 0) - 0.001 < low <= max(entry["interval"][0], 0)
    pairs = rows(tree, "Pairs of inputs that act together on width")
    assert len(pairs) == 6
    assert pairs[0][:2] == [f"{H} with {WIDTH}", "0.1920"]
    next_ = rows(tree, "What to measure next for width")
    assert [(row[0], row[3]) for row in next_] == [(H, "no"), (WIDTH, "no"), (GAIN, "no"), (STRENGTH, "yes")]
    assert next_[0][1] == "0.3169 mm (0.3089 to 0.3249 mm)"
    assert rows(tree, "Indices of peak height")[0][2] == NO_EXCHANGE


def test_error_parts_of_indices_stand_in_a_table(tree: ElementTree.Element) -> None:
    found = rows(tree, "Error parts of the indices of width (shares of the variance)")
    assert len(found) == 8 + 6
    # space, quadrature, time, noise modes, surrogate, noise of the biases, sampling, total
    assert found[1][0] == f"total, {H}"
    assert [found[1][i] for i in (1, 5, 7)] == ["0.002", "0.012", "0.009"]


def test_sentences_on_width(data: ReportData) -> None:
    influence = influences(data.summary)[0]
    assert leading(influence) == (
        "h matters most for width: its total index is 0.614 (0.590 to 0.638). That none exceeds it is 99.8 % "
        "certain at least."
    )
    assert f"In order: h, {WIDTH} (99.8 %), {GAIN} (over 99.9 %), {STRENGTH} (91 %)." in order(
        influence, "95 %"
    )
    said = together(influence)
    assert said.startswith(f"Acting together, beyond what each does alone: h with {WIDTH}, 0.1920 (")
    assert f"h with {GAIN}" in said
    assert said.endswith("No other pair can hold more than 0.0081 of the variance.")
    assert undetermined(influence) == []


def test_a_ranking_by_another_index_is_not_quoted() -> None:
    """Certainty of the order by total says nothing of one by first order."""
    ranking = {
        "by": "total",
        "order": [H, WIDTH, GAIN, STRENGTH],
        "above_next": [0.99, 0.99, 0.99],
        "first_is_largest": 0.99,
    }
    found, _ = with_width(
        sensitivity={p: {"first": index(v)} for p, v in WIDTH_FIRST.items()}, ranking=ranking
    )
    assert "certain" not in leading(found)
    assert "No other interval reaches it" in leading(found)


def test_a_ranking_that_is_not_sure_says_so() -> None:
    found = only_first({H: index(0.481), WIDTH: index(0.466), GAIN: index(0.043), STRENGTH: index(0.04)})
    assert leading(found).endswith(
        f"Its interval is not clear of {WIDTH}, so that the first place is not sure."
    )
    assert order(found, "95 %") == (
        f"The order that the 95 % intervals leave no doubt about: h and {WIDTH} (in no sure order); then {GAIN} and "
        f"{STRENGTH} (in no sure order)."
    )
    level = only_first({H: index(0.3), WIDTH: index(0.3), GAIN: index(0.3)})
    assert order(level, "95 %").endswith("overlap: their order is not sure.")
    doubtful, _ = with_width(
        ranking={
            "by": "total",
            "order": [H, WIDTH, GAIN, STRENGTH],
            "above_next": [0.6, 1.0, 1.0],
            "first_is_largest": 0.0,
        }
    )
    assert "That none exceeds it is not certain at all." in leading(doubtful)


def test_tiers_are_cut_where_every_interval_is_clear() -> None:
    """By hand: 0.2 with 0.0144 + 0.14 reaches from 0.045 to 0.355, over those at 0.3 and 0.04; 0.6 is clear."""
    wide = index(0.2, sampling=0.14)
    found = only_first({H: index(0.6), WIDTH: index(0.3), GAIN: wide, STRENGTH: index(0.04)})
    assert [[one.path for one in tier] for tier in found.tiers()] == [[H], [WIDTH, GAIN, STRENGTH]]


def test_interactions_without_pairs() -> None:
    """Totals above first order tell who acts with others, not with whom."""
    stated = {p: {"first": index(WIDTH_FIRST[p]), "total": index(WIDTH_TOTAL[p])} for p in WIDTH_FIRST}
    found, _ = with_width(sensitivity=stated)
    assert together(found) == (
        f"h and {WIDTH} act in combination with other inputs: their total index lies clearly above the first-order "
        "one."
    )
    additive, _ = with_width(
        sensitivity={p: {"first": index(0.25), "total": index(0.25)} for p in WIDTH_FIRST}
    )
    assert together(additive) == ""


def test_noise_alone_is_drawn_where_the_inputs_have_no_indices() -> None:
    report = noisy_influence_report()
    entry = report.summary["quantities"]["drift"]["sensitivity"]
    lost = {path: {"first": nothing("too few points")} for path in (H, WIDTH)} | {"noise": entry["noise"]}
    report.summary["quantities"]["drift"]["sensitivity"] = lost
    root = read_back(index_bars(influences(report.summary)[0], "bars"))
    labels = [words(t) for t in root.iter(f"{SVG}text")]
    assert "noise" in labels
    assert H not in labels
    said = words(section(page_tree(page_of(report)), "causes"))
    assert "First-order indices for drift: not determined (too few points)." in said
    assert "Across the bars: their intervals. Noise: the share that stays" in said


def test_pairs_that_are_not_seen() -> None:
    """Small for sure, or not sure at all: neither is told."""
    for second in (index(0.0001, 0.0, 0.0), index(0.004, 0.0001, 0.0), index(0.02, 0.01, 0.02)):
        second["interval"][0] = second["value"] / 2 if second["value"] < 0.01 else -0.01
        found, _ = with_width(
            sensitivity={H: {"second": {WIDTH: second}}, WIDTH: {"second": {H: second}}}, ranking=None
        )
        assert len(found.pairs) == 1
        assert together(found).startswith(
            "No pair of inputs is seen to act together to speak of, and none can hold more than"
        )
    lost, _ = with_width(sensitivity={H: {"second": {WIDTH: nothing("too few rows")}}, WIDTH: {}})
    assert undetermined(lost) == ["Second-order indices for width: not determined (too few rows)."]
    assert index_bars(lost, "bars") is None


def test_dependent_inputs_have_shapley_effects_and_the_reason() -> None:
    said = words(section(page_tree(page_of(dependent_report())), "causes"))
    assert "even where inputs depend on each other" in said
    assert f"rank correlation 0.6 of {H} and {GAIN}" in said
    assert "its Shapley effect is 0.512" in said
    following = words(section(page_tree(page_of(dependent_report())), "next"))
    assert "What measuring an input would bring for width: not determined: the inputs depend" in following


def test_what_to_measure_next(data: ReportData) -> None:
    width, peak = measurements(data.summary)
    assert pinned(width, width.sets[0]) == (
        f"To bring the standard deviation of width down to 0.2 mm, pin down h and {WIDTH}: 0.153 mm is expected to "
        "stay (no smaller set suffices)."
    )
    assert narrowing(width).startswith(
        "Of single inputs, h would narrow width most: known exactly, it would leave"
    )
    assert fixing(width).startswith(f"{STRENGTH} may be fixed at its middle without changing width")
    assert "is not determined: that takes total indices" in fixing(peak)


def test_other_outcomes_of_pinning_down() -> None:
    def said(**members: Any) -> str:
        entry = {"inputs": [H], "remaining_sd": 0.19, "wanted_sd": 0.2, "exhaustive": False} | members
        _, found = with_width(pin_down=[entry])
        return pinned(found, found.sets[0])

    assert "found by a search that may have missed a smaller set" in said()
    assert said(inputs=[]) == (
        "Nothing need be measured: the standard deviation of width is within 0.2 mm already."
    )
    lost = said(inputs=None, remaining_sd=None, reason="with all inputs known it stays above")
    assert lost.startswith("Nothing that can be learnt of the inputs surely brings")
    assert lost.endswith("with all inputs known it stays above.")


def test_marks_of_the_remaining_spread_are_where_the_axis_says(data: ReportData) -> None:
    found = measurements(data.summary)[0]
    root = read_back(remaining_spread(found, "next"))
    offset, slope = axis_of(root, "middle", "x")
    legend_ends = 20.0
    for kind, member in (("dot", "known"), ("ring", "halved")):
        marks = [
            e
            for e in root.iter(f"{SVG}circle")
            if e.get("class") == kind and float(e.get("cy") or 0) > legend_ends
        ]
        seen = [(float(e.get("cx") or 0) - offset) / slope for e in marks]
        stated = [getattr(one, member).value for one in found.measures]
        expected = [*stated, 0.1532] if kind == "dot" else stated
        np.testing.assert_allclose(seen, expected, rtol=0, atol=5e-4)
    limit = next(e for e in root.iter(f"{SVG}line") if e.get("class") == "limit")
    assert (float(limit.get("x1") or 0) - offset) / slope == pytest.approx(0.2, abs=5e-4)
    now = [e for e in root.iter(f"{SVG}line") if e.get("class") == "now"][-1]
    assert (float(now.get("x1") or 0) - offset) / slope == pytest.approx(0.41326, abs=5e-4)


def test_many_inputs_are_cut_in_pictures_and_kept_in_tables(data: ReportData) -> None:
    summary = influence_summary()
    values = np.linspace(0.5, 0.01, 40)
    summary["quantities"]["width"] |= {
        "sensitivity": {f"mode {i}": {"first": index(float(v))} for i, v in enumerate(values)},
        "ranking": None,
    }
    drawn = read_back(index_bars(influences(summary)[0], "bars"))
    assert len([t for t in drawn.iter(f"{SVG}text") if words(t).startswith("mode")]) == MOST_INPUTS
    tree = page_tree(page_of(changed(data, summary)))
    assert len(rows(tree, "Indices of width")) == 40
    assert "The 24 most important of 40 inputs" in words(section(tree, "causes"))
    assert "and 32 less important inputs" in result_lines(summary)


def test_the_surrogate_is_a_part_like_others(data: ReportData, tree: ElementTree.Element) -> None:
    """0.0061 of 0.0093 + 0.00021 + 0.0061 + 0.001 is 37 %; the largest, space, is 56 %."""
    said = words(section(tree, "error"))
    assert "surrogate (37 %): give the surrogate more runs" in said
    assert "Of width, mean and standard deviation come from a surrogate" in words(section(tree, "spread"))
    facts = [words(e) for e in tree.iterfind(".//header/ul/li")]
    assert "polynomial chaos: accepted for 1 of 3 quantities" in facts


def test_methods_tell_where_indices_come_from(tree: ElementTree.Element) -> None:
    said = words(section(tree, "methods"))
    assert "For width a polynomial chaos expansion" in said
    assert "64 further runs at independent points that fitted nothing" in said
    assert "Those of width were read off the coefficients of the expansion" in said
    assert "First-order indices of peak height come from the samples themselves" in said
    assert "further runs:" not in said.partition("Influence of the inputs")[2].partition("Errors.")[0]
    cited = {int(n) for group in re.findall(r"\[([\d, ]+)\]", said) for n in group.split(",")}
    assert cited == set(range(1, len(section(tree, "methods").findall(".//ol/li")) + 1))


def test_methods_of_exchanged_runs_and_of_a_refused_surrogate(data: ReportData) -> None:
    summary = influence_summary()
    del summary["quantities"]["width"], summary["quantities"]["crossing <time>"]
    summary["sampling"]["further_runs"]["exchange"] = 256 * 9
    report = changed(data, summary)
    said = words(section(page_tree(page_of(report)), "methods"))
    assert "no surrogate passed its test" in said
    assert "2304 further runs: 256 pairs of points between which single inputs were exchanged" in said
    facts = [words(e) for e in page_tree(page_of(report)).iterfind(".//header/ul/li")]
    assert "polynomial chaos: refused" in facts
    joint = replace(dependent_report(), summary=dependent_report().summary)
    said = words(section(page_tree(page_of(joint)), "methods"))
    assert "They depend on one another: rank correlation 0.6" in said
    assert "Shapley effects [" in said


def test_the_terminal_has_a_block_for_each_quantity(data: ReportData) -> None:
    lines = result_lines(data.summary)
    at = next(i for i, line in enumerate(lines) if line.startswith("causes of width"))
    assert lines[at].split() == ["causes", "of", "width", "first", "order", "total"]
    assert re.fullmatch(r"h +0\.412 \[0\.388, 0\.436\]  0\.614 \[0\.590, 0\.638\]", lines[at + 1])
    text = "\n".join(lines)
    assert "Total indices for peak height: not determined: 64 samples are too few" in text
    assert "pin down h and kernel.excitation.width: 0.153 mm is expected to stay" in text
    assert text.isascii()
    noisy = "\n".join(result_lines(noisy_influence_report().summary))
    assert re.search(r"noise, total +0\.385 \[0\.291, 0\.479\]", noisy)
