"""Reading an ensemble: one quantity at a time, so that memory grows with one column and not with the file."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from aleafield.archive.description import MOST_KEPT
from aleafield.archive.ensemble_variables import Key
from aleafield.archive.names import netcdf_name
from aleafield.arrays import BoolArray, FloatArray, IntArray
from aleafield.ensemble.records import FINITE, Records
from aleafield.errors import ArchiveError
from aleafield.randomness.families import Family

if TYPE_CHECKING:
    import xarray


class EnsembleReader:
    """The columns of an open ensemble.

    A level is named by its label; the empty label means the run's own level, along all S realizations, "held_out",
    "exchange" and "screening" the runs of these families at it, along each family's n_f runs, any other one an
    extra level of the split, along the probes: the first n_p realizations.

    Attributes
    ----------
    quantities, inputs : tuple of str
        Names and paths in the order of the study.
    levels : tuple of str
        Labels of the extra levels.
    families : mapping of family to count
        Families besides the main sample, with their numbers of runs.
    """

    def __init__(self, dataset: Any) -> None:
        dataset.set_auto_mask(False)
        self._dataset = dataset
        self._found: dict[Key, Any] = {}
        for variable in dataset.variables.values():
            attributes = variable.__dict__
            if "role" in attributes:
                label = attributes.get("scheme_level", "") or netcdf_name(attributes.get("family", ""))
                self._found[attributes["role"], attributes.get("belongs_to", ""), label] = variable
        self.quantities = tuple(owner for role, owner, label in self._found if role == "value" and not label)
        self.inputs = tuple(owner for role, owner, _ in self._found if role == "input")
        flags = {label: v for (role, _, label), v in self._found.items() if role == "failed" and label}
        self.families: dict[Family, int] = {
            v.family: len(v) for v in flags.values() if "family" in v.ncattrs()
        }
        self.levels = tuple(label for label, v in flags.items() if "family" not in v.ncattrs())

    def __len__(self) -> int:
        return len(self._dataset.dimensions["realization"])

    @property
    def probes(self) -> int:
        """Number of realizations that are probes; 0 where nothing was solved at other levels."""
        return len(self._dataset.dimensions["probe"]) if "probe" in self._dataset.dimensions else 0

    def attribute(self, name: str) -> Any:
        """A global attribute, None where there is none; JSON text stays text."""
        return self._dataset.__dict__.get(name)

    def unit(self, quantity: str) -> str:
        """Unit label of a quantity."""
        return str(self._found["value", quantity, ""].units)

    def values(self, quantity: str, level: str = "") -> FloatArray:
        """Values of a quantity, NaN where it does not occur or the realization failed, (S,), (n_f,) or (n_p,)."""
        return self._column(("value", quantity, level))

    def margins(self, quantity: str, level: str = "") -> FloatArray | None:
        """Margins of a quantity, None where it always occurs, (S,), (n_f,) or (n_p,)."""
        key = ("margin", quantity, level)
        return self._column(key) if key in self._found else None

    def failed(self, level: str = "") -> IntArray:
        """Failure codes, (S,), (n_f,) or (n_p,)."""
        return np.asarray(self._found["failed", "", level][:], dtype=np.int64)

    def valid(self, level: str = "") -> BoolArray:
        """Which realizations did not fail, (S,), (n_f,) or (n_p,)."""
        return np.asarray(self._found["failed", "", level][:] == FINITE)

    def failed_at(self) -> FloatArray:
        """Model times at which failed realizations ceased to be finite, (S,)."""
        return self._column(("failed_at", "", ""))

    @property
    def repeats(self) -> int:
        """Noise paths of each parameter sample."""
        return int(self._found["repeat", "", ""][-1]) + 1

    def numbers(self, name: str, first: int = 0, last: int | None = None) -> NDArray[np.int32]:
        """Number of the "sample", "repeat" or "replicate" of realizations first .. last - 1, (last - first,)."""
        return np.asarray(self._found[name, "", ""][first:last], dtype=np.int32)

    def input(self, path: str) -> FloatArray:
        """Values of an input, (S,)."""
        return self._column(("input", path, ""))

    def axis(self, name: str) -> FloatArray:
        """Values along "x", "t", "t_moments", "band" or "fan"; empty where the file has no such axis."""
        key = ("axis", name, "")
        return self._column(key) if key in self._found else np.zeros(0)

    def field_mean(self) -> FloatArray:
        """Mean field at the times "t_moments", (K, n)."""
        return self._column(("field_mean", "", ""))

    def field_sd(self) -> FloatArray:
        """Standard deviation of the field at the times "t_moments", (K, n)."""
        return self._column(("field_sd", "", ""))

    def field_band(self) -> FloatArray:
        """Quantiles of the field, probabilities of the axis "band", times "t_moments", (4, K, n)."""
        return self._column(("field_band", "", ""))

    def fields(self, first: int, last: int) -> FloatArray | None:
        """Stored fields of realizations first .. last - 1 at the times "t", (last - first, K, n)."""
        key = ("field", "", "")
        return np.asarray(self._found[key][first:last]) if key in self._found else None

    @property
    def kept(self) -> int:
        """Number of realizations whose fields are stored, the first ones."""
        if ("field", "", "") not in self._found:
            return 0
        return min(len(self), MOST_KEPT)

    def histories(self, quantity: str) -> tuple[FloatArray, FloatArray] | None:
        """A quantity in time, at "t_moments": its quantiles (5, K) at the probabilities of the axis "fan", and
        single realizations (<= 6, K); None where it was not followed."""
        if ("fan", quantity, "") not in self._found:
            return None
        return self._column(("fan", quantity, "")), self._column(("paths", quantity, ""))

    def rows(self, first: int, last: int, level: str = "") -> Records:
        """Realizations first .. last - 1 (probes, at an extra level) as records without fields.

        Those of a family have no inputs: they follow from seed and index.
        """
        cut = slice(first, last)

        def columns(role: str, at: str) -> dict[str, FloatArray]:
            found = {owner: v for (r, owner, lv), v in self._found.items() if r == role and lv == at}
            return {owner: np.asarray(variable[cut]) for owner, variable in found.items()}

        failed = np.asarray(self._found["failed", "", level][cut], dtype=np.int64)
        times = (
            np.asarray(self._found["failed_at", "", ""][cut]) if not level else np.full(len(failed), np.nan)
        )
        return Records(
            realizations=np.arange(first, first + len(failed), dtype=np.int64),
            inputs={} if level in map(netcdf_name, self.families) else columns("input", ""),
            values=columns("value", level),
            margins=columns("margin", level),
            failed=failed,
            failed_at=times,
        )

    def _column(self, key: Key) -> FloatArray:
        return np.asarray(self._found[key][:], dtype=np.float64)


@contextmanager
def reading(path: Path) -> Iterator[EnsembleReader]:
    """Open an ensemble file for reading.

    Raises
    ------
    ArchiveError
        When there is no such file, or it is not an ensemble of aleafield.
    """
    import netCDF4

    if not path.exists():
        raise ArchiveError(f"{path.parent}: holds no ensemble.nc; a run that ended leaves one there")
    try:
        dataset = netCDF4.Dataset(path)
    except OSError as error:
        raise ArchiveError(
            f"{path}: cannot be opened ({error}); it is damaged or not a netCDF file"
        ) from error
    with dataset:
        if "study_digest" not in dataset.ncattrs():
            raise ArchiveError(f"{path}: not an ensemble that aleafield wrote; give the folder of a run")
        yield EnsembleReader(dataset)


def open_ensemble(folder: Path | str) -> xarray.Dataset:
    """The ensemble of a results folder as an xarray Dataset; values load when they are used.

    Raises
    ------
    ArchiveError
        When the folder holds no ensemble.
    """
    import xarray

    path = Path(folder) / "ensemble.nc"
    with reading(path):
        pass
    return xarray.open_dataset(path, engine="netcdf4", decode_timedelta=False)
