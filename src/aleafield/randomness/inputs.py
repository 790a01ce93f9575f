"""The uncertain numbers of a study, and how they depend on one another."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.randomness.law import Law


@dataclass(frozen=True)
class Input:
    """One uncertain number.

    Attributes
    ----------
    path : str
        Where it stands, as ``rate.gain``, or the bare name of a parameter.
    law : Law
        Its probability law.
    units : str
        A label; ``"1"`` where none is known.
    """

    path: str
    law: Law
    units: str = "1"


@dataclass(frozen=True)
class Dependence:
    """How inputs depend on one another; without it they are independent.

    Attributes
    ----------
    rank_correlation : tuple of (path, path, float)
        Spearman's rank correlation of two inputs, reached by a Gaussian copula.
    sampled_together : bool
        Whether inputs that are columns of one file are drawn as whole rows of it.
    """

    rank_correlation: tuple[tuple[str, str, float], ...] = ()
    sampled_together: bool = False

    @property
    def independent(self) -> bool:
        """Whether the inputs are independent of one another after all; correlations of 0 join nothing."""
        return not self.sampled_together and not any(value for _, _, value in self.rank_correlation)
