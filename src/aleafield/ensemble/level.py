"""A level: one discretisation of the field, in four integers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

Side = Literal["above", "below"]


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
    modes : int
        Noise modes that are kept; 0 without noise.
    """

    nodes: int
    quadrature_points: int
    halvings: int = 0
    modes: int = 0

    @property
    def label(self) -> str:
        """Short name for files and messages, as in ``n257_q513_h0``, with noise ``n257_q513_h0_m65``."""
        label = f"n{self.nodes}_q{self.quadrature_points}_h{self.halvings}".replace("-", "m")
        return f"{label}_m{self.modes}" if self.modes else label


@dataclass(frozen=True)
class PathPart:
    """One part of the discretisation error: two neighbouring pairs of levels along the path of refinement.

    The part is the difference ``run - finer`` of the same samples; ``coarser - run`` tells the observed order.

    Attributes
    ----------
    name : str
        "quadrature", "space", "time" or "noise_modes".
    pair : (Level, Level)
        The run's side and the finer level.
    coarse_pair : (Level, Level) or None
        A coarser level and the run's side; None where the factor is known and no order is observed.
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
    known_factor : float or None
        The safety factor where it follows from what is known beforehand: for noise modes, from the variance
        that is dropped at both levels.
    open_side : mapping
        By quantity: the side of the run's value on which the truth may lie at a distance that no order bounds
        (extremes over a window of a noisy path, seen at the ends of steps only).
    open_occurrence : mapping
        The same of the margin by which a quantity occurs.
    passages : frozenset
        Names of quantities that jump as the path of a noisy field moves (a first passage): differences of pairs
        tell no order, those of the margin do.
    note : str
        Why the expected order is what it is, in words.
    """

    name: str
    pair: tuple[Level, Level]
    coarse_pair: tuple[Level, Level] | None
    ratio: float
    coarse_ratio: float
    expected_order: float | None
    observed_only: bool = False
    least_factor: Mapping[str, float] = field(default_factory=dict)
    peaks: frozenset[str] = frozenset()
    erratic: bool = False
    known_factor: float | None = None
    open_side: Mapping[str, Side] = field(default_factory=dict)
    open_occurrence: Mapping[str, Side] = field(default_factory=dict)
    passages: frozenset[str] = frozenset()
    note: str = ""

    @property
    def levels(self) -> frozenset[Level]:
        """All levels that this part needs."""
        return frozenset((*self.pair, *(self.coarse_pair or ())))
