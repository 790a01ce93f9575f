"""The variables of ensemble.nc: names, dimensions and attributes, as the CF conventions want them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from aleafield.archive.attributes import set_attributes
from aleafield.archive.description import Description, QuantityColumn
from aleafield.archive.field_state import BAND, BAND_SAMPLES, FAN, FAN_REALIZATIONS, PATHS
from aleafield.archive.names import Names, netcdf_name
from aleafield.ensemble.records import FAILURE_MEANINGS
from aleafield.randomness.families import Family

Key = tuple[str, str, str]
"""Role of a variable, input or quantity that it belongs to, label of its level or family; the last two may be
empty."""
FIELD_BLOCK = 1 << 17
"""Numbers in one block of the stored fields: 1 MiB."""
ALONG = ("realization",)
FAMILY_COMMENTS: Mapping[Family, str] = {
    "held out": "runs at independent points that are no part of the sample",
    "exchange": "runs with groups of inputs exchanged between the points of the sample and those of a second one",
    "screening": "runs along trajectories on which one input changes at a time",
}
"""What the runs of a family are, for readers of the file."""


@dataclass(frozen=True)
class _Further:
    """Runs besides those of the main sample at the run's level: an extra level, or another family.

    `words` follow the name of what was computed, `who_failed` the words "whether, and why, a".
    """

    label: str
    dimension: str
    words: str
    who_failed: str
    attributes: Mapping[str, Any]


class EnsembleVariables:
    """Defines all variables of an ensemble in an open, empty netCDF dataset.

    Attributes
    ----------
    found : mapping of `Key` to netCDF variable
    names : Names
        What is taken; statistics get their names from here.
    """

    def __init__(self, dataset: Any, description: Description) -> None:
        self._dataset = dataset
        self._description = description
        self.names = Names()
        self.found: dict[Key, Any] = {}
        # a study's own names first: what is derived from one of them makes way
        inputs = [self.names.take(column.path) for column in description.inputs]
        names = [self.names.take(quantity.name) for quantity in description.quantities]
        self._coordinates = " ".join(["sample", "repeat", "replicate", *inputs])
        self._make_dimensions()
        self._make_numbers()
        for column, name in zip(description.inputs, inputs, strict=True):
            about = {"long_name": f"uncertain input {column.path}", "path": column.path, "law": column.law}
            self._make(("input", column.path, ""), name, ALONG, {**about, "units": column.units})
        self._make_failures()
        for quantity, name in zip(description.quantities, names, strict=True):
            self._make_quantity(quantity, name)
        if description.extra_levels:
            self._make_probes()
        self._make_families()
        if description.axes.moment_times:
            self._make_moments()
        if description.kept:
            self._make_fields()

    def _make_dimensions(self) -> None:
        description, axes = self._description, self._description.axes
        lengths = {"realization": description.realizations}
        if axes.moment_times:
            lengths |= {"t_moments": len(axes.moment_times), "x": len(axes.x), "band": len(BAND)}
        if description.extra_levels:
            lengths["probe"] = description.probes * description.repeats
        if description.kept:
            lengths["t"] = len(axes.kept_times)
        lengths |= {netcdf_name(family): count for family, count in description.families.items()}
        for name, length in lengths.items():
            self._dataset.createDimension(name, length)

    def _make(
        self,
        key: Key,
        name: str,
        dimensions: Sequence[str],
        attributes: Mapping[str, Any],
        kind: str = "f8",
        blocks: Sequence[int] | None = None,
    ) -> Any:
        role, owner, label = key
        family = next((f for f in self._description.families if netcdf_name(f) == label), None)
        fill = np.nan if kind == "f8" and role != "axis" else None
        variable = self._dataset.createVariable(
            name, kind, tuple(dimensions), fill_value=fill, contiguous=blocks is None, chunksizes=blocks
        )
        level = (label or None) if family is None else None
        own = {"role": role, "belongs_to": owner or None, "scheme_level": level, "family": family}
        set_attributes(variable, {**attributes, **own})
        self.found[key] = variable
        return variable

    def _make_numbers(self) -> None:
        count = np.arange(self._description.realizations, dtype=np.int32)
        sample, repeat = np.divmod(count, np.int32(self._description.repeats))
        columns = {
            "realization": ("number of the realization", count),
            "sample": ("number of the parameter sample", sample),
            "repeat": ("number of the noise path of the sample", repeat),
            "replicate": ("number of the scrambling of the sample", sample % self._description.replicates),
        }
        for name, (long_name, values) in columns.items():
            standard = "realization" if name == "realization" else None
            about = {"long_name": long_name, "units": "1", "standard_name": standard}
            self._make((name, "", ""), name, ALONG, about, "i4")[:] = values

    def _make_failures(self) -> None:
        long_name = "whether, and why, a realization failed"
        self._make_flags("", "failed", ALONG, {"long_name": long_name, "coordinates": self._coordinates})
        about = {
            "long_name": "model time at which the field of a failed realization ceased to be finite",
            "units": self._description.axes.time_units,
            "coordinates": self._coordinates,
        }
        self._make(("failed_at", "", ""), "failed_at", ALONG, about)

    def _make_flags(self, label: str, name: str, along: Sequence[str], about: Mapping[str, Any]) -> None:
        flags = {
            "units": "1",
            "flag_values": np.array(list(FAILURE_MEANINGS), dtype=np.int32),
            "flag_meanings": " ".join(FAILURE_MEANINGS.values()),
        }
        self._make(("failed", "", label), name, along, {**about, **flags}, "i4")

    def _make_quantity(self, quantity: QuantityColumn, name: str) -> None:
        ancillary = "failed"
        if quantity.may_not_occur:
            margin = self.names.take(f"{quantity.name}_margin")
            about = {
                "long_name": f"margin by which {quantity.name} occurs, negative where it does not",
                "units": self._description.axes.field_units,
                "coordinates": self._coordinates,
            }
            self._make(("margin", quantity.name, ""), margin, ALONG, about)
            ancillary += f" {margin}"
        about = {
            "long_name": quantity.name,
            "units": quantity.units,
            "measure": quantity.measure,
            "coordinates": self._coordinates,
            "ancillary_variables": ancillary,
        }
        self._make(("value", quantity.name, ""), name, ALONG, about)

    def _make_probes(self) -> None:
        probes = np.arange(self._description.probes * self._description.repeats, dtype=np.int32)
        about = {"long_name": "number of the realization of the probe", "units": "1"}
        self._make(("probe", "", ""), "probe", ("probe",), about, "i4")[:] = probes
        for level in self._description.extra_levels:
            scheme = {
                "nodes": level.nodes,
                "quadrature_points": level.quadrature_points,
                "halvings_of_the_step": level.halvings,
                "noise_modes": level.modes or None,
            }
            at = f"at level {level.label}"
            self._make_further(_Further(level.label, "probe", at, f"probe failed {at}", scheme))

    def _make_families(self) -> None:
        for family, count in self._description.families.items():
            label = netcdf_name(family)
            about = {
                "long_name": f"number of the run of the family {family}",
                "units": "1",
                "comment": FAMILY_COMMENTS[family],
            }
            numbers = np.arange(count, dtype=np.int32)
            self._make(("number", "", label), label, (label,), about, "i4")[:] = numbers
            words = f"in runs of the family {family}"
            self._make_further(_Further(label, label, words, f"run of the family {family} failed", {}))

    def _make_further(self, runs: _Further) -> None:
        """The flags of further runs and all quantities with their margins."""
        along = (runs.dimension,)
        failed = self.names.take(f"failed_{runs.label}")
        self._make_flags(runs.label, failed, along, {"long_name": f"whether, and why, a {runs.who_failed}"})
        more = {**runs.attributes, "ancillary_variables": failed}
        for quantity in self._description.quantities:
            about = {"long_name": f"{quantity.name} {runs.words}", "units": quantity.units}
            name = self.names.take(f"{quantity.name}_{runs.label}")
            self._make(("value", quantity.name, runs.label), name, along, {**about, **more})
            if quantity.may_not_occur:
                about = {
                    "long_name": f"margin by which {quantity.name} occurs {runs.words}",
                    "units": self._description.axes.field_units,
                }
                name = self.names.take(f"{quantity.name}_margin_{runs.label}")
                self._make(("margin", quantity.name, runs.label), name, along, {**about, **more})

    def _make_moments(self) -> None:
        axes = self._description.axes
        position = {"long_name": "position", "units": axes.length_units}
        self._make(("axis", "x", ""), "x", ("x",), position)[:] = axes.x
        times = {"long_name": "model time of mean and standard deviation", "units": axes.time_units}
        self._make(("axis", "t_moments", ""), "t_moments", ("t_moments",), times)[:] = axes.moment_times
        for name, method in (("mean", "mean"), ("sd", "standard_deviation")):
            about = {
                "long_name": f"{method.replace('_', ' ')} of the field over realizations",
                "units": axes.field_units,
                "cell_methods": f"realization: {method}",
            }
            self._make((f"field_{name}", "", ""), self.names.take(f"u_{name}"), ("t_moments", "x"), about)
        probabilities = {"long_name": "probability of a quantile of the field", "units": "1"}
        self._make(("axis", "band", ""), "band", ("band",), probabilities)[:] = BAND
        about = {
            "long_name": f"quantiles of the field over the first {BAND_SAMPLES} realizations at most",
            "units": axes.field_units,
        }
        self._make(("field_band", "", ""), self.names.take("u_band"), ("band", "t_moments", "x"), about)

    def _make_fields(self) -> None:
        description, axes = self._description, self._description.axes
        times = {"long_name": "model time", "units": axes.time_units}
        self._make(("axis", "t", ""), "t", ("t",), times)[:] = axes.kept_times
        shape = (len(axes.kept_times), len(axes.x))
        rows = max(1, min(description.kept, FIELD_BLOCK // (shape[0] * shape[1])))
        some = f"stored for the first {description.kept} realizations only"
        about = {
            "long_name": "field",
            "units": axes.field_units,
            "coordinates": self._coordinates,
            "ancillary_variables": "failed",
            "comment": some if description.kept < description.realizations else None,
        }
        field = self._make(("field", "", ""), "u", (*ALONG, "t", "x"), about, blocks=(rows, *shape))
        field.set_var_chunk_cache(size=2 * 8 * rows * shape[0] * shape[1])

    def make_histories(self, names: Sequence[str]) -> None:
        """Add fans and single paths of the quantities that are followed in time; without any, nothing."""
        if not names:
            return
        few = min(PATHS, self._description.realizations)
        for name, length in (("fan", len(FAN)), ("path", few)):
            self._dataset.createDimension(name, length)
        probabilities = {"long_name": "probability of a quantile of a quantity in time", "units": "1"}
        self._make(("axis", "fan", ""), "fan", ("fan",), probabilities)[:] = FAN
        numbers = {"long_name": "number of the realization of the path", "units": "1"}
        self._make(("path", "", ""), "path", ("path",), numbers, "i4")[:] = np.arange(few, dtype=np.int32)
        for quantity in self._description.quantities:
            if quantity.name in names:
                self._make_history(quantity)

    def _make_history(self, quantity: QuantityColumn) -> None:
        words = f"{quantity.followed} of {quantity.name}" if quantity.followed else quantity.name
        units = quantity.followed_units or quantity.units
        where = " in which it occurs" if quantity.may_not_occur else ""
        fan = {
            "long_name": f"quantiles of {words} in time over the first {FAN_REALIZATIONS} realizations at most"
            f"{where}",
            "units": units,
        }
        name = self.names.take(f"{quantity.name}_fan")
        self._make(("fan", quantity.name, ""), name, ("fan", "t_moments"), fan)
        paths = {"long_name": f"{words} in time in single realizations", "units": units}
        name = self.names.take(f"{quantity.name}_paths")
        self._make(("paths", quantity.name, ""), name, ("path", "t_moments"), paths)
