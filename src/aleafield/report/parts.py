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
    known_factor : whether its factor follows from what is known beforehand, so that no order is observed
    """

    key: str
    name: str
    meaning: str
    remedy: str
    random: bool = False
    known_factor: bool = False

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
        "the modes that are kept follow from the correlation length and the mesh: where the mesh carries too "
        "few, more nodes in [scheme] keep more; a longer correlation_length needs fewer, but is another model",
        known_factor=True,
    ),
    Part(
        "surrogate",
        "surrogate",
        "bound on the bias of the surrogate, from solver runs that did not fit it",
        "give the surrogate more runs: a larger samples in [sampling]; where that does not help, sample the solver "
        'itself with method = "quasi-monte carlo"',
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


@dataclass(frozen=True)
class Cause:
    """What makes a quantity vary.

    Attributes
    ----------
    key : name in the summary, and of its colour
    name : name in running text
    meaning : what it is
    """

    key: str
    name: str
    meaning: str


PARAMETERS = Cause(
    "parameters", "parameters", "variance that is due to not knowing the inputs: can be learnt"
)
NOISE = Cause(
    "noise", "noise", "variance between runs with the same inputs: stays however well they are known"
)
CAUSES = (PARAMETERS, NOISE)
"""The causes of variance, in the order of pictures."""


@dataclass(frozen=True)
class IndexKind:
    """A kind of index that says how much of a quantity's variance an input causes.

    Attributes
    ----------
    key : name in the summary
    name : name in running text
    meaning : what it is
    """

    key: str
    name: str
    meaning: str

    @property
    def style(self) -> str:
        """Name of its colour."""
        return f"index-{self.key}"


FIRST = IndexKind(
    "first", "first order", "share of the variance that would go, on average, if this input alone were known"
)
TOTAL = IndexKind(
    "total", "total", "share of the variance that would stay, on average, if all but this input were known"
)
SHAPLEY = IndexKind(
    "shapley", "Shapley effect", "fair share of the variance, also where inputs depend on one another"
)
INDICES = (FIRST, TOTAL, SHAPLEY)
"""The kinds of indices of single inputs, in the order of pictures and tables."""
