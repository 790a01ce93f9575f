"""Faults in reading and refusing that the tests of messages must see."""

from __future__ import annotations

from typing import Any

from aleafield.errors import InputError
from aleafield.randomness.copula import Copula
from aleafield.study.positions import line_of, located
from aleafield.study.reading.table import Table, finite
from tests.messages import test_broken_studies
from tests.messages.expectations import broken_files
from tests.properties import test_mutated_studies
from tests.teeth.biting import Check, Tooth, assert_bites, everywhere, member, teeth

ENTRIES = {entry.path.stem: entry for entry in broken_files()}


def message_of(name: str) -> Check:
    """The message of one broken study."""
    return lambda: test_broken_studies.test_the_reader_says_what_is_wrong(ENTRIES[name])


def in_two_lines(self: InputError) -> str:
    """A message with a line break."""
    return REAL_TEXT(self).replace("; ", ";\n")


REAL_TEXT = InputError.__str__


def unplaced(error: InputError, *_: Any) -> InputError:
    """File and line are lost on the way."""
    return error


def uncorrelated(self: Copula, paths: Any, _: Any) -> None:
    """Correlations are neither used nor looked at."""
    REAL_COPULA(self, paths, ())


REAL_COPULA = Copula.__init__


@teeth(
    Tooth(
        "a key that nothing reads is passed over",
        member(Table, "only", lambda self, known, owner: None),
        message_of("unknown_key_scheme"),
    ),
    Tooth("file and line are lost", everywhere(located, unplaced), message_of("kernel_width_negative")),
    Tooth(
        "a line that is off by one",
        everywhere(line_of, lambda lines, key: line_of(lines, key) + 1),
        message_of("kernel_width_negative"),
    ),
    Tooth(
        "a message in two lines", member(InputError, "__str__", in_two_lines), message_of("measure_unknown")
    ),
    Tooth(
        "a message that does not say what was found",
        member(InputError, "__str__", lambda self: f"{self.file}:{self.line}: {self.key}: invalid value"),
        message_of("formula_name_near"),
    ),
    Tooth(
        "a number that is not looked at",
        everywhere(finite, lambda value, key: float(value)),
        message_of("number_is_true"),
    ),
    Tooth(
        "correlations that are not looked at",
        member(Copula, "__init__", uncorrelated),
        message_of("correlation_not_positive_definite"),
    ),
    Tooth(
        "another exit status",
        member(InputError, "exit_status", 1),
        message_of("missing_title"),
    ),
    Tooth(
        "file and line are lost, seen by a mutated study",
        everywhere(located, unplaced),
        lambda: test_mutated_studies.read_or_refuse(test_mutated_studies.VALID[0].replace("shape", "shapes")),
    ),
    Tooth(
        "a message in two lines, seen by a mutated study",
        member(InputError, "__str__", in_two_lines),
        lambda: test_mutated_studies.read_or_refuse("title = 3\n"),
    ),
)
def test_refusals(tooth: Tooth) -> None:
    assert_bites(tooth)
