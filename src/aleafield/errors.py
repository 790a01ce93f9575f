"""The exceptions of aleafield: each names the place, what was found, what is needed and the way out."""

from __future__ import annotations

from pathlib import Path


class AleafieldError(Exception):
    """Any fault that is reported to the user as one message, never as a traceback.

    Attributes
    ----------
    exit_status : int
        What the command line returns: 2 the study or the arguments are at fault, 3 interrupted and resumable.
    """

    exit_status = 2


class InputError(AleafieldError):
    """Something that a user wrote cannot be used.

    Parameters
    ----------
    key : str
        Dotted path of the entry, as in ``kernel.width``; empty where the whole file is meant.
    found : str
        What was given.
    needed : str
        What would be right.
    nearest : str, optional
        The nearest valid name.
    file, line : optional
        Where it stands; the study reader adds them.
    """

    def __init__(
        self,
        key: str,
        found: str,
        needed: str,
        *,
        nearest: str | None = None,
        file: str | Path | None = None,
        line: int | None = None,
    ) -> None:
        self.key = key
        self.found = found
        self.needed = needed
        self.nearest = nearest
        self.file = None if file is None else str(file)
        self.line = line
        super().__init__(str(self))

    def __reduce__(self) -> tuple[object, ...]:
        return _rebuild, (self.key, self.found, self.needed, self.nearest, self.file, self.line)

    def __str__(self) -> str:
        place = ""
        if self.file is not None:
            place = f"{self.file}:" + ("" if self.line is None else f"{self.line}:") + " "
        key = f"{self.key}: " if self.key else ""
        hint = f" (did you mean {self.nearest!r}?)" if self.nearest else ""
        return f"{place}{key}{self.found}; {self.needed}{hint}"

    def placed(self, file: str | Path, line: int | None) -> InputError:
        """The same error with the place where the entry stands."""
        return InputError(self.key, self.found, self.needed, nearest=self.nearest, file=file, line=line)


def _rebuild(
    key: str, found: str, needed: str, nearest: str | None, file: str | None, line: int | None
) -> InputError:
    return InputError(key, found, needed, nearest=nearest, file=file, line=line)


class ArchiveError(AleafieldError):
    """A results folder cannot be used as it is: another study, damaged, or not a results folder."""


class Interrupted(AleafieldError):
    """The run was stopped; the same command goes on where it stopped."""

    exit_status = 3
