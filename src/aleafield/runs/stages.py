"""Runs besides the main sample: which a study asks for, and which are decided on what the first stage gave.

The first stage is the main sample with its probes and, where a surrogate may answer, runs held out to judge it.
Where total indices are asked for and no surrogate is accepted, a second stage exchanges inputs between samples.  What
is decided follows from the values alone and stands in plan.json before it is solved.
"""

from __future__ import annotations

from dataclasses import replace

from aleafield.randomness.design import Design
from aleafield.randomness.families import Family, exchange_runs
from aleafield.randomness.points import SCRAMBLINGS
from aleafield.runs.plan_file import Plan, with_rows
from aleafield.sampling.allocation import Allocation
from aleafield.sensitivity.exchange import LEAST_ROWS
from aleafield.study.impossible import refuse_impossible_samples
from aleafield.study.study import Study

HELD_OUT = 64
"""Runs that judge a surrogate, independent of those that it is fitted to."""
LEAST_HELD_OUT = 32
"""Fewest of them; a quarter of the samples where that lies between."""
EXCHANGED_SHARE = 2.0
"""The exchange design has as many rows as cost at most this many main samples; but never fewer than it needs."""
TOTALS = ("total", "second")
"""Indices that single samples cannot give."""


def asks_for_totals(study: Study) -> bool:
    """Whether a study asks for what needs total indices: these, pairs, inputs to pin down or a bound to fix below.

    Of dependent inputs there are no such indices.
    """
    request = study.sensitivity
    if request is None or not study.dependence.independent:
        return False
    named = any(index in TOTALS for index in request.indices)
    return named or bool(request.wanted_sd) or request.fix_below is not None


def first_stage(study: Study, plan: Plan) -> Plan:
    """The plan with what is known to be needed beside the main sample; unsettled where more may follow."""
    wanted = further_runs(study, plan.allocation)
    if "held out" in wanted:
        plan = with_rows(plan, "held out", max(wanted["held out"], plan.families.get("held out", 0)))
    return replace(plan, settled="exchange" not in wanted)


def further_runs(study: Study, allocation: Allocation) -> dict[Family, int]:
    """The most runs besides the main sample, by family; those of "exchange" only where no surrogate is accepted."""
    wanted: dict[Family, int] = {}
    if not study.inputs or study.equation.noise is not None:
        return wanted
    if study.sensitivity is not None or allocation.surrogate:
        wanted["held out"] = min(HELD_OUT, max(LEAST_HELD_OUT, allocation.samples // 4))
    rows = exchange_rows(allocation.samples, len(study.inputs)) if asks_for_totals(study) else 0
    if rows:
        wanted["exchange"] = rows * exchange_runs(len(study.inputs))
    return wanted


def exchange_rows(samples: int, inputs: int) -> int:
    """Rows of the exchange design: 16 scramblings of 2^k points, samples of the run all of them.

    0 where there are fewer samples than the fewest rows of which intervals are known.

    >>> exchange_rows(1024, 2), exchange_rows(1024, 8), exchange_rows(128, 2)
    (256, 256, 0)
    >>> exchange_rows(8192, 3)
    2048
    """
    rows = SCRAMBLINGS * LEAST_ROWS
    if rows > samples:
        return 0
    while 2 * rows * exchange_runs(inputs) <= EXCHANGED_SHARE * samples:
        rows *= 2
    return rows


def refuse_impossible_runs(
    study: Study, design: Design, allocation: Allocation, most: int | None = None
) -> None:
    """Refuse a study one of whose runs, of whatever family, gives an impossible number.

    Parameters
    ----------
    study : Study
    design : Design
    allocation : Allocation
    most : int, optional
        Runs of each family that are looked at; default all that may come to be solved.

    Raises
    ------
    InputError
        As `refuse_impossible_samples`.
    """
    families: dict[Family, int] = {"main": allocation.samples, **further_runs(study, allocation)}
    for family, count in families.items():
        refuse_impossible_samples(study, design, count if most is None else min(count, most), family=family)
