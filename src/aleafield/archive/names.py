"""Names of netCDF variables."""

from __future__ import annotations

import re

FIXED = (
    *("realization", "sample", "repeat", "replicate", "probe", "failed", "failed_at"),
    *("u", "t", "x", "t_moments", "band", "fan", "path"),
    *("held_out", "exchange", "screening"),
)
"""Names that are taken before any input or quantity."""


def netcdf_name(text: str) -> str:
    """Every character but letters and digits becomes an underscore.

    >>> netcdf_name("kernel.excitation.width")
    'kernel_excitation_width'
    """
    return re.sub(r"[^A-Za-z0-9]", "_", text)


class Names:
    """Hands out names, each once: a name already taken gets an underscore behind it."""

    def __init__(self) -> None:
        self._taken = set(FIXED)

    def take(self, text: str) -> str:
        """The netCDF name of a text, free of collisions with all names taken before."""
        name = netcdf_name(text)
        while name in self._taken:
            name += "_"
        self._taken.add(name)
        return name
