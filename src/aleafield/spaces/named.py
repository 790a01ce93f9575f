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


def _space(projector: str, domain: Domain) -> type[Space]:
    if projector not in _SPACES:
        needed = "one of " + ", ".join(_SPACES) + " is needed"
        raise InputError("scheme.projector", f"{projector!r}", needed)
    if not isinstance(domain, _SPACES[projector].domains):
        where = "a ring" if domain.periodic else "an interval"
        fitting = [repr(name) for name, space in _SPACES.items() if isinstance(domain, space.domains)]
        raise InputError("scheme.projector", f"{projector!r} on {where}", "use " + " or ".join(fitting))
    return _SPACES[projector]


def make_space(projector: str, domain: Domain, n: int) -> Space:
    """The space of dimension n of that projector on the domain.

    Raises
    ------
    InputError
        Where the name is unknown, the space does not exist on the domain, or n is too small.
    """
    return _space(projector, domain)(domain, n)


def nodes_refinement(projector: str, domain: Domain) -> Refinement:
    """How `nodes` grows and shrinks from level to level, before any space is built.

    Raises
    ------
    InputError
        Where the name is unknown or the space does not exist on the domain.
    """
    return _space(projector, domain).refinement(domain)
