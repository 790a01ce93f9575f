"""A level: one discretisation of the field, in three integers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field


@dataclass(frozen=True, order=True)
class Level:
    """One discretisation of a study's field.

    Attributes
    ----------
    nodes : int
        Dimension of the projector's space X_n.
    quadrature_points : int
        Points of the quadrature rule, counted as the rule counts them.
    halvings : int
        How often each step of the study's schedule is halved; -1 joins two steps into one.
    """

    nodes: int
    quadrature_points: int
    halvings: int = 0

    @property
    def label(self) -> str:
        """Short name for files and messages, as in ``n257_q513_h0``."""
        return f"n{self.nodes}_q{self.quadrature_points}_h{self.halvings}".replace("-", "m")


@dataclass(frozen=True)
class PathPart:
    """One part of the discretisation error: two neighbouring pairs of levels along the path of refinement.

    The part is the difference ``run - finer`` of the same samples; ``coarser - run`` tells the observed order.

    Attributes
    ----------
    name : str
        "quadrature", "space" or "time".
    pair : (Level, Level)
        The run's side and the finer level.
    coarse_pair : (Level, Level)
        A coarser level and the run's side.
    ratio, coarse_ratio : float
        Mesh width (or step) of the coarser over the finer level of each pair.
    expected_order : float or None
        Order that theory gives; None for faster than any power.
    observed_only : bool
        No order is proven (step rate): only the observed one is used.
    least_factor : mapping
        By quantity: a lower bound of the safety factor (2 for a value off the nodes).
    peaks : frozenset
        Names of quantities that are positions of a peak.
    erratic : bool
        The error jumps about from mesh to mesh (a jump of the data in x): nothing is extrapolated from it.
    note : str
        Why the expected order is what it is, in words.
    """

    name: str
    pair: tuple[Level, Level]
    coarse_pair: tuple[Level, Level]
    ratio: float
    coarse_ratio: float
    expected_order: float | None
    observed_only: bool = False
    least_factor: Mapping[str, float] = field(default_factory=dict)
    peaks: frozenset[str] = frozenset()
    erratic: bool = False
    note: str = ""

    @property
    def levels(self) -> frozenset[Level]:
        """All levels that this part needs."""
        return frozenset((*self.pair, *self.coarse_pair))
