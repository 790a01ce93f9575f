"""Each page's examples run in a folder of their own, beside copies of the study files of this folder."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest


@pytest.fixture(autouse=True)
def _own_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    for study in Path(__file__).parent.glob("*.toml"):
        shutil.copy(study, tmp_path)
    monkeypatch.chdir(tmp_path)
