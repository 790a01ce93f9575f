"""A problem with a known answer, and the sequence of levels at which it is solved."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal, Protocol

from aleafield.arrays import FloatArray

Refined = Literal["nodes", "quadrature points", "steps"]


@dataclass(frozen=True)
class Series:
    """One projector on a problem, refined in one way.

    Attributes
    ----------
    projector, method, quadrature : names of the study file
    refined : what is refined
    counts : increasing numbers of nodes, of quadrature points, or of steps
    expected_order : float or None
        None: faster than any power, judged by the last error alone.
    last_error : float
        Largest error accepted at the finest level.
    nodes : int
        Number of nodes where something else is refined.
    steps : int
        Number of steps where something else is refined; fine enough not to show.
    order_tolerance : float
        Accepted distance of the last observed order from the expected one.
    """

    projector: str
    method: str
    refined: Refined
    counts: tuple[int, ...]
    expected_order: float | None
    last_error: float
    quadrature: str = "matched"
    nodes: int = 0
    steps: int = 200
    order_tolerance: float = 0.15


class GivenNoise(Protocol):
    """Noise of S realizations that is given in full, and what is looked at under it."""

    def increments(self, steps: int, modes: int, duration: float) -> FloatArray:
        """Of the modes' Wiener processes over equal parts of the whole run, in time order, (P, S, modes).

        P is the number of steps times a power of two.
        """
        ...

    def observed(self, fields: FloatArray, step: float) -> FloatArray:
        """What is compared with the known answer, (R, points), from the fields (S, points) at the end."""
        ...


@dataclass(frozen=True)
class KnownProblem:
    """A field without uncertain inputs whose solution, or its law, is known.

    Attributes
    ----------
    name : str
    source : str
        Where the known answer comes from.
    study : str
        Sections domain, kernel, rate, drive, initial, dynamics and noise of a study file.
    exact : callable
        Points (P,) to the exact field (P,) at the end of the run, or to what is observed under noise: (P,) or,
        realization by realization, (R, P).
    points : float array (P,)
        Where the error is taken, its root mean square over the realizations; the largest counts.
    series : tuple of Series
    noise : GivenNoise or None
        None: a field without noise.
    """

    name: str
    source: str
    study: str
    exact: Callable[[FloatArray], FloatArray]
    points: FloatArray
    series: tuple[Series, ...]
    noise: GivenNoise | None = None
