"""Clouds of a quantity against its inputs: at their places, light, beside what they belong to."""

from __future__ import annotations

import copy

import numpy as np
import pytest

from aleafield.report.data import ReportData
from aleafield.report.figures import report_figures
from aleafield.report.figures.scatter import neighbour_means, scatter
from aleafield.report.findings import quantity_findings
from tests.report.reading import SVG, axis_of, cloud_places, page_tree, read_back, section, words
from tests.report.sample_influence import influence_report
from tests.report.test_report_page import changed, page_of


@pytest.fixture(scope="module")
def data() -> ReportData:
    return influence_report()


def test_a_cloud_shows_its_samples_at_their_places() -> None:
    """Two corners and one inside, read off both axes; half a px is the grain."""
    x, y = np.array([1.0, 2.0, 3.0, 5.0]), np.array([10.0, 20.0, np.nan, 50.0])
    drawing = scatter(("width", "mm"), y, {"a": ("1", x)}, 2000, "cloud")
    root = read_back(drawing)
    cloud = next(e for e in root.iter(f"{SVG}path") if e.get("class") == "cloud")
    places = cloud_places(cloud)
    across, along = axis_of(root, "middle", "x")
    down, upwards = axis_of(root, "end", "y")
    expected = [(across + along * a, down + upwards * b) for a, b in ((1.0, 10.0), (2.0, 20.0), (5.0, 50.0))]
    # labels stand 4 px below their ticks
    np.testing.assert_allclose(places, np.array(expected) - [0.0, 4.0], rtol=0, atol=0.3)


def test_clouds_stay_light(data: ReportData) -> None:
    """At most 2,000 points each, and with many of them at most 48,000 in all."""
    values = np.random.default_rng(5).normal(size=5000)
    one = read_back(scatter(("q", "1"), values, {"a": ("1", values)}, 2000, "cloud"))
    assert len(cloud_places(next(e for e in one.iter(f"{SVG}path") if e.get("class") == "cloud"))) <= 2000
    many = dict(data.summary)
    many["quantities"] = {f"width {i}": data.summary["quantities"]["width"] for i in range(20)}
    text = page_of(changed(data, many, values=dict.fromkeys(many["quantities"], data.values["width"])))
    assert 20_000 < text.count("h0") <= 48_000
    assert len(text.encode()) < 1_500_000


def test_no_cloud_without_two_values() -> None:
    flat, lost = np.full(10, 2.0), np.full(10, np.nan)
    x = np.arange(10.0)
    assert scatter(("q", "1"), flat, {"a": ("1", x)}, 2000, "cloud") is None
    assert scatter(("q", "1"), lost, {"a": ("1", x)}, 2000, "cloud") is None
    assert scatter(("q", "1"), x, {}, 2000, "cloud") is None


def test_means_of_neighbours() -> None:
    """Of a line they lie on it; of a discrete input they are the means of its values; few points have none."""
    x = np.random.default_rng(2).permutation(np.linspace(0.0, 1.0, 800))
    found = neighbour_means(x, 3.0 * x - 1.0)
    assert found is not None
    assert len(found[0]) == 16
    assert np.all(np.diff(found[0]) > 0)
    np.testing.assert_allclose(found[1], 3.0 * found[0] - 1.0, rtol=0, atol=1e-12)
    level = np.repeat([1.0, 2.0, 4.0], [300, 200, 100])
    by_value = neighbour_means(level, level**2)
    assert by_value is not None
    np.testing.assert_allclose(by_value, ([1.0, 2.0, 4.0], [1.0, 4.0, 16.0]), rtol=1e-12)
    assert neighbour_means(x[:50], x[:50]) is None


def test_clouds_stand_by_the_inputs_where_nothing_was_asked(data: ReportData) -> None:
    summary = copy.deepcopy(dict(data.summary))
    for entry in summary["quantities"].values():
        entry |= {"sensitivity": {}, "measure_next": {}, "pin_down": []}
    plain = changed(data, summary)
    figures = report_figures(plain, quantity_findings(summary))
    assert [f.quantity for f in figures if f.section == "inputs"] == list(summary["quantities"])
    assert "width against its inputs" in words(section(page_tree(page_of(plain)), "inputs"))
