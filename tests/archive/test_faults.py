"""The disk fails at the n-th write, flush or rename, for every n: it is said, and the next call goes on."""

from __future__ import annotations

import errno
import os
import subprocess
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

from aleafield.errors import Interrupted
from tests.archive.small_runs import ROOT, assert_same_values, small_run

CALLS = ("write", "fsync", "replace")
"""What a disk can refuse; every file of a run but the netCDF library's own goes through these."""


class FailingDisk:
    """Counts the calls of `os.write`, `os.fsync`, `os.replace`; one of them fails, half-way where it can."""

    def __init__(self, fails_at: int | None = None) -> None:
        self.calls = 0
        self._fails_at = fails_at

    @contextmanager
    def in_place(self) -> Iterator[None]:
        """Stand between the program and the system."""
        with pytest.MonkeyPatch.context() as patch:
            for name in CALLS:
                patch.setattr(os, name, self._guarded(name, getattr(os, name)))
            yield

    def _guarded(self, name: str, real: Callable[..., object]) -> Callable[..., object]:
        def call(*arguments: object) -> object:
            self.calls += 1
            if self.calls == self._fails_at:
                if name == "write":
                    descriptor, data = arguments
                    real(descriptor, bytes(data)[: len(data) // 2])  # type: ignore[call-overload, arg-type]
                raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
            return real(*arguments)

        return call


def small(folder: Path) -> int:
    """A small run of four chunks at three levels."""
    return small_run(folder, samples=64, width=32, parts=1)


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, int]:
    """The folder of a run on a disk that works, and the number of calls that could have failed."""
    folder, disk = tmp_path_factory.mktemp("undisturbed"), FailingDisk()
    with disk.in_place():
        small(folder)
    return folder, disk.calls


@pytest.mark.parametrize("offset", range(4))
def test_every_fault_is_said_and_survived(undisturbed: tuple[Path, int], tmp_path: Path, offset: int) -> None:
    reference, calls = undisturbed
    assert calls > 40
    for fails_at in range(1 + offset, calls + 1, 4):
        folder = tmp_path / str(fails_at)
        with FailingDisk(fails_at).in_place(), pytest.raises(Interrupted, match="No space left on device"):
            small(folder)
        small(folder)
        assert_same_values(folder, reference)
        assert not list(folder.glob("**/.*")), "temporary files are left behind"


def test_a_full_disk_under_the_netcdf_library(tmp_path: Path) -> None:
    """The system refuses files above a size that chunks keep and ensemble.nc does not."""
    program = (
        "import resource, sys; from pathlib import Path; from tests.archive.small_runs import small_run; "
        "resource.setrlimit(resource.RLIMIT_FSIZE, (180_000, 180_000)); small_run(Path(sys.argv[1]), 512, 64)"
    )
    environment = {**os.environ, "PYTHONPATH": f"{ROOT / 'src'}{os.pathsep}{ROOT}"}
    ended = subprocess.run(
        [sys.executable, "-c", program, str(tmp_path / "full")],
        cwd=ROOT,
        env=environment,
        capture_output=True,
        text=True,
    )
    assert ended.returncode == 1
    assert "aleafield.errors.Interrupted: " in ended.stderr
    assert "ensemble.nc: cannot be written" in ended.stderr
    assert small_run(tmp_path / "full", 512, 64) == 0, "all chunks were stored before"
    small_run(tmp_path / "reference", 512, 64)
    assert_same_values(tmp_path / "full", tmp_path / "reference")
