"""A study's own names are kept in ensemble.nc, whatever is derived from others."""

from __future__ import annotations

from pathlib import Path

import netCDF4
import numpy as np

from aleafield.archive.ensemble_reader import reading
from aleafield.runs.run import run
from aleafield.study.reading import read_text
from tests.archive.studies import linear_ring


def test_names_that_look_derived(tmp_path: Path) -> None:
    """Quantities called like a margin, a mean, a value at a level and a field of moments."""
    taken = ("arrival_margin", "peak_mean", "peak_n32_q32_h0", "u_mean")
    more = "".join(f'\n[[quantity]]\nname = "{name}"\nmeasure = "minimum"\n' for name in taken)
    run(read_text(linear_ring(64, more=more).source.text), tmp_path / "out", workers=1)
    with netCDF4.Dataset(tmp_path / "out" / "ensemble.nc") as dataset, reading(Path(dataset.filepath())) as r:
        assert set(taken) < set(r.quantities)
        for name in taken:
            assert dataset[name].long_name == name
            np.testing.assert_array_equal(dataset[name][:], r.values(name))
        assert r.margins("arrival") is not None
        assert "n32_q32_h0" in r.levels
        assert r.values("peak", "n32_q32_h0").shape == (r.probes,)
