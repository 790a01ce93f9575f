"""Approximation spaces: bases, evaluation anywhere, mass; nothing about the equation."""

from __future__ import annotations

from aleafield.spaces.chebyshev import Chebyshev
from aleafield.spaces.fourier import Fourier
from aleafield.spaces.legendre import Legendre
from aleafield.spaces.named import make_space, nodes_refinement
from aleafield.spaces.piecewise_linear import PiecewiseLinear
from aleafield.spaces.prolongation import Prolongation
from aleafield.spaces.space import Space
from aleafield.spaces.spectral import SpectralSpace

__all__ = [
    "Chebyshev",
    "Fourier",
    "Legendre",
    "PiecewiseLinear",
    "Prolongation",
    "Space",
    "SpectralSpace",
    "make_space",
    "nodes_refinement",
]
