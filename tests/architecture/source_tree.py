"""The package's source as syntax trees, for the checks of this folder."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2] / "src" / "aleafield"


@dataclass(frozen=True)
class Module:
    """One source file: dotted name below the package, folder (or file) it belongs to, tree."""

    name: str
    place: str
    tree: ast.Module

    def imports(self) -> Iterator[tuple[str, bool]]:
        """(dotted name of the imported module, whether it is imported when the module is loaded)."""
        late = {id(n) for f in ast.walk(self.tree) if isinstance(f, FUNCTIONS) for n in ast.walk(f)}
        typing_only = {
            id(n)
            for f in ast.walk(self.tree)
            if isinstance(f, ast.If) and isinstance(f.test, ast.Name) and f.test.id == "TYPE_CHECKING"
            for n in ast.walk(f)
        }
        for node in ast.walk(self.tree):
            at_load = id(node) not in late and id(node) not in typing_only
            if isinstance(node, ast.Import):
                for alias in node.names:
                    yield alias.name, at_load
            elif isinstance(node, ast.ImportFrom) and node.module:
                yield node.module, at_load


FUNCTIONS = (ast.FunctionDef, ast.AsyncFunctionDef)


def modules() -> list[Module]:
    """All modules of the package."""
    found = []
    for path in sorted(ROOT.rglob("*.py")):
        relative = path.relative_to(ROOT)
        place = relative.parts[0].removesuffix(".py")
        name = ".".join(relative.with_suffix("").parts)
        found.append(Module(name, place, ast.parse(path.read_text(encoding="utf-8"))))
    return found
