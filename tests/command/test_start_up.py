"""Help and `check` are quick: what they do not need is not loaded, and the processor has little to do."""

from __future__ import annotations

import resource
import sys

import pytest

from tests.command.saying import ROOT, command_line, ended, start

STUDIES = sorted((ROOT / "studies").glob("*.toml"))
MOST_PROCESSOR_SECONDS = 0.3
"""Of `--help`, user and system together; 0.05 s were measured, of which the interpreter itself takes half."""


def loaded_by(statement: str) -> set[str]:
    """Packages, and modules of scipy, that are loaded when a statement has been executed in a new process."""
    program = (
        f"import sys\ntry:\n    {statement}\nexcept SystemExit:\n    pass\n"
        "print(*sys.modules, sep='\\n', file=sys.stderr)"
    )
    said = ended(start([sys.executable, "-c", program]))
    assert said.status == 0, said.err
    return {".".join(name.split(".")[: 1 + name.startswith("scipy.")]) for name in said.err.split()}


@pytest.mark.parametrize("arguments", [["--help"], ["run", "--help"], ["--version"]])
def test_help_loads_no_heavy_package(arguments: list[str]) -> None:
    loaded = loaded_by(f"from aleafield.cli import main; main({arguments})")
    assert "aleafield" in loaded
    assert not loaded & {"numpy", "scipy", "xarray", "pandas", "netCDF4", "threadpoolctl", "asyncio"}


def test_importing_the_package_loads_no_heavy_package() -> None:
    loaded = loaded_by("import aleafield; dir(aleafield)")
    assert not loaded & {"numpy", "scipy", "xarray", "netCDF4"}


@pytest.mark.parametrize("study", STUDIES, ids=lambda path: path.stem)
def test_check_loads_nothing_that_stores_or_draws(study: str) -> None:
    loaded = loaded_by(f"from aleafield.cli import main; assert main(['check', {str(study)!r}]) == 0")
    assert "numpy" in loaded, "the check of this test itself"
    assert not loaded & {"xarray", "pandas", "netCDF4", "threadpoolctl", "matplotlib"}


def test_help_takes_little_processor_time() -> None:
    """The least of three: other processes of the machine disturb it little, but not nothing."""
    seconds = []
    for _ in range(3):
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        assert ended(start(command_line("--help"))).status == 0
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        seconds.append(after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime)
    assert min(seconds) < MOST_PROCESSOR_SECONDS
