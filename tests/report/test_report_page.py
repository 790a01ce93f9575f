"""The page: whole, self-contained, escaped, and true to the summary."""

from __future__ import annotations

import copy
import dataclasses
import re
from typing import Any

import numpy as np
import pytest

from aleafield.report.caution import CAUTION
from aleafield.report.data import ReportData
from aleafield.report.figures import report_figures
from aleafield.report.findings import quantity_findings
from aleafield.report.markup import element, escaped
from aleafield.report.notebook import html_table
from aleafield.report.page import SECTIONS, page
from aleafield.report.rounding import DASH
from tests.report.reading import number, page_tree, rows, section, words
from tests.report.sample_report import STUDY_TEXT, sample_report, undetermined


def page_of(data: ReportData) -> str:
    """The page of a report with all its figures."""
    return page(data, report_figures(data, quantity_findings(data.summary)))


def changed(data: ReportData, summary: dict[str, Any], **others: Any) -> ReportData:
    """The report with another summary."""
    return dataclasses.replace(data, summary=summary, **others)


@pytest.fixture(scope="module")
def data() -> ReportData:
    return sample_report()


@pytest.fixture(scope="module")
def text(data: ReportData) -> str:
    return page_of(data)


def test_nothing_comes_from_elsewhere(text: str) -> None:
    assert "http" not in text
    assert "@import" not in text
    assert "url(" not in text
    tree = page_tree(text)
    for element_ in tree.iter():
        assert element_.tag not in ("link", "iframe", "object", "embed", "base")
        assert element_.get("src") is None
        target = element_.get("href") or "#"
        assert target.startswith(("#", "data:image/png;base64,"))
    assert len(list(tree.iter("script"))) == 1


def test_links_lead_somewhere_and_identifiers_are_unique(text: str) -> None:
    tree = page_tree(text)
    names = [e.get("id") for e in tree.iter() if e.get("id")]
    assert len(names) == len(set(names))
    targets = {(e.get("href") or "")[1:] for e in tree.iter("a")}
    assert targets == {name for name, _ in SECTIONS} - {"noise", "time", "causes", "next"}  # not asked
    assert targets <= set(names)


def test_less_than_a_megabyte(data: ReportData, text: str) -> None:
    """Also with the finest maps and twenty quantities."""
    assert len(text.encode()) < 200_000
    many = dict(data.summary)
    width = data.summary["quantities"]["width"]
    many["quantities"] = {f"width {i}": width for i in range(20)}
    noise = np.random.default_rng(1)
    assert data.fields is not None
    rough = dataclasses.replace(
        data.fields, mean=noise.normal(size=data.fields.mean.shape), sd=noise.random(data.fields.sd.shape)
    )
    values = dict.fromkeys(many["quantities"], data.values["width"])
    assert len(page_of(changed(data, many, values=values, fields=rough)).encode()) < 1_000_000


def test_data_cannot_become_markup(data: ReportData) -> None:
    """Whatever a study's words are, they come back from the page as they went in."""
    evil = "</title><script>alert('x')</script> & \"quoted\" <b>"
    summary = copy.deepcopy(dict(data.summary))
    summary["quantities"] = {evil: summary["quantities"]["width"]}
    summary["quantities"][evil]["units"] = "<mm>"
    summary["inputs"] = {evil: {"law": evil, "units": evil, "mean": 1.0, "sd": 1.0}}
    summary["warnings"] = [evil]
    summary["quantities"][evil]["mean"]["notes"] = [evil]
    hostile = changed(data, summary, title=evil, about=evil, study_text=evil, values={evil: np.arange(9.0)})
    tree = page_tree(page_of(hostile))
    assert words(tree.find("head/title")) == evil  # type: ignore[arg-type]
    assert words(tree.find(".//h1")) == evil  # type: ignore[arg-type]
    assert words(section(tree, "study")) == f"The study{evil}"
    assert len(list(tree.iter("script"))) == 1
    assert not [b for b in tree.iter("b") if words(b) == ""]


def test_characters_that_markup_forbids_are_shown_as_unknown() -> None:
    assert escaped("a\x00b\x0bc\ud800d") == "a\ufffdb\ufffdc\ufffdd"
    assert element("p", "1 < 2", class_='a"b', title=None) == '<p class="a&quot;b">1 &lt; 2</p>'


def test_study_text_is_verbatim(text: str) -> None:
    code = section(page_tree(text), "study").find("pre/code")
    assert code is not None
    assert code.text == STUDY_TEXT


def test_numbers_equal_the_summary(data: ReportData, text: str) -> None:
    """Values and ends on the page are the summary's, to half a unit and to one unit of the last place."""
    tree = page_tree(text)
    checked = 0
    for name, entry in data.summary["quantities"].items():
        stated = {"mean": entry["mean"], "standard deviation": entry["sd"]}
        stated |= {f"quantile {key}": found for key, found in entry["quantiles"].items()}
        for label, value, interval, half_width, _ in rows(tree, f"How uncertain {name} is"):
            found = stated.pop(label)
            if found["value"] is None:
                assert value == found["reason"]
                assert (interval, half_width) == (DASH, DASH)
                continue
            units = f" {entry['units']}"
            shown = value.removesuffix(units)
            last = _last_place(shown)
            assert abs(number(shown) - found["value"]) <= 0.5 * last * (1 + 1e-9)
            low, high = (number(end) for end in interval.removesuffix(units).split(" to "))
            assert found["interval"][0] - last < low <= found["interval"][0] * (1 + 1e-15)
            assert found["interval"][1] * (1 - 1e-15) <= high < found["interval"][1] + last
            assert number(half_width) == pytest.approx(found["error"]["total"], rel=0.1)
            assert last * 10 <= found["error"]["total"] * (1 + 1e-9) < last * 100
            checked += 1
        assert not stated
    assert checked == 5 + 4 + 2


def _last_place(shown: str) -> float:
    """One unit of the last place of a number as the page writes it."""
    mantissa = shown.partition(" ")[0]
    decimals = len(mantissa.partition(".")[2])
    power = number(shown) / number(mantissa) if number(mantissa) else 1.0
    return float(power * 10.0**-decimals)


def test_probabilities_stand_in_one_table(data: ReportData, text: str) -> None:
    found = rows(page_tree(text), "How likely it is")
    assert [row[:2] for row in found] == [
        ["width", "P(above 3.5 mm)"],
        ["width", "P(above 4.0 mm)"],
        ["width", "P(occurs)"],
        ["peak height", "P(above 0.9 mV)"],
        ["crossing <time>", "P(occurs)"],
    ]
    width = data.summary["quantities"]["width"]
    assert number(found[1][2]) == pytest.approx(width["exceed"]["4.0"]["value"], abs=0.00005)


def test_parts_that_do_not_apply_are_a_dash(text: str) -> None:
    table = rows(page_tree(text), "Error parts of width (mm; probabilities without unit)")
    mean = table[0]
    assert mean[0] == "mean"
    # space, quadrature, time, noise modes, surrogate, noise of the biases, sampling, total
    assert mean[1:] == ["0.0093", "0.0031", "0.00021", DASH, DASH, "0.0011", "0.015", "0.028"]


def test_the_page_says_what_dominates_and_what_to_do(text: str) -> None:
    said = words(section(page_tree(text), "error"))
    assert "54 % of the half-width (0.028 mm) of the mean of width comes from sampling." in said
    assert "66 % of the half-width (0.011 mV) of the mean of peak height comes from space." in said
    assert "refine the mesh" in said
    assert "take more samples" in said


def test_answers_are_sentences(text: str) -> None:
    said = words(section(page_tree(text), "answers"))
    assert (
        "The mean of width, where it occurs, is 3.142 mm; with 95 % confidence it lies between 3.114 and "
        "3.169 mm." in said
    )
    assert "It occurs with probability 0.9941" in said
    assert "The aim of the study is met" in said


def test_methods_have_their_numbers(data: ReportData, text: str) -> None:
    said = words(section(page_tree(text), "methods"))
    for needed in (
        "piecewise linear collocation with 257 nodes",
        "trapezoid rule with 257 points",
        "120 steps of at most 0.5 ms",
        "2048 samples: 16 independent scramblings",
        "128 points each",
        "measured on 128 of the samples",
        "95 % confidence",
        "The seed was 20261201",
        data.provenance.digest,
        "numpy 2.4.6",
        "inhibition: gaussian (strength uniform(-1.0, -0.8) mV, width 2.0 mm)",
    ):
        assert needed in said
    cited = {int(n) for group in re.findall(r"\[([\d, ]+)\]", said) for n in group.split(",")}
    sources = section(page_tree(text), "methods").findall(".//ol/li")
    assert cited == set(range(1, len(sources) + 1))


def test_caution_failures_and_warnings(data: ReportData, text: str) -> None:
    tree = page_tree(text)
    assert words(tree.find(".//aside")) == f"Caution{CAUTION}"  # type: ignore[arg-type]
    said = words(section(tree, "failures"))
    assert "2 of 2048 samples failed (2 not finite)" in said
    assert data.summary["warnings"][0] in said
    assert rows(tree, "Failed samples") == [
        ["411", "3.5", "0.2513", "13.91"],
        ["1902", DASH, "0.2498", "14.02"],
    ]


def test_a_run_without_inputs(data: ReportData) -> None:
    """One run, no sampling, no field, no values, no aim: every section still stands and says so."""
    summary = copy.deepcopy(dict(data.summary))
    zero = {"value": 2.5, "error": {"space": 0.01, "total": 0.01}, "interval": [2.49, 2.51]}
    certain = {"value": 0.0, "error": {"total": 0.0}, "interval": [0.0, 0.0]}
    entry = {"units": "1", "mean": zero, "sd": certain, "quantiles": {}, "exceed": {}, "occurs": None}
    entry["variance"] = None
    summary |= {"quantities": {"norm": entry}, "inputs": {}, "sampling": None, "aim": None, "warnings": []}
    summary["failed"] = {"count": 0, "reasons": {}, "listed": 0, "list": []}
    tree = page_tree(page_of(changed(data, summary, fields=None, values={})))
    assert "2.500" in words(section(tree, "answers"))
    assert "No input is uncertain." in words(section(tree, "inputs"))
    assert "No sample failed. No warnings." in words(section(tree, "failures")).replace(
        "failed.No", "failed. No"
    )
    assert "one run was made" in words(section(tree, "methods"))
    assert "100 % of the half-width (0.010) of the mean of norm comes from space." in words(
        section(tree, "error")
    )


def test_everything_undetermined(data: ReportData) -> None:
    """Reasons stand where numbers would, also where a part of the error is known."""
    summary = copy.deepcopy(dict(data.summary))
    reason = "not determined by 16 samples: at least 64 are needed"
    lost = {
        "value": None,
        "error": {"sampling": 0.1, "total": None},
        "interval": None,
        "reason": "a lost part",
    }
    nothing = undetermined(reason)
    entry = summary["quantities"]["width"]
    entry |= {
        "mean": lost,
        "sd": nothing,
        "quantiles": {"0.5": nothing},
        "exceed": {"1.0": nothing},
        "occurs": nothing,
    }
    summary["quantities"] = {"width": entry}
    tree = page_tree(page_of(changed(data, summary)))
    assert "The mean of width, where it occurs, is not determined: a lost part." in words(
        section(tree, "answers")
    )
    table = rows(tree, "How uncertain width is")
    assert table[0][1:4] == ["a lost part", DASH, DASH]
    assert table[1][1:4] == [reason, DASH, DASH]
    assert rows(tree, "How likely it is")[0][2] == reason


def test_a_one_sided_bound(data: ReportData) -> None:
    summary = copy.deepcopy(dict(data.summary))
    summary["quantities"]["width"]["mean"] = {"value": 3.1, "error": {"total": None}, "interval": [3.0, None]}
    said = words(section(page_tree(page_of(changed(data, summary))), "answers"))
    assert "is 3.10 mm; with 95 % confidence it lies at least 3.00 mm" not in said
    assert "is 3.10 mm; with 95 % confidence it is at least 3.00 mm." in said


def test_notebook_table(data: ReportData) -> None:
    fragment = html_table(data.summary)
    tree = page_tree(f"<!doctype html>\n{fragment}")
    first = rows(tree, "Mean and spread of every quantity")[0]
    assert first[:3] == ["width", "3.142 mm", "3.114 to 3.169 mm"]
    assert "2 samples failed" in words(tree)
