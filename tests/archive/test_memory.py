"""Memory does not grow with the number of samples, beyond the columns of one quantity."""

from __future__ import annotations

from pathlib import Path

from tests.archive.small_runs import as_program

BYTES_PER_SAMPLE = 56
"""Seven numbers a sample: value and margin of a quantity, the values that occur, the same in order, two more
columns of scratch (the values at a finer level, and what a sum of squares takes), and one number for labels of
blocks and for flags.  The fields of this ensemble at the moment times alone would be 680 bytes a sample."""
FEW, MANY = 50_000, 200_000
"""So many that both files are above 4 MiB: up to there the netCDF library reads a file twice when it is opened."""


def peak_memory(folder: Path, samples: int) -> int:
    """Largest resident set in bytes of a process that runs a small_runs."""
    process = as_program(folder, samples, 1000, method="monte carlo")
    said, complaints = process.communicate(timeout=300)
    assert process.returncode == 0, complaints
    return 1024 * int(said)


def test_four_times_the_samples_take_the_memory_of_their_columns(tmp_path: Path) -> None:
    few = peak_memory(tmp_path / "few", FEW)
    many = peak_memory(tmp_path / "many", MANY)
    assert many - few < BYTES_PER_SAMPLE * (MANY - FEW)
    assert many < 1.06 * few
