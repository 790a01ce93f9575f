"""The path of levels along which the discretisation error is split.

Quadrature first: projector and unknowns kept, every integral with twice the points.  Then space: the
projector refined on exactly those points and weights.  The two differences add up to the matched
refinement.  Then the time step halved, and under noise twice as many modes.  The coarser neighbours give the
observed orders; how fast the dropped share of the variance falls with the modes is known.
"""

from __future__ import annotations

from dataclasses import replace

from aleafield.ensemble.level import Level, PathPart
from aleafield.field.noise_modes import NoiseModes
from aleafield.geometry import Refinement
from aleafield.projection.pairing import Pairing


def split_path(pairing: Pairing, level: Level, noise: NoiseModes | None = None) -> tuple[PathPart, ...]:
    """The parts quadrature, space, time and, where noise modes are dropped, noise_modes of a level's error.

    All other levels keep the modes of the run, and all levels share the noise paths.

    Returns
    -------
    PathParts with the true ratios of mesh widths; factors that depend on quantities are left open.

    Raises
    ------
    InputError
        Where a level has no coarser neighbour.
    """
    n, q = level.nodes, level.quadrature_points
    fine_n, fine_q = pairing.refined(n, q)
    coarse_n, coarse_q = pairing.coarsened(n, q)
    run = level
    more_points = replace(run, quadrature_points=fine_q)
    finer = replace(run, nodes=fine_n, quadrature_points=fine_q)
    coarser = replace(run, nodes=coarse_n, quadrature_points=coarse_q)
    coarser_space = replace(run, nodes=coarse_n)
    nodes, points = pairing.node_refinement, pairing.point_refinement
    parts = (
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
            pair=(run, replace(run, halvings=run.halvings + 1)),
            coarse_pair=(replace(run, halvings=run.halvings - 1), run),
            ratio=2.0,
            coarse_ratio=2.0,
            expected_order=pairing.time.order,
            observed_only=pairing.time.observed_only,
            note=pairing.time.reason,
        ),
    )
    if noise is None or noise.exact or noise.white:
        return parts
    return (*parts, _noise_part(run, noise))


def _noise_part(run: Level, noise: NoiseModes) -> PathPart:
    """Twice the pairs of modes; the factor follows from the shares of the variance that both levels drop."""
    ratio = noise.finer / run.modes
    return PathPart(
        name="noise_modes",
        pair=(run, replace(run, modes=noise.finer)),
        coarse_pair=None,
        ratio=ratio,
        coarse_ratio=ratio,
        expected_order=None,
        known_factor=noise.factor,
        note=f"{run.modes} modes leave out {noise.dropped:.2g} of the variance, {noise.finer} modes "
        f"{noise.dropped_finer:.2g}",
    )


def width_ratio(refinement: Refinement, coarse: int, fine: int) -> float:
    """Mesh width of the coarser count over that of the finer one."""
    ends = 1 if refinement.both_ends else 0
    return (fine - ends) / (coarse - ends)
