"""[sampling], [dependence] and [aim]: how samples are drawn, and what is demanded of the answer."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import cast

from aleafield.errors import InputError
from aleafield.formula import constant, nearest_name
from aleafield.randomness.inputs import Dependence
from aleafield.sampling.request import SamplingRequest
from aleafield.study.reading.table import Table, finite, not_built_yet, shown
from aleafield.study.study import Aim

METHODS = ("auto", "monte carlo", "quasi-monte carlo", "polynomial chaos")
UNBUILT_METHODS = {
    "multilevel": 'use "quasi-monte carlo", or "polynomial chaos" for a smooth quantity, for now'
}
_PER_CENT = re.compile(r"\s*(.+?)\s*%\s*")


def read_sampling(table: Table, noisy: bool, uncertain: bool) -> SamplingRequest:
    """Method, count of samples and noise paths of each; auto, 1024 and 1 where they are left out.

    Parameters
    ----------
    noisy : whether the study has noise
    uncertain : whether it has uncertain inputs

    Raises
    ------
    InputError
        For methods that are unknown, not built yet or without a meaning for the study, counts that are no whole
        numbers, and repeats of no noise.
    """
    table.only(("method", "samples", "noise_repeats"), "[sampling]")
    method = table.choice("method", METHODS, "auto", UNBUILT_METHODS)
    if method == "polynomial chaos":
        _refuse_chaos(table.key("method"), noisy, uncertain)
    if table.value("samples", None) == "auto":
        raise not_built_yet(table.key("samples"), "'auto'", "give a number of samples for now, as 1024")
    samples = table.integer("samples", 1024, least=1)
    repeats = table.integer("noise_repeats", 1, least=1)
    if repeats > 1 and not noisy:
        found = f"{repeats} noise paths for each sample, and no [noise]"
        needed = "nothing reads it, every repeat would be the same: take it out, or add a section [noise]"
        raise InputError(table.key("noise_repeats"), found, needed)
    return SamplingRequest(method, samples, repeats)  # type: ignore[arg-type]


def _refuse_chaos(key: str, noisy: bool, uncertain: bool) -> None:
    """Refuse an expansion of what is not a function of uncertain inputs."""
    if noisy:
        raise InputError(
            key,
            "'polynomial chaos' and a section [noise]",
            "an expansion is a function of the inputs, and under noise a quantity is none: the same inputs give "
            'another value on every path; use "quasi-monte carlo" with noise_repeats of 2 or more, which parts '
            "the spread into noise and inputs",
        )
    if not uncertain:
        raise InputError(
            key,
            "'polynomial chaos' and no uncertain input",
            "there is nothing to expand in: write a number of the model as a distribution, as "
            '"uniform(0.8, 1.2)", or take the method out',
        )


def read_dependence(table: Table) -> Dependence:
    """How inputs depend on one another.

    Whether the inputs exist and the correlations can hold together is for the design of the samples to say.

    Raises
    ------
    InputError
        For a list of another shape.
    """
    table.only(("rank_correlation", "sampled_together"), "[dependence]")
    pairs: list[tuple[str, str, float]] = []
    needed = 'a list of entries ["input", "input", number] is needed, as [["rate.gain", "h", 0.4]]'
    entries = table.entries("rank_correlation", needed) if "rank_correlation" in table else []
    for place, entry in enumerate(entries):
        key = f"{table.key('rank_correlation')}.{place}"
        if not isinstance(entry, list) or len(entry) != 3:
            raise InputError(key, f"{_entry_shown(entry)} given", needed)
        for name in entry[:2]:
            if not isinstance(name, str):
                raise InputError(key, f"{shown(name)} given", needed)
        pairs.append((entry[0], entry[1], finite(entry[2], key)))
    return Dependence(tuple(pairs), table.flag("sampled_together", False))


def _entry_shown(entry: object) -> str:
    return f"a list of {len(entry)}" if isinstance(entry, list) else shown(entry)


def read_aim(table: Table, names: Sequence[str]) -> tuple[Aim | None, float]:
    """The tolerance demanded, if any, and the confidence of all intervals; `names` are the quantities'.

    Raises
    ------
    InputError
        For an aim in computing time (not built yet), an unknown quantity, and numbers that cannot be.
    """
    table.only(("tolerance", "computing_time", "quantity", "confidence"), "[aim]")
    if "computing_time" in table:
        instead = "fix nodes, samples and time step, and demand a tolerance where one is needed"
        raise not_built_yet(table.key("computing_time"), "an aim in computing time", instead)
    confidence = finite(table.value("confidence", 0.95), table.key("confidence"))
    if not 0 < confidence < 1:
        raise InputError(
            table.key("confidence"), f"{confidence!r} given", "a number between 0 and 1 is needed, as 0.95"
        )
    if "tolerance" not in table:
        if "quantity" in table:
            raise InputError(
                table.key("quantity"), "nothing reads it: there is no tolerance", 'add tolerance = "1 %"'
            )
        return None, confidence
    value = table.value("tolerance")
    tolerance, relative = _tolerance(value, table.key("tolerance"))
    quantity = table.value("quantity", names[0])
    if quantity not in names:
        nearest = nearest_name(quantity, names) if isinstance(quantity, str) else None
        needed = "the quantities are " + ", ".join(names)
        raise InputError(table.key("quantity"), f"{shown(quantity)} is no quantity", needed, nearest=nearest)
    text = " ".join(value.split()) if isinstance(value, str) else repr(cast("int | float", value))
    return Aim(tolerance, relative, quantity, text), confidence


def _tolerance(value: object, key: str) -> tuple[float, bool]:
    """Half-width, as a share where it is given in per cent."""
    needed = 'a positive number in the units of the quantity, or per cent of its mean as "1 %", is needed'
    per_cent = _PER_CENT.fullmatch(value) if isinstance(value, str) else None
    if isinstance(value, str) and per_cent is None:
        raise InputError(key, f"{shown(value)} given", needed)
    number = constant(per_cent[1], key) / 100 if per_cent else finite(value, key)
    if not number > 0:
        raise InputError(key, f"{shown(value)} given", needed)
    return number, per_cent is not None
