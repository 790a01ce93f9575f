"""The lines for a terminal: aligned, plain where they must be, complete."""

from __future__ import annotations

import re

from aleafield.report.terminal import result_lines
from tests.report.sample_report import sample_summary


def test_columns_are_aligned_and_plain() -> None:
    lines = result_lines(sample_summary(), ["report.html", "summary.json"])
    table = lines[:4]
    starts = [table[0].index(head) for head in ("mean and 95 % interval", "spread (sd)", "error comes from")]
    for line in table[1:]:
        for start in starts:
            assert line[start - 2 : start] == "  "
            assert line[start] != " "
    assert table[1].split("  ")[0] == "width"
    assert "3.142 mm [3.114, 3.169]" in table[1]
    assert "sampling 54 %, space 34 %" in table[1]
    assert all("\x1b" not in line and line == line.rstrip() for line in lines)


def test_everything_is_said() -> None:
    text = "\n".join(result_lines(sample_summary(), ["report.html", "summary.json"]))
    for needed in (
        "quantile 0.95    not determined by 64 samples: at least 72 are needed",
        "P(above 4.0 mm)",
        "P(occurs)",
        "2048 samples (quasi-Monte Carlo), 2 failed",
        "19 % of the work for the error split",
        "aim met: the mean of width is known to 0.0277",
        "warning: 2000 samples asked",
        "files: report.html, summary.json",
    ):
        assert needed in text
    assert text.isascii()


def test_colour_adds_a_bar_of_fixed_width_and_nothing_else() -> None:
    plain = result_lines(sample_summary())
    coloured = result_lines(sample_summary(), colour=True)
    stripped = [re.sub("\x1b\\[[0-9]+m", "", line) for line in coloured]
    for line, bare in zip(stripped[1:4], plain[1:4], strict=True):
        assert line.count("\N{FULL BLOCK}") == 20
        assert line.replace("\N{FULL BLOCK}" * 20 + "  ", "") == bare
    assert stripped[4:] == plain[4:]


def test_an_aim_that_is_missed_is_loud() -> None:
    summary = sample_summary()
    summary["aim"] |= {"met": False, "reason": "why"}
    assert "aim MISSED: why" in result_lines(summary)
