"""A results folder as a study meets it: new, its own, or somebody else's."""

from __future__ import annotations

import posixpath
from collections.abc import Iterable
from pathlib import Path, PurePosixPath

from aleafield.archive.durable import make_folder, write_bytes
from aleafield.archive.layout import Layout
from aleafield.errors import ArchiveError
from aleafield.runs.plan_file import Plan, read_plan
from aleafield.study.reading import read_text
from aleafield.study.study import Study


def claimed_plan(layout: Layout, study: Study) -> Plan | None:
    """The plan that a folder already holds for a study; None where the folder is still free.

    Raises
    ------
    ArchiveError
        When the folder belongs to another study, or holds files that no run left there.
    """
    if layout.plan.exists():
        plan = read_plan(layout)
        if plan.digest != study.digest:
            raise ArchiveError(
                f"{layout.folder}: holds results of another study (digest {plan.digest[:12]}, this one has "
                f"{study.digest[:12]}): a study that was changed in anything but title, about and [report] "
                f"needs a folder of its own; give another --out, or compare with {layout.study}"
            )
        return plan
    foreign = layout.foreign()
    if layout.study.exists() and layout.study.read_text(encoding="utf-8") != study.source.text:
        foreign.append(layout.study.name)
    started_only = {layout.study.name, layout.inputs.name, layout.lock.name}
    foreign += [p.name for p in layout.folder.iterdir() if p.name not in {*foreign, *started_only}]
    if foreign:
        found = ", ".join(foreign[:3]) + (", .." if len(foreign) > 3 else "")
        raise ArchiveError(
            f"{layout.folder}: not empty, and not a results folder of aleafield (it holds {found}); give a "
            "new or an empty folder as --out"
        )
    return None


def data_folder(names: Iterable[str]) -> str:
    """Where below the results folder the study's relative paths start, so that all copies stay in inputs/.

    >>> data_folder(["gain.csv"]), data_folder(["../data/gain.csv"])
    ('inputs', 'inputs/up')
    """
    steps = [PurePosixPath(posixpath.normpath(name)).parts.count("..") for name in names]
    return "/".join(["inputs", *["up"] * max(steps, default=0)])


def write_study(layout: Layout, study: Study) -> None:
    """Copy the study's text and its data files, exactly; a file with an absolute path stays where it is."""
    names = study.source.data_files
    base = layout.folder / data_folder(names)
    for name, data in names.items():
        if not PurePosixPath(name).is_absolute():
            path = Path(posixpath.normpath((base / name).as_posix()))
            make_folder(path.parent)
            make_folder(base)
            write_bytes(path, data)
    write_bytes(layout.study, study.source.text.encode())


def stored_study(layout: Layout, plan: Plan) -> Study:
    """The study of a results folder, read from its copy.

    Raises
    ------
    ArchiveError
        When the copy is gone.
    InputError
        When it can no longer be read.
    """
    text = stored_text(layout)
    if text is None:
        raise ArchiveError(f"{layout.folder}: its copy of the study (study.toml) is gone")
    return read_text(text, layout.folder / plan.data_folder / layout.study.name)


def stored_text(layout: Layout) -> str | None:
    """The study's text in a folder, None where there is none."""
    return layout.study.read_bytes().decode() if layout.study.exists() else None
