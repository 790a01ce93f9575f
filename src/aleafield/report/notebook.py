"""The summary as a notebook shows it: the report's table of answers."""

from __future__ import annotations

from aleafield.report.data import Summary
from aleafield.report.markup import element
from aleafield.report.tables import answers
from aleafield.report.verdict import failed_text


def html_table(summary: Summary) -> str:
    """A fragment of HTML with mean, interval, spread and main error parts of every quantity.

    Parameters
    ----------
    summary : as in summary.json
    """
    failed = summary["failed"]["count"]
    notes = [f"{failed_text(summary)}: left out of all statistics."] if failed else []
    notes.extend(summary["warnings"])
    return element("div", answers(summary), *(element("p", note) for note in notes))
