"""Faults between an ensemble and what is said of its inputs that the tests must see."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

from aleafield.accounting import expanded
from aleafield.accounting.causes import CausesData
from aleafield.randomness.design import Design
from aleafield.runs.causes import Inquiry
from aleafield.runs.stages import refuse_impossible_runs
from aleafield.runs.statements import QuantityColumns
from aleafield.sampling.allocation import Allocation
from aleafield.study.impossible import refuse_impossible_samples
from aleafield.study.study import Study
from tests.sensitivity_runs import test_expansion, test_known_indices, test_stages
from tests.sensitivity_runs.closed_fields import ABOVE, ring, summary_of
from tests.teeth.biting import Tooth, assert_bites, everywhere, member, teeth
from tests.teeth.test_archive import in_a_folder

REAL_DATA = Inquiry._data
REAL_STATED = expanded._widened


def jump() -> None:
    """The suite's test of exchanged inputs on a run of its own."""
    text = ring(ABOVE, 1024, more=test_known_indices.FROM_EXCHANGE + test_known_indices.CERTAIN)
    with TemporaryDirectory() as folder:
        summary = summary_of(text, Path(folder) / "out")
    test_known_indices.test_a_jump_is_answered_by_exchanged_inputs(summary)


def mean_and_sd() -> None:
    """The suite's test of statements from a surrogate on a run of its own."""
    with TemporaryDirectory() as folder:
        summary = summary_of(
            ring(method=test_expansion.METHOD, more=test_expansion.ASKED), Path(folder) / "out"
        )
    test_expansion.test_mean_and_sd_hold_the_truth_and_state_the_surrogate(summary)


def shuffled(self: Inquiry, columns: QuantityColumns) -> CausesData:
    """Runs of a row as they are stored, B before A."""
    data = REAL_DATA(self, columns)
    if data.row_values is None:
        return data
    return replace(data, row_values=data.row_values[:, [1, 0, *range(2, data.row_values.shape[1])]])


def without_its_error(plain: Any, half: float, *rest: Any) -> Any:
    """The surrogate taken for the solver."""
    return REAL_STATED(plain, 0.0 * half, *rest)


def main_sample_alone(study: Study, design: Design, allocation: Allocation, most: int | None = None) -> None:
    """Held-out and exchanged runs left out."""
    refuse_impossible_samples(study, design, allocation.samples if most is None else most)


@teeth(
    Tooth("rows that begin with B", member(Inquiry, "_data", shuffled), jump),
    Tooth("a surrogate without its error", everywhere(REAL_STATED, without_its_error), mean_and_sd),
    Tooth(
        "a surrogate that is refused whatever it is",
        member(Inquiry, "expanded", lambda *_: (None, "")),
        in_a_folder(test_expansion.test_a_refusal_of_one_quantity_leaves_the_others_alone),
    ),
    Tooth(
        "further runs that nobody looks at before they are solved",
        everywhere(refuse_impossible_runs, main_sample_alone),
        in_a_folder(test_stages.test_an_impossible_number_in_a_further_run_is_refused_before_any_solve),
    ),
)
def test_it_is_seen(tooth: Tooth) -> None:
    assert_bites(tooth)
