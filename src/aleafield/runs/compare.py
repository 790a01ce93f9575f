"""The paired difference of two runs that share their sample points."""

from __future__ import annotations

import json
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from aleafield.archive.ensemble_reader import EnsembleReader, reading
from aleafield.archive.layout import Layout
from aleafield.arrays import FloatArray
from aleafield.errors import ArchiveError, InputError
from aleafield.estimates import Estimate, Sample, estimate_mean


@dataclass(frozen=True)
class QuantityDifference:
    """B minus A of one quantity, sample by sample.

    Attributes
    ----------
    name, units : str
    mean : Estimate
        Mean difference with its sampling interval, units of the quantity.
    sd : float or None
        Standard deviation of the differences; None for fewer than two pairs.
    share : float
        Share of the common samples that count: those that failed in neither run and in which the quantity
        occurs in both.
    """

    name: str
    units: str
    mean: Estimate
    sd: float | None
    share: float


@dataclass(frozen=True)
class Comparison:
    """Two runs, compared.

    Attributes
    ----------
    folder_a, folder_b : Path
    samples : int
        Common samples: the first ones of both.
    confidence : float
        Of the intervals; that of run A.
    differences : by quantity, in the order of run A
    only_one : names of quantities that only one of the runs has
    """

    folder_a: Path
    folder_b: Path
    samples: int
    confidence: float
    differences: tuple[QuantityDifference, ...]
    only_one: tuple[str, ...]

    def as_json(self) -> dict[str, object]:
        """The comparison as one document; no NaN, no Infinity."""
        return {
            "schema": 1,
            "runs": [str(self.folder_a), str(self.folder_b)],
            "samples": self.samples,
            "confidence": self.confidence,
            "quantities": {
                one.name: {
                    "units": one.units,
                    "mean_difference": {
                        "value": one.mean.value,
                        "interval": None if one.mean.value is None else [one.mean.low, one.mean.high],
                        **({} if one.mean.reason is None else {"reason": one.mean.reason}),
                    },
                    "sd_of_differences": one.sd,
                    "share": one.share,
                }
                for one in self.differences
            },
            "only_in_one": list(self.only_one),
        }

    def as_text(self) -> str:
        """The comparison as a table for people."""
        head = ["quantity", "mean of B - A", f"{100 * self.confidence:g} % interval", "sd of B - A", "pairs"]
        rows = [head, *(self._row(one) for one in self.differences)]
        widths = [max(len(row[column]) for row in rows) for column in range(len(head))]
        lines = [f"A: {self.folder_a}", f"B: {self.folder_b}", f"{self.samples} common samples", ""]
        for row in rows:
            cells = (cell.ljust(width) for cell, width in zip(row, widths, strict=True))
            lines.append("  ".join(cells).rstrip())
        if self.only_one:
            lines += ["", f"only in one of the runs: {', '.join(self.only_one)}"]
        return "\n".join(lines)

    @staticmethod
    def _row(one: QuantityDifference) -> list[str]:
        unit = "" if one.units == "1" else f" {one.units}"
        share = f"{100 * one.share:.4g} %"
        if one.mean.value is None:
            return [one.name, one.mean.reason or "not determined", "", "", share]
        ends = f"{one.mean.low:.4g} to {one.mean.high:.4g}"
        return [
            one.name,
            f"{one.mean.value:.4g}{unit}",
            ends,
            "" if one.sd is None else f"{one.sd:.4g}",
            share,
        ]


def compare(folder_a: Path | str, folder_b: Path | str) -> Comparison:
    """The paired difference B minus A of two finished runs.

    Raises
    ------
    ArchiveError
        When a folder holds no finished run.
    InputError
        When the runs do not share their sample points, or have no quantity in common.
    """
    a, b = Layout(Path(folder_a)), Layout(Path(folder_b))
    with reading(a.ensemble) as run_a, reading(b.ensemble) as run_b:
        samples = min(len(run_a), len(run_b))
        _refuse_other_points(run_a, run_b, samples, a, b)
        common = [name for name in run_a.quantities if name in run_b.quantities]
        if not common:
            found = f"{a.folder} and {b.folder} have no quantity of the same name"
            raise InputError("compare", found, "one at least is needed")
        confidence = _confidence(a)
        return Comparison(
            folder_a=a.folder,
            folder_b=b.folder,
            samples=samples,
            confidence=confidence,
            differences=tuple(_difference(run_a, run_b, name, samples, confidence) for name in common),
            only_one=tuple(sorted(set(run_a.quantities) ^ set(run_b.quantities))),
        )


def _refuse_other_points(
    run_a: EnsembleReader, run_b: EnsembleReader, samples: int, a: Layout, b: Layout
) -> None:
    only_one = set(run_a.inputs) ^ set(run_b.inputs)
    if only_one:
        raise InputError(
            "compare",
            f"only one of {a.folder} and {b.folder} has the input {min(only_one)}",
            "a paired difference needs the same inputs in both runs",
        )
    same = bool(np.array_equal(run_a.replicate()[:samples], run_b.replicate()[:samples]))
    for path in run_a.inputs:
        same = same and bool(np.array_equal(run_a.input(path)[:samples], run_b.input(path)[:samples]))
        if not same:
            raise InputError(
                "compare",
                f"{a.folder} and {b.folder} differ in the samples of {path}",
                "a paired difference needs the same laws, dependence, method and seed in both runs, and "
                "inputs in the same order",
            )


def _difference(
    run_a: EnsembleReader, run_b: EnsembleReader, name: str, samples: int, confidence: float
) -> QuantityDifference:
    if run_a.unit(name) != run_b.unit(name):
        raise InputError(
            "compare",
            f"{name} is in {run_a.unit(name)} in one run and in {run_b.unit(name)} in the other",
            "a difference needs one unit",
        )
    counts = _counts(run_a, name, samples) & _counts(run_b, name, samples)
    difference: FloatArray = run_b.values(name)[:samples] - run_a.values(name)[:samples]
    replicate = run_a.replicate()[:samples]
    sample = Sample.of(
        difference,
        valid=counts,
        replicate=replicate,
        replicates=int(replicate.max()) + 1,
        certain=not run_a.inputs,
    )
    given = sample.given
    sd = float(np.std(given, ddof=1)) if len(given) > 1 else None
    return QuantityDifference(
        name, run_a.unit(name), estimate_mean(sample, confidence), sd, len(given) / samples
    )


def _counts(run: EnsembleReader, name: str, samples: int) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    valid, margin = run.valid()[:samples], run.margins(name)
    return valid if margin is None else valid & (margin[:samples] >= 0.0)


def _confidence(layout: Layout) -> float:
    try:
        return float(json.loads(layout.summary.read_text(encoding="utf-8"))["confidence"])
    except (OSError, ValueError, KeyError, TypeError) as error:
        raise ArchiveError(f"{layout.summary}: cannot be read ({error}); run the study again") from error
