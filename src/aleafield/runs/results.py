"""The Python face: run a study, look at what it left, run a single sample again with its fields."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from aleafield.archive.layout import Layout
from aleafield.errors import ArchiveError, InputError
from aleafield.runs.folder import stored_study
from aleafield.runs.plan_file import Plan, read_plan
from aleafield.runs.planning import MOST_STEPS_KEPT, planned_model
from aleafield.runs.progress import Progress, ProgressLine
from aleafield.runs.summary import unmet
from aleafield.study.reading import read_study
from aleafield.study.study import Study

if TYPE_CHECKING:
    import xarray


class Result:
    """A finished run.

    Attributes
    ----------
    folder : Path
        The results folder.
    study : Study
    summary : mapping
        Statements with their errors, as in summary.json.
    """

    def __init__(self, folder: Path, study: Study, plan: Plan, summary: Mapping[str, Any]) -> None:
        self.folder = folder
        self.study = study
        self.summary = summary
        self._plan = plan

    @property
    def unmet(self) -> tuple[str, ...]:
        """What the study demands and the run does not give; empty where all is met."""
        return unmet(self.study, self.summary)

    @property
    def dataset(self) -> xarray.Dataset:
        """The ensemble: inputs and quantities along ``realization``, fields, statistics; values load when used."""
        from aleafield.archive.ensemble_reader import open_ensemble

        return open_ensemble(self.folder)

    @property
    def table(self) -> str:
        """The table that ``aleafield run`` prints."""
        from aleafield.report.terminal import result_lines

        return "\n".join(result_lines(self.summary))

    def sample(self, index: int, repeat: int = 0) -> xarray.Dataset:
        """Solve one realization again and keep its field at every step (at most 200 equal times).

        Parameters
        ----------
        index : int
            Index of the parameter sample, from 0; equal to the bit to the sample of the run.
        repeat : int
            Which of its noise paths, from 0.

        Returns
        -------
        Dataset with ``u(t, x)``, the inputs as scalar coordinates and the quantities as scalar variables

        Raises
        ------
        InputError
            When the run has no such sample or noise path.
        """
        import xarray

        if not 0 <= index < self._plan.samples:
            raise InputError(
                "index", f"{index} given", f"a sample from 0 to {self._plan.samples - 1} is needed"
            )
        if not 0 <= repeat < self._plan.repeats:
            needed = f"a noise path from 0 to {self._plan.repeats - 1} is needed"
            raise InputError("repeat", f"{repeat} given", needed)
        model = planned_model(self.study, self._plan)
        times = model.schedule().times
        if len(times) > MOST_STEPS_KEPT + 1:
            times = np.linspace(0.0, times[-1], MOST_STEPS_KEPT + 1)
        level = self._plan.level
        realization = np.full(8, index * self._plan.repeats + repeat, dtype=np.int64)
        records = model.evaluate(level, realization, tuple(times)).first(1)
        assert records.fields is not None
        units = self.study.units
        coordinates: dict[str, Any] = {
            "t": ("t", times, {"units": units.time, "long_name": "model time"}),
            "x": ("x", model.points(level), {"units": units.length, "long_name": "position"}),
        }
        for one in self.study.inputs:
            value = records.inputs[one.path][0]
            coordinates[one.path] = ((), value, {"units": one.units, "law": one.law.text})
        variables: dict[str, Any] = {
            "u": (("t", "x"), records.fields[0], {"units": units.activity, "long_name": "activity"})
        }
        for quantity in self.study.quantities:
            value = records.values[quantity.name][0]
            attributes = {"units": self.study.quantity_units(quantity), "long_name": quantity.measure}
            variables[quantity.name] = ((), value, attributes)
        about = {"title": self.study.title, "sample": index, "repeat": repeat}
        return xarray.Dataset(variables, coordinates, about)

    def __repr__(self) -> str:
        return self.table

    def _repr_html_(self) -> str:
        from aleafield.report.notebook import html_table

        return html_table(self.summary)


def run(
    study: Study | Path | str,
    out: Path | str,
    *,
    workers: int = 1,
    quiet: bool = True,
    chunk_width: int | None = None,
) -> Result:
    """Run a study into a folder, or go on where an earlier call stopped.

    Parameters
    ----------
    study : Study, or the path of a study file
    out : path of the results folder
    workers : int
        Worker processes; the values do not depend on it.  More than one needs an importable main module.
    quiet : bool
        Whether to leave out the progress line on standard error.
    chunk_width : int, optional
        Samples of a chunk, a multiple of 8; no value depends on it.

    Raises
    ------
    InputError, ArchiveError, Interrupted
    """
    from aleafield.runs.run import run as run_study

    study = study if isinstance(study, Study) else read_study(study)
    done = run_study(study, out, workers, _progress(quiet), chunk_width)
    return Result(done.folder, study, read_plan(Layout(done.folder)), done.summary)


def open_run(folder: Path | str, study: Study | None = None) -> Result:
    """The result of a finished run.

    Parameters
    ----------
    folder : results folder
    study : Study, optional
        Needed only where quantities are Python functions, which no file holds.

    Raises
    ------
    ArchiveError
        When the folder holds no finished run, or one of another study.
    """
    import json

    layout = Layout(Path(folder))
    plan = read_plan(layout)
    if not layout.summary.exists():
        raise ArchiveError(f"{layout.folder}: the run is unfinished; the same call of run goes on with it")
    try:
        found = stored_study(layout, plan) if study is None else study
        other = "" if found.digest == plan.digest else "it holds the results of another study"
    except InputError as error:
        other = f"its study file does not stand alone ({error})"
    if other:
        raise ArchiveError(
            f"{layout.folder}: {other}; quantities that are Python functions are in no file, so give the study "
            "that was run: open_run(folder, study)"
        )
    return Result(layout.folder, found, plan, json.loads(layout.summary.read_text(encoding="utf-8")))


def extend(result: Result, samples: int, *, workers: int = 1, quiet: bool = True) -> Result:
    """Add at least so many samples to a finished run, keeping the old ones.

    Raises
    ------
    InputError, ArchiveError, Interrupted
    """
    from aleafield.runs.extend import extend as extend_run

    done = extend_run(result.folder, samples, workers, _progress(quiet), result.study)
    return Result(done.folder, result.study, read_plan(Layout(done.folder)), done.summary)


def _progress(quiet: bool) -> Progress | None:
    return None if quiet else ProgressLine()
