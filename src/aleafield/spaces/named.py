"""Spaces by the name of their projector in a study file."""

from __future__ import annotations

from aleafield.errors import InputError
from aleafield.geometry import Domain, Refinement
from aleafield.spaces.chebyshev import Chebyshev
from aleafield.spaces.fourier import Fourier
from aleafield.spaces.legendre import Legendre
from aleafield.spaces.piecewise_linear import PiecewiseLinear
from aleafield.spaces.space import Space

_SPACES: dict[str, type[Space]] = {
    space.projector: space for space in (PiecewiseLinear, Chebyshev, Legendre, Fourier)
}
PROJECTORS = tuple(_SPACES)


def _space(projector: str) -> type[Space]:
    if projector not in _SPACES:
        needed = "one of " + ", ".join(PROJECTORS) + " is needed"
        raise InputError("scheme.projector", f"{projector!r}", needed)
    return _SPACES[projector]


def make_space(projector: str, domain: Domain, n: int) -> Space:
    """The space of dimension n of that projector on the domain.

    Raises
    ------
    InputError
        Where the name is unknown, the space does not exist on the domain, or n is too small.
    """
    return _space(projector)(domain, n)


def nodes_refinement(projector: str, domain: Domain) -> Refinement:
    """How `nodes` grows and shrinks from level to level, before any space is built.

    Raises
    ------
    InputError
        Where the name is unknown.
    """
    return _space(projector).refinement(domain)
