"""The parts of an error: their names, their order in every picture and table, and what would shrink each."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Part:
    """One part of the error of a statistic.

    Attributes
    ----------
    key : name in the summary
    name : name in running text
    meaning : what it is
    remedy : what would shrink it
    random : whether it is a random half-width (these add in quadrature) or a bound on a bias (these add up)
    """

    key: str
    name: str
    meaning: str
    remedy: str
    random: bool = False

    @property
    def style(self) -> str:
        """Name of the part's colour."""
        return self.key.replace("_", "-")


PARTS: tuple[Part, ...] = (
    Part(
        "space",
        "space",
        "bound on the bias of the projection onto the mesh or the basis",
        "refine the mesh: more nodes in [scheme]",
    ),
    Part(
        "quadrature",
        "quadrature",
        "bound on the bias of the quadrature rule of the integrals",
        "use a finer rule: the matched quadrature, or more quadrature_points in [scheme]",
    ),
    Part(
        "time",
        "time",
        "bound on the bias of the time step",
        "take a smaller time_step in [scheme]",
    ),
    Part(
        "noise_modes",
        "noise modes",
        "bound on the bias of cutting off the modes of the noise",
        "keep more modes of the noise",
    ),
    Part(
        "surrogate",
        "surrogate",
        "bound on the bias of the surrogate, from solver runs that did not fit it",
        "sample the solver itself, or give the surrogate more runs",
    ),
    Part(
        "bias_noise",
        "noise of the biases",
        "sampling noise of the estimated biases",
        "take more samples (the share that is solved on finer levels grows with them), or refine so that "
        "the biases and their noise fall",
        random=True,
    ),
    Part(
        "sampling",
        "sampling",
        "half-width that is due to the finite number of samples",
        "take more samples: aleafield extend, or a larger samples in [sampling]",
        random=True,
    ),
)
"""All parts, in the order of every picture: biases first, then what is random."""
