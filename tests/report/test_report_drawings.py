"""Drawings: valid files, right places, readable pictures, colours that stay apart."""

from __future__ import annotations

import base64
import struct
import xml.etree.ElementTree as ElementTree
import zlib

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.report.data import ReportData
from aleafield.report.figures import figure_files, report_figures
from aleafield.report.figures.distribution import histogram
from aleafield.report.figures.error_split import error_split
from aleafield.report.figures.field_maps import even_grid
from aleafield.report.findings import quantity_findings
from aleafield.report.image import png
from aleafield.report.palette import DARK, LIGHT, linear_light, map_colours, perceptual
from aleafield.report.parts import CAUSES, INDICES, NOISE, PARTS
from aleafield.report.svg import Frame
from tests.report.reading import SVG, words
from tests.report.sample_report import sample_report


@pytest.fixture(scope="module")
def data() -> ReportData:
    return sample_report()


@pytest.fixture(scope="module")
def files(data: ReportData) -> dict[str, str]:
    return figure_files(report_figures(data, quantity_findings(data.summary)))


def test_every_figure_is_valid_and_speaks(files: dict[str, str]) -> None:
    """Well-formed XML with a title, a description, the role of an image, and nothing from elsewhere."""
    assert len(files) == 10
    for name, text in files.items():
        root = ElementTree.fromstring(text)
        assert root.tag == f"{SVG}svg"
        assert root.get("role") == "img"
        named = {e.get("id"): words(e) for e in root if e.tag in (f"{SVG}title", f"{SVG}desc")}
        assert all(named[key] for key in (root.get("aria-labelledby") or "").split()), name
        for element in root.iter():
            assert (element.get("href") or "data:").startswith("data:image/png;base64,") or not element.get(
                "href"
            )
            assert all(value not in ("nan", "inf", "-inf") for value in element.attrib.values()), name
        assert "NaN" not in text


def test_frame_maps_data_to_places() -> None:
    frame = Frame(10, 20, 100, 50, (0.0, 4.0), (-1.0, 1.0))
    assert (frame.x(0.0), frame.x(1.0), frame.x(4.0)) == (10, 35, 110)
    assert (frame.y(-1.0), frame.y(0.0), frame.y(1.0)) == (70, 45, 20)
    flat = Frame(0, 0, 10, 10, (3.0, 3.0), (0.0, 0.0))
    assert flat.x(3.0) == 5
    assert flat.y(0.0) == 5


def decoded(picture: bytes) -> tuple[FloatArray, list[bytes]]:
    """Pixels of a PNG of colour type 3 without filters, read block by block with their checksums."""
    assert picture[:8] == b"\x89PNG\r\n\x1a\n"
    blocks, at = {}, 8
    while at < len(picture):
        (length,) = struct.unpack(">I", picture[at : at + 4])
        kind, content = picture[at + 4 : at + 8], picture[at + 8 : at + 8 + length]
        (checksum,) = struct.unpack(">I", picture[at + 8 + length : at + 12 + length])
        assert checksum == zlib.crc32(kind + content)
        blocks[kind] = content
        at += 12 + length
    width, height, depth, colour, *_ = struct.unpack(">IIBBBBB", blocks[b"IHDR"])
    assert (depth, colour) == (8, 3)
    rows = np.frombuffer(zlib.decompress(blocks[b"IDAT"]), np.uint8).reshape(height, width + 1)
    assert not rows[:, 0].any()
    table = [blocks[b"PLTE"][i : i + 3] for i in range(0, len(blocks[b"PLTE"]), 3)]
    return rows[:, 1:].astype(np.float64), table


def test_png_holds_its_pixels_and_colours() -> None:
    indices = np.arange(12, dtype=np.uint8).reshape(3, 4)
    colours = np.arange(36, dtype=np.uint8).reshape(12, 3)
    pixels, table = decoded(png(indices, colours))
    assert np.array_equal(pixels, indices)
    assert table[5] == bytes([15, 16, 17])


def test_the_map_shows_the_mean_field(files: dict[str, str], data: ReportData) -> None:
    """The largest pixel lies where the mean is largest: row 0 of the picture is the last time."""
    image = next(ElementTree.fromstring(files["field-mean.svg"]).iter(f"{SVG}image"))
    pixels, _ = decoded(base64.b64decode((image.get("href") or "").partition(",")[2]))
    record = data.fields
    assert record is not None
    row, column = np.unravel_index(int(pixels.argmax()), pixels.shape)
    t = record.t[-1] * (1 - (row + 0.5) / pixels.shape[0])
    x = record.x[0] + (record.x[-1] - record.x[0]) * (column + 0.5) / pixels.shape[1]
    k, j = np.unravel_index(int(record.mean.argmax()), record.mean.shape)
    # colours have 256 steps and the peak is flat: its top 1/256 is about 1.5 ms and 0.2 mm wide
    assert abs(t - record.t[k]) < 3.0
    assert abs(x - record.x[j]) < 0.4


def test_even_grid_is_exact_for_bilinear_fields() -> None:
    t, x = np.array([0.0, 1.0, 4.0, 5.0]), np.array([-2.0, 0.0, 1.0])
    grid = even_grid(3 * t[:, None] - 2 * x + t[:, None] * x, t, x)
    rows, columns = grid.shape
    at_t = 5 * (np.arange(rows) + 0.5)[:, None] / rows
    at_x = -2 + 3 * (np.arange(columns) + 0.5) / columns
    np.testing.assert_allclose(grid, 3 * at_t - 2 * at_x + at_t * at_x, rtol=0, atol=1e-12)


def test_histogram_counts_every_value() -> None:
    """Against numpy's own counts; far values are counted outside, missing ones nowhere."""
    random = np.random.default_rng(3)
    values = np.concatenate([random.normal(0.0, 1.0, 500), [50.0, -60.0, np.nan, np.nan]])
    found = histogram(values)
    assert found is not None
    assert (found.below, found.above, found.size) == (1, 1, 502)
    inside = values[np.abs(values) < 40]
    assert np.array_equal(found.counts, np.histogram(inside, found.edges)[0])
    constant = histogram(np.full(20, 2.5))
    assert constant is not None
    assert constant.counts.sum() == 20
    assert histogram(np.array([np.nan])) is None


def test_error_bars_are_cut_in_the_shares(data: ReportData) -> None:
    """Biases have their own lengths; the random parts add in quadrature and divide by their squares."""
    found = quantity_findings(data.summary)[0]
    drawing = error_split(found, "split")
    assert drawing is not None
    root = ElementTree.fromstring(drawing.document())
    bars = [r for r in root.iter(f"{SVG}rect") if "of the total" in words(r)]
    first = min(float(r.get("y") or 0) for r in bars)
    widths = {
        words(r).partition(":")[0]: float(r.get("width") or 0) + 1.5
        for r in bars
        if float(r.get("y") or 0) == first
    }
    error = data.summary["quantities"]["width"]["mean"]["error"]
    random = np.hypot(error["sampling"], error["bias_noise"])
    whole = 640.0
    assert widths["space"] == pytest.approx(whole * error["space"] / error["total"], abs=0.02)
    assert widths["quadrature"] == pytest.approx(whole * error["quadrature"] / error["total"], abs=0.02)
    assert widths["sampling"] == pytest.approx(
        whole * error["sampling"] ** 2 / random / error["total"], abs=0.02
    )


def test_no_bar_without_a_total(data: ReportData) -> None:
    peak = quantity_findings(data.summary)[1]
    drawing = error_split(peak, "split")
    assert drawing is not None
    labels = [words(t) for t in ElementTree.fromstring(drawing.document()).iter(f"{SVG}text")]
    assert "quantile 0.5" in labels
    assert "quantile 0.95" not in labels


# Simulated dichromacy on linear light (Machado, Oliveira and Fernandes 2009, severity 1; from memory)
VISION = {
    "full": np.eye(3),
    "no red cones": np.array(
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]]
    ),
    "no green cones": np.array(
        [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]]
    ),
    "no blue cones": np.array(
        [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]]
    ),
}


@pytest.mark.parametrize("vision", VISION)
@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=["light", "dark"])
def test_neighbouring_parts_stay_apart(palette: dict[str, str], vision: str) -> None:
    """Any two colours of a picture differ by 0.08 in Oklab at least; 0.02 is about what the eye just tells apart."""
    pictures = (
        [part.style for part in PARTS],
        [cause.key for cause in CAUSES],
        [*(kind.style for kind in INDICES), NOISE.key],
    )
    for names in pictures:
        colours = np.clip(linear_light([palette[f"part-{name}"] for name in names]) @ VISION[vision].T, 0, 1)
        lab = perceptual(colours)
        apart = np.linalg.norm(lab[:, None] - lab[None], axis=-1)
        assert apart[~np.eye(len(names), dtype=bool)].min() > 0.08


def contrast(first: str, second: str) -> float:
    """Contrast ratio (WCAG 2.1): relative luminance from linear light."""
    light = sorted(linear_light([first, second]) @ np.array([0.2126, 0.7152, 0.0722]))
    return float((light[1] + 0.05) / (light[0] + 0.05))


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=["light", "dark"])
def test_text_can_be_read(palette: dict[str, str]) -> None:
    """WCAG 2.1 asks 4.5 for text."""
    for name in [n.removeprefix("part-") for n in palette if n.startswith("part-")]:
        assert contrast(palette[f"part-{name}"], palette[f"on-part-{name}"]) >= 4.5, name
    for ink in ("ink", "quiet", "accent", "mark", "alarm"):
        for ground in ("paper", "panel"):
            assert contrast(palette[ink], palette[ground]) >= 4.5, (ink, ground)


def test_map_colours_run_through_lightness() -> None:
    """A spread darkens all the way; values of both signs darken away from the middle."""

    def lightness(both_signs: bool) -> FloatArray:
        return perceptual(linear_light([f"#{r:02x}{g:02x}{b:02x}" for r, g, b in map_colours(both_signs)]))[
            :, 0
        ]

    assert np.all(np.diff(lightness(False)) < 0.001)
    signed = lightness(True)
    assert np.all(np.diff(signed[:127]) > -0.001)
    assert np.all(np.diff(signed[129:]) < 0.001)
    assert abs(signed[0] - signed[-1]) < 0.06
