"""What a study asks of the discretisation."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Projector = Literal["piecewise linear", "chebyshev", "legendre", "fourier"]
Method = Literal["collocation", "galerkin"]

PROJECTORS: tuple[Projector, ...] = ("piecewise linear", "chebyshev", "legendre", "fourier")
METHODS: tuple[Method, ...] = ("collocation", "galerkin")
QUADRATURES = ("matched", "trapezoid", "simpson", "gauss-legendre", "clenshaw-curtis")


@dataclass(frozen=True)
class Scheme:
    """Projector, method, quadrature and step of a study.

    Attributes
    ----------
    projector, method : names of the study file
    nodes : int
        Dimension of X_n.
    quadrature : str
        "matched" or the name of a rule.
    quadrature_points : int or None
        None: the matched number.
    time_step : float or None
        Units of time; None: chosen by pilots ("auto").
    """

    projector: Projector
    method: Method
    nodes: int
    quadrature: str = "matched"
    quadrature_points: int | None = None
    time_step: float | None = None
