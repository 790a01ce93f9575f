"""Memory does not grow with the number of samples, beyond the columns of one quantity."""

from __future__ import annotations

from pathlib import Path

from tests.archive.campaign import as_program

BYTES_PER_SAMPLE = 128
"""Sixteen numbers a sample: value, margin and block of a quantity, and what sorting and shifting them takes.
The fields of this ensemble at the moment times alone would be 680 bytes a sample."""


def peak_memory(folder: Path, samples: int) -> int:
    """Largest resident set in bytes of a process that runs a campaign."""
    process = as_program(folder, samples, 1000, method="monte carlo")
    said, complaints = process.communicate(timeout=300)
    assert process.returncode == 0, complaints
    return 1024 * int(said)


def test_ten_times_the_samples_take_the_memory_of_their_columns(tmp_path: Path) -> None:
    few = peak_memory(tmp_path / "few", 10_000)
    many = peak_memory(tmp_path / "many", 100_000)
    assert many - few < BYTES_PER_SAMPLE * 90_000
    assert many < 1.1 * few
