"""Every public module, class and function says what it is; those with arrays say the shapes."""

from __future__ import annotations

import ast

import pytest

from tests.architecture.source_tree import FUNCTIONS, Module, modules


def public_definitions(tree: ast.Module) -> list[tuple[str, ast.AST]]:
    """Public classes and functions of a module, and public methods of public classes."""
    found: list[tuple[str, ast.AST]] = []
    for node in tree.body:
        if isinstance(node, (*FUNCTIONS, ast.ClassDef)) and not node.name.startswith("_"):
            found.append((node.name, node))
        if isinstance(node, ast.ClassDef) and not node.name.startswith("_"):
            inherited = bool(node.bases)
            for member in node.body:
                if isinstance(member, FUNCTIONS) and not member.name.startswith("_"):
                    documented = ast.get_docstring(member)
                    if documented or not inherited:
                        found.append((f"{node.name}.{member.name}", member))
    return found


@pytest.mark.parametrize("module", modules(), ids=lambda m: m.name)
def test_public_names_are_documented(module: Module) -> None:
    assert ast.get_docstring(module.tree), "the module says nothing about itself"
    for name, node in public_definitions(module.tree):
        text = ast.get_docstring(node)  # type: ignore[arg-type]
        assert text, f"{name} has no docstring"
        assert len(text) > 15, f"{name}: {text!r} says too little"


@pytest.mark.parametrize("module", modules(), ids=lambda m: m.name)
def test_errors_raised_are_documented_at_the_front_doors(module: Module) -> None:
    """A public function that raises InputError itself says so."""
    for name, node in public_definitions(module.tree):
        if not isinstance(node, FUNCTIONS):
            continue
        raises = any(
            isinstance(n, ast.Raise)
            and isinstance(n.exc, ast.Call)
            and isinstance(n.exc.func, ast.Name)
            and n.exc.func.id in ("InputError", "ArchiveError")
            for n in ast.walk(node)
        )
        if raises:
            text = ast.get_docstring(node) or ""
            assert "Raises" in text or "InputError" in text or "ArchiveError" in text, f"{name} does not say"
