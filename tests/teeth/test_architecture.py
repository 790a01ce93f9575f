"""Faults in a source tree that the architecture tests must see: small trees in the place of the package's."""

from __future__ import annotations

import ast
from collections.abc import Callable

import pytest

from tests.architecture import test_docstrings, test_imports
from tests.architecture.source_tree import Module

Test = Callable[[Module], None]


def module(place: str, text: str) -> Module:
    """A module of the package, as text."""
    return Module(f"{place}.sample", place, ast.parse(text))


DOCUMENTED = (
    '"""A module about something."""\n\ndef area(w: float) -> float:\n    """Area in square metres."""\n'
)
RAISING = (
    '"""A module about something."""\n\ndef area(w: float) -> float:\n    """{} in square metres."""\n'
    "    raise InputError('w', 'x', 'y')\n"
)

FAULTS: list[tuple[str, Test, Module, Module]] = [
    (
        "the lower half imports the upper",
        test_imports.test_imports_go_in_one_direction,
        module("quadrature", "from aleafield.geometry import Interval"),
        module("quadrature", "from aleafield.estimates import Sample"),
    ),
    (
        "reversed direction within the lower half",
        test_imports.test_imports_go_in_one_direction,
        module("stepping", "from aleafield.projection.scheme import Scheme"),
        module("geometry", "from aleafield.spaces import Space"),
    ),
    (
        "statistics that know the solver",
        test_imports.test_imports_go_in_one_direction,
        module("accounting", "from aleafield.ensemble.level import Level"),
        module("accounting", "from aleafield.forward.field_model import FieldModel"),
    ),
    (
        "an import inside a function",
        test_imports.test_imports_go_in_one_direction,
        module("report", "def late():\n    from aleafield.archive.layout import Layout"),
        module("estimates", "def late():\n    import aleafield.archive.layout"),
    ),
    (
        "a folder that nobody placed",
        test_imports.test_imports_go_in_one_direction,
        module("report", ""),
        module("helpers", ""),
    ),
    (
        "netCDF4 outside the archive",
        test_imports.test_third_party_packages_have_homes,
        module("archive", "import netCDF4"),
        module("quantities", "import netCDF4"),
    ),
    (
        "xarray outside its homes",
        test_imports.test_third_party_packages_have_homes,
        module("runs", "def late():\n    from xarray import Dataset"),
        module("report", "def late():\n    from xarray import Dataset"),
    ),
    (
        "a module without a docstring",
        test_docstrings.test_public_names_are_documented,
        module("report", DOCUMENTED),
        module("report", DOCUMENTED.partition("\n")[2]),
    ),
    (
        "a function without a docstring",
        test_docstrings.test_public_names_are_documented,
        module("report", DOCUMENTED),
        module("report", DOCUMENTED + "\ndef volume(w: float) -> float:\n    return w\n"),
    ),
    (
        "a method without a docstring",
        test_docstrings.test_public_names_are_documented,
        module(
            "report", DOCUMENTED + '\nclass Box:\n    """A box of six sides."""\n\n    def _own(self): ...\n'
        ),
        module(
            "report", DOCUMENTED + '\nclass Box:\n    """A box of six sides."""\n\n    def size(self): ...\n'
        ),
    ),
    (
        "a docstring that says nothing",
        test_docstrings.test_public_names_are_documented,
        module("report", DOCUMENTED),
        module("report", DOCUMENTED.replace("Area in square metres.", "Area.")),
    ),
    (
        "an error that is not documented",
        test_docstrings.test_errors_raised_are_documented_at_the_front_doors,
        module("report", RAISING.format("Raises InputError, area")),
        module("report", RAISING.format("Area")),
    ),
]


@pytest.mark.parametrize(("fault", "test", "sound", "faulty"), FAULTS, ids=[entry[0] for entry in FAULTS])
def test_source_trees(fault: str, test: Test, sound: Module, faulty: Module) -> None:
    test(sound)
    with pytest.raises(AssertionError):
        test(faulty)


def named(name: str, text: str) -> Module:
    """A module with that dotted name."""
    return Module(name, name.split(".", maxsplit=1)[0], ast.parse(text))


@pytest.mark.parametrize(
    "back",
    ["from aleafield.a.one import f", "import aleafield.a.one", "from aleafield.a.two import g"],
    ids=["two modules", "two modules by name", "itself"],
)
def test_loops_of_imports(monkeypatch: pytest.MonkeyPatch, back: str) -> None:
    one, late = "from aleafield.a.two import g", "def f():\n    from aleafield.a.one import f"
    monkeypatch.setattr(test_imports, "modules", lambda: [named("a.one", one), named("a.two", late)])
    test_imports.test_no_module_imports_itself_through_others()
    monkeypatch.setattr(test_imports, "modules", lambda: [named("a.one", one), named("a.two", back)])
    with pytest.raises(AssertionError, match=r"a\.two"):
        test_imports.test_no_module_imports_itself_through_others()
