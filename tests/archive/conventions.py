"""What a checker of the CF conventions has to say against a file; it carries its tables with it."""

from __future__ import annotations

import re
from pathlib import Path

# realization is the dimension that a statistic was taken over and is therefore no longer its own (CF 1.11,
# section 7.3); the checker accepts that only where the variable keeps a scalar coordinate of that name
COLLAPSED = (
    "'s cell_methods name component realization does not match a dimension, area or auxiliary coordinate"
)
FALSE_ALARMS = (re.compile(rf"\S+{COLLAPSED}"),)
"""Known false alarms of the checker; anything else is a fault of ours."""


def findings(path: Path) -> list[str]:
    """What the checker has to say against a file, in CF 1.11."""
    from compliance_checker.runner import CheckSuite

    CheckSuite.load_all_available_checkers()
    suite = CheckSuite()
    dataset = suite.load_dataset(str(path))
    try:
        results, errors = suite.run_all(dataset, ["cf:1.11"], [])["cf:1.11"]
    finally:
        dataset.close()
    assert not errors
    missed = [
        result for result in results if isinstance(result.value, tuple) and result.value[0] < result.value[1]
    ]
    return sorted({message for result in missed for message in result.msgs})


def strangers(path: Path) -> list[str]:
    """Findings that are no known false alarms."""
    return [text for text in findings(path) if not any(alarm.fullmatch(text) for alarm in FALSE_ALARMS)]
