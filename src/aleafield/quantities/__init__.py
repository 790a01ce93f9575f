"""Quantities: the question asked of a field, separate from how it is answered."""

from __future__ import annotations

from aleafield.quantities.active_width import ActiveWidth
from aleafield.quantities.averages import Integral, Mean, Norm
from aleafield.quantities.displacement import Displacement, EffectiveDiffusion
from aleafield.quantities.extrema import Maximum, Minimum, PeakPosition
from aleafield.quantities.first_passage import TimeToLevel
from aleafield.quantities.formula_quantity import FormulaQuantity
from aleafield.quantities.front import FrontPosition, FrontSpeed
from aleafield.quantities.function_quantity import FunctionQuantity
from aleafield.quantities.history import History
from aleafield.quantities.noisy import NoisyPaths, UniformSource
from aleafield.quantities.point_value import Value
from aleafield.quantities.quantity import At, Observer, Over, Quantity, Reduction, When
from aleafield.quantities.spectral_power import SpectralPower

__all__ = [
    "ActiveWidth",
    "At",
    "Displacement",
    "EffectiveDiffusion",
    "FormulaQuantity",
    "FrontPosition",
    "FrontSpeed",
    "FunctionQuantity",
    "History",
    "Integral",
    "Maximum",
    "Mean",
    "Minimum",
    "NoisyPaths",
    "Norm",
    "Observer",
    "Over",
    "PeakPosition",
    "Quantity",
    "Reduction",
    "SpectralPower",
    "TimeToLevel",
    "UniformSource",
    "Value",
    "When",
]
