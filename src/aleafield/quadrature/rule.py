"""A quadrature rule: weighted points of a domain."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.arrays import FloatArray


@dataclass(frozen=True)
class Lattice:
    """The uniform structure of the points of a rule: interleaved grids of one spacing.

    With m = len(offsets), the points k, k + m, k + 2m, .. of the rule are
    origin + offsets[k] + j * spacing for j = 0, 1, .. (wrapped on a ring).  A shift-invariant kernel between
    grids of that spacing is then a Toeplitz matrix per offset, or a circulant one on a ring.

    Parameters
    ----------
    origin, spacing : float
        Units of length.
    offsets : tuple of float
        Ascending, in [0, spacing), units of length.
    """

    origin: float
    spacing: float
    offsets: tuple[float, ...]


@dataclass(frozen=True, eq=False)
class Rule:
    """The integral of g over the domain is about the sum of weights * g(points).

    Parameters
    ----------
    name : str
        trapezoid, simpson, composite gauss, gauss-legendre or clenshaw-curtis.
    points : float array (Q,)
        Units of length.  Ascending on an interval; on a ring in the order of the grid j length / n from 0 on,
        wrapped, so that the points of a doubled trapezoid rule are every second time those of the rule.
    weights : float array (Q,)
        Positive, units of length; they sum to the length of the domain.
    lattice : Lattice or None
        The uniform structure of the points, None where there is none.
    """

    name: str
    points: FloatArray
    weights: FloatArray
    lattice: Lattice | None

    def __post_init__(self) -> None:
        self.points.setflags(write=False)
        self.weights.setflags(write=False)

    @property
    def spacing(self) -> float | None:
        """Distance between neighbouring points where all are equally spaced, else None."""
        if self.lattice is None or len(self.lattice.offsets) > 1:
            return None
        return self.lattice.spacing
