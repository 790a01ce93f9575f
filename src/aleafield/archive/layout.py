"""The names of everything inside a results folder."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

PARTIAL = ".partial"
"""Ending of a file that is being written; left behind only by a run that was killed."""


@dataclass(frozen=True)
class Layout:
    """Paths below one results folder.

    Attributes
    ----------
    folder : Path
    """

    folder: Path

    @property
    def study(self) -> Path:
        """Exact copy of the study file."""
        return self.folder / "study.toml"

    @property
    def plan(self) -> Path:
        """Every adaptive choice of the run, written before the first chunk is solved."""
        return self.folder / "plan.json"

    @property
    def inputs(self) -> Path:
        """Copies of the data files that the study reads."""
        return self.folder / "inputs"

    @property
    def parts(self) -> Path:
        """Chunks and their manifest; gone when the ensemble is in place."""
        return self.folder / "parts"

    @property
    def manifest(self) -> Path:
        """List of the chunks that are stored, with their hashes."""
        return self.parts / "manifest.jsonl"

    @property
    def ensemble(self) -> Path:
        """The ensemble as one CF netCDF file."""
        return self.folder / "ensemble.nc"

    @property
    def table(self) -> Path:
        """Inputs and quantities of the ensemble as text."""
        return self.folder / "ensemble.csv"

    @property
    def summary(self) -> Path:
        """Statements with their errors, for programs."""
        return self.folder / "summary.json"

    @property
    def report(self) -> Path:
        """The page for people."""
        return self.folder / "report.html"

    @property
    def figures(self) -> Path:
        """Figures of the page as files of their own."""
        return self.folder / "figures"

    @property
    def lock(self) -> Path:
        """Present while a process works in the folder."""
        return self.folder / ".lock"

    def field_state(self, realizations: int) -> Path:
        """What an extension needs of the fields of so many realizations besides the ensemble."""
        return self.folder / f"field_state_{realizations}.nc"

    def field_states(self) -> list[Path]:
        """Field states of any number of realizations."""
        return sorted(self.folder.glob("field_state_*.nc"))

    def foreign(self) -> list[str]:
        """Names in the folder that no run leaves there, in order."""
        own = {
            path.name
            for path in (
                self.study,
                self.plan,
                self.inputs,
                self.parts,
                self.ensemble,
                self.table,
                self.summary,
                self.report,
                self.figures,
                self.lock,
            )
        }
        own.update(path.name for path in self.field_states())
        return sorted(p.name for p in self.folder.iterdir() if p.name not in own and p.suffix != PARTIAL)
