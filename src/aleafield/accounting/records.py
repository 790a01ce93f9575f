"""What the error split reads besides the sample: one quantity at neighbouring levels on the probes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import BoolArray, FloatArray, IntArray
from aleafield.ensemble.level import Side

PART_NAMES = ("space", "quadrature", "time", "noise_modes")
"""The discretisation parts in the order of the summary."""
LARGEST_SPECTRAL_ORDER = 4.0
"""No more than this order is counted on where the error falls faster than any power."""
MESH = "mesh"
"""Space and quadrature refined together: no part of its own, but it may bound the sum of the two."""


@dataclass(frozen=True, eq=False)
class LevelValues:
    """One quantity on the n_p probes at one level.

    Attributes
    ----------
    values : float array (n_p,)
        NaN where the quantity does not occur or the probe failed.
    occurs, valid : bool array (n_p,)
    margin : float array (n_p,) or None
        As in `aleafield.estimates.Sample`.
    """

    values: FloatArray
    occurs: BoolArray
    valid: BoolArray
    margin: FloatArray | None

    @staticmethod
    def of(
        values: FloatArray, margin: FloatArray | None = None, valid: BoolArray | None = None
    ) -> LevelValues:
        """Values whose occurrence follows from the margin (without one the quantity always occurs)."""
        values = np.asarray(values, dtype=np.float64)
        valid = np.ones(values.shape, dtype=np.bool_) if valid is None else np.asarray(valid, dtype=np.bool_)
        return LevelValues(values, valid if margin is None else valid & (margin >= 0.0), valid, margin)


@dataclass(frozen=True, eq=False)
class Pair:
    """The same probes (inputs and noise paths shared) at two levels that differ in one thing only."""

    coarser: LevelValues
    finer: LevelValues

    @property
    def valid(self) -> BoolArray:
        """Probes that failed at neither level, (n_p,)."""
        return self.coarser.valid & self.finer.valid

    @property
    def occurs(self) -> BoolArray:
        """Probes on which the quantity occurs at both levels, (n_p,)."""
        return self.coarser.occurs & self.finer.occurs


@dataclass(frozen=True, eq=False)
class PartDifferences:
    """Everything that one discretisation part is made from.

    With levels a = (n, q, dt), b = (n, 2q, dt), c = (2n, 2q, dt), d = (n, q, dt/2) and the coarser
    a0 = (n/2, q/2, dt), b0 = (n/2, q, dt), d0 = (n, q, 2dt), n unknowns, q quadrature points, dt the step:

    ========== ========= =============
    part       `fine`    `coarse`
    ========== ========= =============
    quadrature (a, b)    (a0, b0)
    space      (b, c)    (b0, a)
    time       (a, d)    (d0, a)
    mesh       (a, c)    (a0, a)
    ========== ========= =============

    Attributes
    ----------
    name : "space", "quadrature", "time", "noise_modes" or "mesh"
    probes : int array (n_p,)
        Positions of the probes in the sample of the run.
    fine : Pair
        The difference that is the part.
    coarse : Pair or None
        The difference one level up, from which the order is observed; None where there is no such level.
    ratio_fine, ratio_coarse : float > 1
        Mesh width (or step) of the coarser over the finer level of each pair.
    expected_order : float or None
        Order that theory gives for this part and quantity; None for faster than any power.
    observed_only : bool
        No order is proven (step rate): the observed one is used, within 1/2 and 2.
    least_factor : float
        Lower bound of the factor; 2 for a value at a point that is not a node of all levels.
    peak : bool
        The position of a peak: its difference is a sawtooth of the mesh, and the coarser pair counts too.
    erratic : bool
        The error jumps about from level to level: no corrected value is offered.
    round_off : float
        Differences up to this size (units of the quantity) are rounding, besides 1e-13 of its largest value.
    known_factor : float or None
        The factor where it follows from what is known beforehand (noise modes: from the variance that is dropped
        at both levels); no order is observed then, and `coarse` may be None.
    open_side : "above", "below" or None
        Side of the run's value on which the truth may lie at a distance that no order bounds: an extreme over a
        window of a noisy path, seen at the ends of steps only.
    open_occurrence : "above", "below" or None
        The same for the margin: "above" where the quantity occurs once it does at any time of the window,
        "below" where it must do so throughout.
    passage : bool
        The quantity jumps as the path of a noisy field moves: a path that just misses a level reaches it much
        later.  The root mean square of its differences then falls like the root of the part, their mean like the
        part; the order is that of the margin, which is continuous.
    noisy : bool
        The differences hold noise that does not follow the quantity (a study with noise in the tissue): it
        averages out, and a regression on the quantity is as uncertain as its mean, not as its residuals.
    """

    name: str
    probes: IntArray
    fine: Pair
    coarse: Pair | None
    ratio_fine: float = 2.0
    ratio_coarse: float = 2.0
    expected_order: float | None = 2.0
    observed_only: bool = False
    least_factor: float = 1.0
    peak: bool = False
    round_off: float = 0.0
    erratic: bool = False
    known_factor: float | None = None
    open_side: Side | None = None
    open_occurrence: Side | None = None
    passage: bool = False
    noisy: bool = False

    def __post_init__(self) -> None:
        if self.name not in (*PART_NAMES, MESH):
            raise ValueError(f"{self.name!r} is none of the parts {', '.join((*PART_NAMES, MESH))}")
        if self.ratio_fine <= 1.0 or self.ratio_coarse <= 1.0:
            raise ValueError("the ratios of mesh widths or steps are coarser over finer, above 1")
        pairs = [self.fine] + ([] if self.coarse is None else [self.coarse])
        if any(level.values.shape != self.probes.shape for p in pairs for level in (p.coarser, p.finer)):
            raise ValueError("all arrays of a part need the shape (n_p,) of its probes")

    @property
    def open(self) -> bool:
        """Whether no order bounds the quantity or its margin on some side."""
        return self.open_side is not None or self.open_occurrence is not None

    @property
    def order_of_chance(self) -> float | None:
        """Order at which the coarser difference, brought down, bounds a finer one that is small by chance.

        A piecewise-linear field's peak jumps with the mesh: its expected order.  Refined together, space and
        quadrature may cancel on one mesh, or on all: twice the expected order lets the sum converge faster
        than its parts, but not vanish.  An erratic error may be small on any one mesh: order 1.  None: the finer
        difference stands alone.
        """
        if self.erratic:
            return 1.0
        if self.peak:
            return 2.0 if self.expected_order is None else self.expected_order
        if self.name == MESH:
            return 2.0 * (LARGEST_SPECTRAL_ORDER if self.expected_order is None else self.expected_order)
        return None
