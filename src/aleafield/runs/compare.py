"""The paired difference of two runs that share their sample points, and their noise paths."""

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
from aleafield.runs.plan_file import read_plan
from aleafield.runs.statements import blocks_of


@dataclass(frozen=True)
class QuantityDifference:
    """B minus A of one quantity, realization by realization.

    Attributes
    ----------
    name, units : str
    mean : Estimate
        Mean difference with its sampling interval, units of the quantity.
    sd : float or None
        Standard deviation of the differences; None for fewer than two pairs.
    share : float
        Share of the common realizations that count: those that failed in neither run and in which the
        quantity occurs in both.
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
        Common parameter samples: the first ones of both.
    repeats : int
        Noise paths of each.
    confidence : float
        Of the intervals; that of run A.
    differences : by quantity, in the order of run A
    only_one : names of quantities that only one of the runs has
    notes : what a reader must know of the pairs
    """

    folder_a: Path
    folder_b: Path
    samples: int
    repeats: int
    confidence: float
    differences: tuple[QuantityDifference, ...]
    only_one: tuple[str, ...]
    notes: tuple[str, ...] = ()

    def as_json(self) -> dict[str, object]:
        """The comparison as one document; no NaN, no Infinity."""
        return {
            "schema": 1,
            "runs": [str(self.folder_a), str(self.folder_b)],
            "samples": self.samples,
            "noise_repeats": self.repeats,
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
            "notes": list(self.notes),
        }

    def as_text(self) -> str:
        """The comparison as a table for people."""
        head = ["quantity", "mean of B - A", f"{100 * self.confidence:g} % interval", "sd of B - A", "pairs"]
        rows = [head, *(self._row(one) for one in self.differences)]
        widths = [max(len(row[column]) for row in rows) for column in range(len(head))]
        paths = f" with {self.repeats} noise paths each" if self.repeats > 1 else ""
        lines = [f"A: {self.folder_a}", f"B: {self.folder_b}", f"{self.samples} common samples{paths}", ""]
        for row in rows:
            cells = (cell.ljust(width) for cell, width in zip(row, widths, strict=True))
            lines.append("  ".join(cells).rstrip())
        if self.only_one:
            lines += ["", f"only in one of the runs: {', '.join(self.only_one)}"]
        if self.notes:
            lines += ["", *self.notes]
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
        When the runs do not share their sample points or noise paths, or have no quantity in common.
    """
    a, b = Layout(Path(folder_a)), Layout(Path(folder_b))
    with reading(a.ensemble) as run_a, reading(b.ensemble) as run_b:
        count = min(len(run_a), len(run_b))
        _refuse_other_paths(run_a, run_b, a, b)
        _refuse_other_points(run_a, run_b, count, a, b)
        common = [name for name in run_a.quantities if name in run_b.quantities]
        if not common:
            found = f"{a.folder} and {b.folder} have no quantity of the same name"
            raise InputError("compare", found, "one at least is needed")
        confidence = _confidence(a)
        return Comparison(
            folder_a=a.folder,
            folder_b=b.folder,
            samples=count // run_a.repeats,
            repeats=run_a.repeats,
            confidence=confidence,
            differences=tuple(_difference(run_a, run_b, name, count, confidence) for name in common),
            only_one=tuple(sorted(set(run_a.quantities) ^ set(run_b.quantities))),
            notes=_notes(run_a, run_b, a, b),
        )


def _noisy(run: EnsembleReader) -> bool:
    return run.attribute("noise") is not None


def _refuse_other_paths(run_a: EnsembleReader, run_b: EnsembleReader, a: Layout, b: Layout) -> None:
    if run_a.repeats != run_b.repeats:
        raise InputError(
            "compare",
            f"{a.folder} has {run_a.repeats} noise paths a sample and {b.folder} {run_b.repeats}",
            "a paired difference needs the same noise_repeats in both runs",
        )
    seeds = run_a.attribute("seed"), run_b.attribute("seed")
    if _noisy(run_a) and _noisy(run_b) and seeds[0] != seeds[1]:
        raise InputError(
            "compare",
            f"{a.folder} has the seed {seeds[0]} and {b.folder} the seed {seeds[1]}",
            "a paired difference of noisy fields needs the same seed in both runs",
        )


def _notes(run_a: EnsembleReader, run_b: EnsembleReader, a: Layout, b: Layout) -> tuple[str, ...]:
    """Whether the noise paths, which are drawn step by step, are the same in both runs."""
    if not (_noisy(run_a) and _noisy(run_b)):
        return ()
    plans = read_plan(a), read_plan(b)
    steps = [(plan.time_step, plan.schedule_times, plan.moment_times[-1]) for plan in plans]
    if steps[0] == steps[1]:
        return ()
    return (
        "the steps of the runs differ, and so do their noise paths: the intervals hold, but the differences "
        "vary as those of independent noise do",
    )


def _refuse_other_points(
    run_a: EnsembleReader, run_b: EnsembleReader, count: int, a: Layout, b: Layout
) -> None:
    only_one = set(run_a.inputs) ^ set(run_b.inputs)
    if only_one:
        raise InputError(
            "compare",
            f"only one of {a.folder} and {b.folder} has the input {min(only_one)}",
            "a paired difference needs the same inputs in both runs",
        )
    same = bool(np.array_equal(run_a.numbers("replicate", 0, count), run_b.numbers("replicate", 0, count)))
    for path in run_a.inputs:
        same = same and bool(np.array_equal(run_a.input(path)[:count], run_b.input(path)[:count]))
        if not same:
            raise InputError(
                "compare",
                f"{a.folder} and {b.folder} differ in the samples of {path}",
                "a paired difference needs the same laws, dependence, method and seed in both runs, and "
                "inputs in the same order",
            )


def _difference(
    run_a: EnsembleReader, run_b: EnsembleReader, name: str, count: int, confidence: float
) -> QuantityDifference:
    if run_a.unit(name) != run_b.unit(name):
        raise InputError(
            "compare",
            f"{name} is in {run_a.unit(name)} in one run and in {run_b.unit(name)} in the other",
            "a difference needs one unit",
        )
    counts = _counts(run_a, name, count) & _counts(run_b, name, count)
    difference: FloatArray = run_b.values(name)[:count] - run_a.values(name)[:count]
    sample = Sample.of(
        difference,
        valid=counts,
        certain=not (run_a.inputs or _noisy(run_a) or _noisy(run_b)),
        **blocks_of(run_a, count)._asdict(),
    )
    given = sample.given
    sd = float(np.std(given, ddof=1)) if len(given) > 1 else None
    return QuantityDifference(
        name, run_a.unit(name), estimate_mean(sample, confidence), sd, len(given) / count
    )


def _counts(run: EnsembleReader, name: str, count: int) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    valid, margin = run.valid()[:count], run.margins(name)
    return valid if margin is None else valid & (margin[:count] >= 0.0)


def _confidence(layout: Layout) -> float:
    try:
        return float(json.loads(layout.summary.read_text(encoding="utf-8"))["confidence"])
    except (OSError, ValueError, KeyError, TypeError) as error:
        raise ArchiveError(f"{layout.summary}: cannot be read ({error}); run the study again") from error
