"""From the text of a study file to its objects: one file for each section.

A section's reader takes a `Table`, asks it for every entry that it knows, and raises `InputError` with the
dotted key of whatever cannot be used; `reader` adds the file and the line.
"""

from __future__ import annotations

from aleafield.study.reading.reader import read_study, read_text

__all__ = ["read_study", "read_text"]
