"""Faults in the report that its tests must see."""

from __future__ import annotations

import copy
from collections.abc import Callable, Mapping
from dataclasses import replace
from typing import Any

from aleafield.report.caution import CAUTION
from aleafield.report.findings import quantity_findings
from aleafield.report.markup import Markup, escaped
from aleafield.report.page import page
from aleafield.report.rounding import DASH, earned
from aleafield.report.terminal import result_lines
from tests.report import test_report_page, test_report_rounding, test_report_terminal
from tests.report.sample_report import sample_report
from tests.teeth.biting import Check, Tooth, assert_bites, everywhere, teeth


def on_the_page(test: Callable[..., None], with_data: bool = False) -> Check:
    """A test of the page's text, of a page written when the check runs."""

    def check() -> None:
        data = sample_report()
        text = test_report_page.page_of(data)
        test(data, text) if with_data else test(text)

    return check


def other_numbers(summary: Mapping[str, Any]) -> Any:
    """Every mean a per cent larger than in the summary."""
    changed = copy.deepcopy(dict(summary))
    for entry in changed["quantities"].values():
        if entry["mean"]["value"] is not None:
            entry["mean"]["value"] *= 1.01
    return quantity_findings(changed)


def inwards(value: Any, interval: Any, total: Any) -> Any:
    """Ends rounded to the nearest, so that the printed interval may be shorter than the stated one."""
    return replace(earned(value, interval, total), low=f"{interval[0]:.3f}", high=f"{interval[1]:.3f}")


def escaped_twice(text: str) -> Markup:
    """Data whose ampersands are escaped again."""
    return text if isinstance(text, Markup) else escaped("" + escaped(text))


def without(words: str, by: str = "") -> Callable[..., str]:
    """The page with words left out or replaced."""
    return lambda *arguments: page(*arguments).replace(words, by)


@teeth(
    Tooth(
        "numbers that are not the summary's",
        everywhere(quantity_findings, other_numbers),
        on_the_page(test_report_page.test_numbers_equal_the_summary, with_data=True),
    ),
    Tooth(
        "a caution that is left out",
        everywhere(page, without(CAUTION)),
        on_the_page(test_report_page.test_caution_failures_and_warnings, with_data=True),
    ),
    Tooth(
        "a script from elsewhere",
        everywhere(page, without("</body>", '<script src="https://example.org/x.js"></script></body>')),
        on_the_page(test_report_page.test_nothing_comes_from_elsewhere),
    ),
    Tooth(
        "a link to nowhere",
        everywhere(page, without('id="methods"', 'id="method"')),
        on_the_page(test_report_page.test_links_lead_somewhere_and_identifiers_are_unique),
    ),
    Tooth(
        "words that are escaped twice",
        everywhere(escaped, escaped_twice),
        lambda: test_report_page.test_data_cannot_become_markup(sample_report()),
    ),
    Tooth(
        "a number that does not apply shown as 0",
        everywhere(page, without(f"{DASH}</td>", "0</td>")),
        on_the_page(test_report_page.test_parts_that_do_not_apply_are_a_dash),
    ),
    Tooth(
        "a table that is not aligned",
        everywhere(
            result_lines, lambda *a, **k: [line.replace("   ", " ") for line in result_lines(*a, **k)]
        ),
        test_report_terminal.test_columns_are_aligned_and_plain,
    ),
    Tooth(
        "ends of an interval rounded inwards",
        everywhere(earned, inwards),
        lambda: test_report_rounding.test_digits_by_hand(
            3.1415, (3.1209, 3.1621), 0.0213, ("3.142", "3.120", "3.163", "0.022")
        ),
    ),
)
def test_pages_and_tables(tooth: Tooth) -> None:
    assert_bites(tooth)
