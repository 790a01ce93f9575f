"""[sensitivity]: which inputs cause the spread, which to measure next, which may be fixed."""

from __future__ import annotations

from collections.abc import Sequence
from typing import cast

from aleafield.errors import InputError
from aleafield.formula import nearest_name
from aleafield.randomness.inputs import Dependence
from aleafield.study.reading.table import Table, finite, not_built_yet, shown, unknown_key
from aleafield.study.study import SensitivityIndex, SensitivityRequest

INDICES = ("first", "total", "second", "shapley")
"""In the order in which a study holds them."""
_A_LIST = 'a list of indices is needed, as ["first", "total"]'
_A_SPREAD = "a quantity and the standard deviation wanted of it are needed, as { width = 0.1 }"


def read_sensitivity(
    table: Table, names: Sequence[str], inputs: Sequence[str], dependence: Dependence, noisy: bool
) -> SensitivityRequest:
    """What is wanted of the inputs.

    Parameters
    ----------
    names : of the quantities
    inputs : paths of the uncertain inputs
    dependence : of the inputs
    noisy : whether the study has noise

    Raises
    ------
    InputError
        Where nothing is asked, for words and quantities that are unknown and numbers that cannot be, and for
        questions that have no answer: of no inputs, of one input about pairs, Sobol' indices of
        dependent inputs; and for elementary effects, which are not built yet.
    """
    table.only(("indices", "wanted_sd", "fix_below", "screening"), "[sensitivity]")
    if not inputs:
        _refuse_certain(table.path, noisy)
    if table.flag("screening", False):
        instead = 'take it out; indices = ["total"] of a surrogate serves ten inputs and more'
        raise not_built_yet(table.key("screening"), "screening by elementary effects", instead)
    request = SensitivityRequest(_indices(table), _wanted_sd(table, names), _fix_below(table))
    if not (request.indices or request.wanted_sd or "fix_below" in table):
        needed = 'write indices = ["first", "total"], or take the section out'
        raise InputError(table.path, "nothing is asked here", needed)
    if "second" in request.indices and len(inputs) == 1:
        raise InputError(
            table.key("indices"),
            f"'second' of one uncertain input, {inputs[0]}",
            "an index of second order belongs to a pair of inputs: take it out",
        )
    if not dependence.independent:
        _refuse_dependent(table, request)
    return request


def _indices(table: Table) -> tuple[SensitivityIndex, ...]:
    value = table.value("indices", [])
    if not isinstance(value, list):
        raise InputError(table.key("indices"), f"{shown(value)} given", _A_LIST)
    for place, entry in enumerate(value):
        if entry not in INDICES:
            nearest = nearest_name(entry, INDICES) if isinstance(entry, str) else None
            needed = "each is one of " + ", ".join(repr(word) for word in INDICES)
            raise InputError(
                f"{table.key('indices')}.{place}", f"{shown(entry)} given", needed, nearest=nearest
            )
    return tuple(cast("SensitivityIndex", word) for word in INDICES if word in value)


def _wanted_sd(table: Table, names: Sequence[str]) -> dict[str, float]:
    value = table.value("wanted_sd", {})
    if not isinstance(value, dict):
        raise InputError(table.key("wanted_sd"), f"{shown(value)} given", _A_SPREAD)
    wanted = Table(value, table.key("wanted_sd"))
    spreads: dict[str, float] = {}
    for name in wanted:
        if name not in names:
            raise unknown_key(wanted.key(name), names, "the study's list of quantities")
        spreads[name] = finite(wanted.value(name), wanted.key(name))
        if not spreads[name] > 0:
            raise InputError(
                wanted.key(name),
                f"{spreads[name]!r} given",
                "a standard deviation is a positive number, in units of the quantity",
            )
    return {name: spreads[name] for name in names if name in spreads}


def _fix_below(table: Table) -> float | None:
    if "fix_below" not in table:
        return None
    value = finite(table.value("fix_below"), table.key("fix_below"))
    if not 0 < value < 1:
        raise InputError(
            table.key("fix_below"),
            f"{value!r} given",
            "it is a share of the variance, a number between 0 and 1, as 0.01",
        )
    return value


def _refuse_certain(key: str, noisy: bool) -> None:
    """Refuse the question which input it is where there is none."""
    if noisy:
        found = "nothing but the noise is uncertain"
        needed = (
            "all of the variance is noise, as `variance` in the summary says: take the section out, or write"
        )
    else:
        found = "the study has no uncertain inputs"
        needed = "take the section out, or write"
    raise InputError(key, found, f'{needed} a number of the model as a distribution, as "uniform(0.8, 1.2)"')


def _refuse_dependent(table: Table, request: SensitivityRequest) -> None:
    """Refuse what holds for independent inputs only."""
    sobol = [repr(word) for word in request.indices if word != "shapley"]
    if sobol:
        raise InputError(
            table.key("indices"),
            f"{', '.join(sobol)} of inputs that [dependence] joins",
            "Sobol' indices part the variance only between independent inputs; ask for Shapley effects, which "
            'share out what dependent inputs cause together: indices = ["shapley"]',
        )
