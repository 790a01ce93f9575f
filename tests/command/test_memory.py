"""Peak memory of `aleafield run` does not grow with the number of samples."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from tests.command.saying import command_line, ended, start, study_file

BYTES_PER_SAMPLE = 400
"""Between 10,000 and 100,000 samples 110 were measured, the columns of the one quantity that is being judged;
for fewer samples what the allocator keeps ready counts too.  The fields at 41 moment times are 5,248."""


def peak_memory(folder: Path, samples: int) -> int:
    """Largest resident set in bytes of a run of a tiny field: 16 nodes, 20 steps, fields not kept."""
    study = study_file(
        folder / f"{samples}.toml", samples=samples, method="monte carlo", more='[keep]\nfields = "none"\n'
    )
    words = command_line("run", study, "--out", folder / str(samples), "--workers", 1, "--quiet")
    program = (
        "import resource, runpy, sys\n"
        f"sys.argv = {['aleafield', *words[3:]]!r}\n"
        "try:\n    runpy.run_module('aleafield', run_name='__main__')\n"
        "finally:\n    print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)\n"
    )
    said = ended(start([words[0], "-c", program]))
    assert said.status == 0, said.err
    return 1024 * int(re.fullmatch(r"(\d+)\n", said.out)[1])  # type: ignore[index]


@pytest.mark.parametrize(("few", "many"), [(2_000, 20_000)])
def test_ten_times_the_samples(tmp_path: Path, few: int, many: int) -> None:
    least, most = peak_memory(tmp_path, few), peak_memory(tmp_path, many)
    assert most - least < BYTES_PER_SAMPLE * (many - few)
    assert most < 1.06 * least
