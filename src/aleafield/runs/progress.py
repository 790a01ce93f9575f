"""How far a run is, and how long it will still take: one line on standard error."""

from __future__ import annotations

import sys
import time
from typing import Protocol, TextIO

REDRAW_SECONDS = 0.2
PLAIN_LINES = 10
"""Away from a terminal so many lines are printed, one for every tenth of the work."""


class Progress(Protocol):
    """What a run tells while it works; work is counted in operations."""

    def say(self, text: str) -> None:
        """One sentence, before the work that it is about."""
        ...

    def start(self, total: float, done: float) -> None:
        """Work of the whole run, and what earlier starts have done of it."""
        ...

    def advance(self, work: float) -> None:
        """So much more is done."""
        ...

    def finish(self) -> None:
        """Nothing more will be told."""
        ...


class NoProgress:
    """For runs that say nothing while they work."""

    def say(self, text: str) -> None:
        """The sentence is passed over."""

    def start(self, total: float, done: float) -> None:
        """The amount of work is passed over."""

    def advance(self, work: float) -> None:
        """What is done is passed over."""

    def finish(self) -> None:
        """The end is passed over."""


class ProgressLine:
    """The share done and the time left, from the cost per operation measured since this start.

    On a terminal one line that is redrawn; elsewhere a plain line for every tenth of the work.

    Parameters
    ----------
    stream : text stream, default standard error
    """

    def __init__(self, stream: TextIO | None = None) -> None:
        self._stream = sys.stderr if stream is None else stream
        self._redraws = self._stream.isatty()

    def say(self, text: str) -> None:
        """A line of its own."""
        self._stream.write(f"{text}\n")
        self._stream.flush()

    def start(self, total: float, done: float) -> None:
        """Show how much is left."""
        self._total, self._done, self._before = max(total, 1.0), done, done
        self._start = self._shown_at = time.monotonic()
        self._shown_lines = self._lines()
        if self._redraws or done > 0.0:
            self._show()

    def advance(self, work: float) -> None:
        """Add work, and redraw when it is time."""
        self._done += work
        now, lines = time.monotonic(), self._lines()
        due = now - self._shown_at >= REDRAW_SECONDS if self._redraws else lines > self._shown_lines
        if due:
            self._shown_at, self._shown_lines = now, lines
            self._show()

    def finish(self) -> None:
        """Show the last state and leave the line."""
        if self._redraws:
            self._show()
            self._stream.write("\n")
            self._stream.flush()

    def _lines(self) -> int:
        return int(PLAIN_LINES * self._done / self._total + 1e-9)

    def _show(self) -> None:
        text = f"solving: {100 * min(self._done / self._total, 1.0):.0f} %"
        new = self._done - self._before
        if new > 0.0 and self._done < self._total:
            left = (time.monotonic() - self._start) / new * (self._total - self._done)
            text += f", about {duration_text(left)} left"
        self._stream.write(f"\r\x1b[K{text}" if self._redraws else f"{text}\n")
        self._stream.flush()


def duration_text(seconds: float) -> str:
    """A duration in the unit that suits it.

    >>> duration_text(8.4), duration_text(200), duration_text(5000)
    ('8 s', '3 min', '1.4 h')
    """
    if seconds < 90:
        return f"{seconds:.0f} s"
    if seconds < 5400 - 600:
        return f"{seconds / 60:.0f} min"
    return f"{seconds / 3600:.1f} h"
