"""How far a run is, and how long it will still take: one line on standard error."""

from __future__ import annotations

import sys
import time
from typing import Protocol, TextIO

REDRAW_SECONDS = 0.2
PLAIN_SHARE = 0.1
"""Away from a terminal a line is printed for every tenth of the work."""


class Progress(Protocol):
    """What a run tells while it works; work is counted in operations."""

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
    """Tells nothing."""

    def start(self, total: float, done: float) -> None:
        """Passed over."""

    def advance(self, work: float) -> None:
        """Passed over."""

    def finish(self) -> None:
        """Passed over."""


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

    def start(self, total: float, done: float) -> None:
        """Show how much is left."""
        self._total, self._done, self._before = max(total, 1.0), done, done
        self._start = self._shown_at = time.monotonic()
        self._shown_share = done / self._total
        if self._redraws or done > 0.0:
            self._show()

    def advance(self, work: float) -> None:
        """Add work, and redraw when it is time."""
        self._done += work
        now, share = time.monotonic(), self._done / self._total
        due = now - self._shown_at >= REDRAW_SECONDS
        if (self._redraws and due) or (not self._redraws and share - self._shown_share >= PLAIN_SHARE):
            self._shown_at, self._shown_share = now, share
            self._show()

    def finish(self) -> None:
        """Show the last state and leave the line."""
        if self._redraws:
            self._show()
            self._stream.write("\n")
            self._stream.flush()

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
