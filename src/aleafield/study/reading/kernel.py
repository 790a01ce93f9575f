"""[kernel]: one part by itself, or named parts whose sum is the connectivity."""

from __future__ import annotations

import re

from aleafield.errors import InputError
from aleafield.field.kernels import (
    Connectivity,
    CosineKernel,
    ExponentialKernel,
    FormulaKernel,
    GaussianKernel,
    Kernel,
)
from aleafield.formula import nearest_name
from aleafield.study.reading.numbers import Numbers
from aleafield.study.reading.table import Table, shown
from aleafield.study.reading.terms import read_term

FORMS = ("gaussian", "exponential", "cosine", "formula")
UNBUILT_FORMS = {"table": "write the kernel as a formula of x, y and r, or as a sum of named parts, for now"}
_PART_NAME = re.compile(r"[A-Za-z][A-Za-z0-9 _-]*")
_KEYS = ("form", "strength", "width", "coefficients", "formula")


def read_kernel(table: Table, numbers: Numbers) -> Connectivity:
    """The sum of the parts; a lone part, which has `form` itself, gets the empty name.

    Raises
    ------
    InputError
        For named parts beside a lone kernel, an unknown form, and entries that the form does not read.
    """
    parts = [name for name in table if isinstance(table.value(name), dict)]
    if "form" in table:
        for name in parts:
            raise InputError(
                table.key(name),
                "a named part beside a kernel that has a form itself",
                "give that kernel a name of its own, as in [kernel.excitation]",
            )
        return Connectivity({"": _read_part(table, numbers)})
    for name in table:
        if name not in parts:
            needed = f"a lone kernel needs its form, one of {', '.join(FORMS)}"
            if parts:
                needed = "beside named parts there can be nothing else"
            raise InputError(
                table.key(name), f"{shown(table.value(name))} in a [kernel] without form", needed,
                nearest=nearest_name(name, ["form"]),
            )  # fmt: skip
    if not parts:
        raise InputError(table.path, "the kernel is empty", f"give it a form, one of {', '.join(FORMS)}")
    for name in parts:
        if not _PART_NAME.fullmatch(name):
            needed = "a part is named by a letter, then letters, digits, spaces, _ and -"
            raise InputError(table.key(name), f"the name {shown(name)}", needed)
    return Connectivity({name: _read_part(table.table(name, needed="a part"), numbers) for name in parts})


def _read_part(table: Table, numbers: Numbers) -> Kernel:
    form = table.choice("form", FORMS, unbuilt=UNBUILT_FORMS)
    if form == "formula":
        return FormulaKernel(read_term(table, numbers, ("x", "y", "r"), fixed=("form",)))
    if form == "cosine":
        table.only(("form", "coefficients"), "a cosine kernel")
        entries = table.entries("coefficients", "a list of numbers [a_0, a_1, ..] is needed")
        key = table.key("coefficients")
        return CosineKernel(tuple(numbers.read(entry, f"{key}.{i}") for i, entry in enumerate(entries)))
    table.only(("form", "strength", "width"), f"a kernel of form {form}")
    strength, width = numbers.take(table, "strength"), numbers.take(table, "width")
    return GaussianKernel(strength, width) if form == "gaussian" else ExponentialKernel(strength, width)
