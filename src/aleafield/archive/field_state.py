"""What an extension needs of the fields besides ensemble.nc, in a file of its own.

Running sums are no part of ensemble.nc: their low halves depend on how the samples were cut, far below
rounding of the mean and standard deviation that they give, and the values of ensemble.nc depend on nothing
but the study.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from aleafield.archive.layout import Layout
from aleafield.arrays import FloatArray
from aleafield.ensemble.moments import FieldMoments
from aleafield.errors import ArchiveError

BAND_SAMPLES = 128
"""Bands are quantiles over at most so many realizations, the first ones."""
BAND = (0.05, 0.25, 0.75, 0.95)
"""Probabilities of the bands."""
FAN_REALIZATIONS = 1024
"""Fans are quantiles over the histories of at most so many realizations, the first ones."""
FAN = (0.05, 0.25, 0.5, 0.75, 0.95)
"""Probabilities of the fans."""
PATHS = 6
"""Histories that are shown one by one, the first ones."""


@dataclass(frozen=True)
class FieldState:
    """Fields and histories of some realizations at the moment times, as far as they are carried on.

    Attributes
    ----------
    moments : FieldMoments
        Running sums over all realizations that did not fail.
    band : float array (b, K, n)
        The fields of the realizations among the first BAND_SAMPLES.
    histories : mapping of quantity to float array (h, K)
        Its values in time in the realizations among the first FAN_REALIZATIONS; NaN where it does not occur.
    """

    moments: FieldMoments
    band: FloatArray
    histories: Mapping[str, FloatArray] = field(default_factory=dict)

    def __add__(self, other: FieldState) -> FieldState:
        """The state of these realizations and of those that follow."""
        band = self.band if len(other.band) == 0 else np.concatenate([self.band, other.band])
        histories = {
            name: np.concatenate([values, other.histories[name]]) if name in other.histories else values
            for name, values in self.histories.items()
        }
        return FieldState(self.moments + other.moments, band, histories)

    def fan(self, name: str) -> FloatArray:
        """Quantiles FAN of a history over the realizations in which it has a value, (5, K); NaN without any."""
        history = self.histories[name]
        found = np.full((len(FAN), history.shape[1]), np.nan)
        for index, column in enumerate(history.T):
            finite = column[np.isfinite(column)]
            if len(finite):
                found[:, index] = np.quantile(finite, FAN)
        return found

    def quantiles(self) -> FloatArray:
        """Quantiles BAND over the band's realizations that are finite throughout, (4, K, n); NaN without any."""
        finite = self.band[np.isfinite(self.band).all(axis=(1, 2))]
        shape = (len(BAND), *self.band.shape[1:])
        if len(finite) == 0:
            return np.full(shape, np.nan)
        found = np.empty(shape)
        for index in range(shape[1]):
            found[:, index] = np.quantile(finite[:, index], BAND, axis=0)
        return found


def put_state(dataset: Any, state: FieldState) -> None:
    """Add a state to an open netCDF dataset."""
    sums = np.stack([state.moments.reference, *state.moments.first, *state.moments.second])
    for name, length in zip(("sum", "moment_time", "x"), sums.shape, strict=True):
        dataset.createDimension(name, length)
    variable = dataset.createVariable("moments", "f8", ("sum", "moment_time", "x"), contiguous=True)
    variable.setncattr("count", np.int64(state.moments.count))
    variable[:] = sums
    if len(state.band):
        dataset.createDimension("band_sample", len(state.band))
        variable = dataset.createVariable("band", "f8", ("band_sample", "moment_time", "x"), contiguous=True)
        variable[:] = state.band
    if state.histories:
        histories = np.stack(list(state.histories.values()))
        for name, length in zip(("history", "fan_realization"), histories.shape, strict=False):
            dataset.createDimension(name, length)
        along = ("history", "fan_realization", "moment_time")
        variable = dataset.createVariable("histories", "f8", along, contiguous=True)
        variable.setncattr("quantities", json.dumps(list(state.histories)))
        variable[:] = histories


def get_state(dataset: Any) -> FieldState | None:
    """The state in an open netCDF dataset, or None where it holds none."""
    if "moments" not in dataset.variables:
        return None
    sums = dataset["moments"][:]
    count = int(dataset["moments"].getncattr("count"))
    band = dataset["band"][:] if "band" in dataset.variables else np.zeros((0, *sums.shape[1:]))
    histories = {}
    if "histories" in dataset.variables:
        variable = dataset["histories"]
        histories = {name: variable[row] for row, name in enumerate(json.loads(variable.quantities))}
    return FieldState(FieldMoments(count, sums[0], (sums[1], sums[2]), (sums[3], sums[4])), band, histories)


def encode_state(state: FieldState) -> bytes:
    """A state as the bytes of a netCDF file."""
    import netCDF4

    dataset = netCDF4.Dataset("state.nc", "w", memory=1 << 16)
    put_state(dataset, state)
    return bytes(dataset.close())


def read_state(layout: Layout, realizations: int, sha256: str) -> FieldState:
    """The state after so many realizations, its hash verified before it is opened.

    Raises
    ------
    ArchiveError
        When the file is missing or damaged.
    """
    import netCDF4

    path = layout.field_state(realizations)
    data = path.read_bytes() if path.exists() else b""
    if hashlib.sha256(data).hexdigest() != sha256:
        raise ArchiveError(
            f"{path}: missing or damaged, and the field's mean cannot be carried on without it; run the "
            "study again into a new folder"
        )
    with netCDF4.Dataset("state.nc", memory=data) as dataset:
        dataset.set_auto_mask(False)
        state = get_state(dataset)
    assert state is not None
    return state
