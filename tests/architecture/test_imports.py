"""Imports go in one direction, and third-party packages have homes."""

from __future__ import annotations

import pytest

from tests.architecture.source_tree import Module, modules

SHARED = ["errors", "arrays", "units", "formula", "ensemble", "randomness"]
LOWER = [
    "geometry",
    "field",
    "quadrature",
    "spaces",
    "operators",
    "projection",
    "stepping",
    "quantities",
    "forward",
]
UPPER = ["sampling", "estimates", "chaos", "sensitivity", "accounting", "archive", "report"]
TOP = ["study", "runs", "verification", "cli", "__init__", "__main__"]
"""These see both halves, and of one another only those before them."""

MAY_ALSO: dict[str, set[str]] = {
    # a study's numbers are parameters, and quantities hold such numbers
    "quantities": {"field"},
    # quadrature looks at the domain only, never at an equation
}

HOMES = {
    "netCDF4": {"archive"},
    "xarray": {"archive", "runs"},
    "threadpoolctl": {"runs"},
    "tomllib": {"study"},
    "chaospy": {"chaos"},
    "numpoly": set(),
    "SALib": {"sensitivity"},
    "compliance_checker": set(),
}

SHARED_ORDER = {"errors": 0, "arrays": 0, "units": 0, "formula": 1, "randomness": 2, "ensemble": 3}


def allowed(place: str) -> set[str]:
    """Places that a place may import."""
    if place in SHARED:
        return {p for p in SHARED if SHARED_ORDER[p] <= SHARED_ORDER[place]} | {place}
    for half in (LOWER, UPPER):
        if place in half:
            return set(SHARED) | set(half[: half.index(place) + 1]) | MAY_ALSO.get(place, set())
    return set(SHARED) | set(LOWER) | set(UPPER) | set(TOP[: TOP.index(place) + 1])


@pytest.mark.parametrize("module", modules(), ids=lambda m: m.name)
def test_imports_go_in_one_direction(module: Module) -> None:
    assert module.place in {*SHARED, *LOWER, *UPPER, *TOP}, "a new folder needs its place in this table"
    for name, _ in module.imports():
        if name.startswith("aleafield."):
            target = name.split(".")[1]
            assert target in allowed(module.place), f"{module.name} imports {name}"


@pytest.mark.parametrize("module", modules(), ids=lambda m: m.name)
def test_third_party_packages_have_homes(module: Module) -> None:
    for name, _ in module.imports():
        package = name.split(".")[0]
        if package in HOMES:
            assert module.place in HOMES[package], f"{module.name} imports {name}"


def test_no_module_imports_itself_through_others() -> None:
    """No loops among modules that are loaded with one another."""
    graph: dict[str, set[str]] = {}
    names = {m.name for m in modules()}
    for module in modules():
        targets = set()
        for name, at_load in module.imports():
            if at_load and name.startswith("aleafield."):
                short = name.removeprefix("aleafield.")
                targets.add(short if short in names else f"{short}.__init__")
        graph[module.name] = targets & names
    done: set[str] = set()

    def visit(name: str, trail: tuple[str, ...]) -> None:
        assert name not in trail, " -> ".join([*trail, name])
        if name not in done:
            for target in sorted(graph[name]):
                visit(target, (*trail, name))
            done.add(name)

    for name in sorted(graph):
        visit(name, ())
