"""Every kind of evidence has its teeth."""

from __future__ import annotations

import ast
from pathlib import Path

FOLDER = Path(__file__).resolve().parent
WITHOUT = {"teeth", "benchmarks", "verification"}
"""The teeth, what no run of the suite executes, and tests that plant their faults themselves."""


def checked_folders() -> set[str]:
    """Folders of tests from which a module of this folder takes its checks."""
    found = set()
    for path in FOLDER.glob("test_*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.ImportFrom) and node.module and node.module.startswith("tests."):
                found.add(node.module.split(".")[1])
    return found


def test_no_folder_is_without() -> None:
    folders = {path.parent.name for path in FOLDER.parent.glob("*/test_*.py")} - WITHOUT
    assert folders <= checked_folders()
