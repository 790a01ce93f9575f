"""The path of levels along which the discretisation error is split.

Quadrature first: projector and unknowns kept, every integral with twice the points.  Then space: the
projector refined on exactly those points and weights.  The two differences add up to the matched
refinement.  Then the time step halved.  The coarser neighbours give the observed orders.
"""

from __future__ import annotations

from aleafield.ensemble.level import Level, PathPart
from aleafield.geometry import Refinement
from aleafield.projection.pairing import Pairing


def split_path(pairing: Pairing, level: Level) -> tuple[PathPart, ...]:
    """The parts quadrature, space and time of the error of a level.

    Returns
    -------
    three PathPart, with the true ratios of mesh widths; factors that depend on quantities are left open.

    Raises
    ------
    InputError
        Where a level has no coarser neighbour.
    """
    n, q, h = level.nodes, level.quadrature_points, level.halvings
    fine_n, fine_q = pairing.refined(n, q)
    coarse_n, coarse_q = pairing.coarsened(n, q)
    run = level
    more_points = Level(n, fine_q, h)
    finer = Level(fine_n, fine_q, h)
    coarser = Level(coarse_n, coarse_q, h)
    coarser_space = Level(coarse_n, q, h)
    nodes, points = pairing.node_refinement, pairing.point_refinement
    return (
        PathPart(
            name="quadrature",
            pair=(run, more_points),
            coarse_pair=(coarser, coarser_space),
            ratio=width_ratio(points, q, fine_q),
            coarse_ratio=width_ratio(points, coarse_q, q),
            expected_order=pairing.quadrature.order,
            observed_only=pairing.quadrature.observed_only,
            erratic=pairing.data_jump,
            note=pairing.quadrature.reason,
        ),
        PathPart(
            name="space",
            pair=(more_points, finer),
            coarse_pair=(coarser_space, run),
            ratio=width_ratio(nodes, n, fine_n),
            coarse_ratio=width_ratio(nodes, coarse_n, n),
            expected_order=pairing.space.order,
            observed_only=pairing.space.observed_only,
            erratic=pairing.data_jump,
            note=pairing.space.reason,
        ),
        PathPart(
            name="time",
            pair=(run, Level(n, q, h + 1)),
            coarse_pair=(Level(n, q, h - 1), run),
            ratio=2.0,
            coarse_ratio=2.0,
            expected_order=pairing.time.order,
            observed_only=pairing.time.observed_only,
            note=pairing.time.reason,
        ),
    )


def width_ratio(refinement: Refinement, coarse: int, fine: int) -> float:
    """Mesh width of the coarser count over that of the finer one."""
    ends = 1 if refinement.both_ends else 0
    return (fine - ends) / (coarse - ends)
