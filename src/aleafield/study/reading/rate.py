"""[rate]: the firing rate f(u)."""

from __future__ import annotations

from aleafield.field.rates import (
    FormulaRate,
    LinearRate,
    LogisticRate,
    NormalOgiveRate,
    RampRate,
    Rate,
    StepRate,
)
from aleafield.study.reading.numbers import Numbers
from aleafield.study.reading.table import Table
from aleafield.study.reading.terms import read_term

SIGMOIDS: dict[str, type[LogisticRate | NormalOgiveRate | RampRate]] = {
    "logistic": LogisticRate,
    "normal-ogive": NormalOgiveRate,
    "ramp": RampRate,
}
FORMS = (*SIGMOIDS, "step", "linear", "formula")


def read_rate(table: Table, numbers: Numbers) -> Rate:
    """The rate of a form; threshold 0, maximum 1 and, for the linear form, gain 1 where they are left out.

    Raises
    ------
    InputError
        For an unknown form, a missing gain, and entries that the form does not read.
    """
    form = table.choice("form", FORMS)
    if form == "formula":
        return FormulaRate(read_term(table, numbers, ("u",), fixed=("form",)))
    known = {"step": ("threshold", "maximum"), "linear": ("gain", "threshold")}.get(
        form, ("gain", "threshold", "maximum")
    )
    table.only(("form", *known), f"a rate of form {form}")
    if form in SIGMOIDS:
        numbers.take(table, "gain", needed=f"a rate of form {form} needs its gain, a positive number")
    given = {name: numbers.take(table, name) for name in known if name in table}
    if form in SIGMOIDS:
        return SIGMOIDS[form](**given)
    return StepRate(**given) if form == "step" else LinearRate(**given)
