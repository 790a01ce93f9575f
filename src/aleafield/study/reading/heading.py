"""What stands above the sections: title, about, seed and units."""

from __future__ import annotations

from aleafield.errors import InputError
from aleafield.study.reading.table import Table, shown
from aleafield.units import Units

SECTIONS = (
    "title", "about", "seed", "units", "parameters", "dependence", "domain", "kernel", "rate", "drive",
    "initial", "dynamics", "noise", "scheme", "quantity", "sampling", "sensitivity", "aim", "report", "keep",
)  # fmt: skip


def read_title(table: Table) -> str:
    """The title, required."""
    return table.text("title", needed="a study needs a title, one line of text")


def read_about(table: Table) -> str:
    """Free text, empty where there is none; InputError for anything but text."""
    value = table.value("about", "")
    if not isinstance(value, str):
        raise InputError(table.key("about"), f"{shown(value)} given", "text in quotation marks is needed")
    return value


def read_units(table: Table) -> Units:
    """Labels of length, time and activity, "1" where one is left out; InputError for anything but labels."""
    labels = ("length", "time", "activity")
    table.only(labels, "units")
    given = {
        name: table.text(name, needed='a label such as "mm" is needed') for name in labels if name in table
    }
    for name, label in given.items():
        if not label.isprintable():
            raise InputError(
                table.key(name), f"{shown(label)} given", 'one line, a label such as "mm", is needed'
            )
    return Units(**given)
