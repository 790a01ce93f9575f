"""A tooth: a check of the suite, and a fault planted in the product that must turn it red."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from types import ModuleType
from typing import Any

import pytest

Check = Callable[[], object]
Plant = Callable[[pytest.MonkeyPatch], None]


@dataclass(frozen=True)
class Tooth:
    """A fault and the check that sees it.

    Attributes
    ----------
    fault : str
        In words.
    plant : callable
        Puts the fault into the product; undone afterwards.
    check : callable
        Tests of the suite, called as they are: they must fail by an assertion, not by any other exception.
    """

    fault: str
    plant: Plant
    check: Check

    def __str__(self) -> str:
        return self.fault


def assert_bites(tooth: Tooth) -> None:
    """The check passes on the product as it is, and goes red with the fault."""
    tooth.check()
    with pytest.MonkeyPatch.context() as patch:
        tooth.plant(patch)
        with pytest.raises((AssertionError, pytest.fail.Exception)):
            tooth.check()


def teeth(*found: Tooth) -> pytest.MarkDecorator:
    """Parameters of a test that takes one `tooth`."""
    return pytest.mark.parametrize("tooth", found, ids=str)


def everywhere(real: Callable[..., Any], faulty: Callable[..., Any]) -> Plant:
    """Replace a function or class wherever a module, or a table in a module, holds it."""

    def plant(patch: pytest.MonkeyPatch) -> None:
        replaced = 0
        for module in _modules():
            for name, value in list(vars(module).items()):
                if value is real:
                    patch.setattr(module, name, faulty)
                    replaced += 1
                elif isinstance(value, dict):
                    for key in [key for key, entry in value.items() if entry is real]:
                        patch.setitem(value, key, faulty)
        assert replaced, f"no module holds {real}"

    return plant


def member(owner: Any, name: str, faulty: Any) -> Plant:
    """Replace a method, an attribute or a constant."""

    def plant(patch: pytest.MonkeyPatch) -> None:
        patch.setattr(owner, name, faulty)

    return plant


def _modules() -> Iterator[ModuleType]:
    """Loaded modules of the product and of its tests; the teeth keep what they know to be right."""
    for name, module in list(sys.modules.items()):
        if name.split(".")[0] in ("aleafield", "tests") and not name.startswith("tests.teeth"):
            yield module
