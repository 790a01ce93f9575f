"""Neural fields on a ring, solved at given points of the unit cube: one smooth in its inputs, one bistable."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.field.equation import Dynamics, FieldEquation
from aleafield.field.formula_term import FormulaTerm
from aleafield.field.kernels import Connectivity, GaussianKernel
from aleafield.field.rates import LogisticRate
from aleafield.formula import Formula
from aleafield.forward.field_model import FieldModel
from aleafield.geometry import Ring
from aleafield.projection.scheme import Scheme
from aleafield.quantities import Value
from aleafield.randomness.design import Design
from aleafield.randomness.families import Family
from aleafield.randomness.inputs import Dependence, Input
from aleafield.randomness.laws import Law, Uniform

NODES = 32
_AT_ONCE = 512


class GivenPoints(Design):
    """Sample i is row i of points that are given."""

    def __init__(self, inputs: tuple[Input, ...], given: FloatArray) -> None:
        super().__init__(inputs, Dependence(), "monte carlo", 1)
        self.given = given

    def points(self, family: Family, indices: IntArray) -> FloatArray:
        """The rows."""
        return self.given[indices]


def about(nominal: float) -> Uniform:
    """Uniform within a fifth of a nominal value."""
    low, high = sorted((0.8 * nominal, 1.2 * nominal))
    return Uniform(low, high)


def _equation(
    excitation: tuple[Law | float, Law | float],
    inhibition: tuple[Law | float, Law | float],
    rate: tuple[Law | float, Law | float],
    dynamics: tuple[Law | float, float],
    terms: Mapping[str, tuple[str, Mapping[str, Law | float]]],
) -> FieldEquation:
    drive, initial = (
        FormulaTerm(Formula(text), dict(beside)) for text, beside in (terms["drive"], terms["initial"])
    )
    return FieldEquation(
        Ring(2 * np.pi),
        Connectivity({"excitation": GaussianKernel(*excitation), "inhibition": GaussianKernel(*inhibition)}),
        LogisticRate(*rate),
        Dynamics(*dynamics),
        drive,
        initial,
    )


SMOOTH = _equation(
    (about(1.5), about(0.5)),
    (about(-1.0), about(1.2)),
    (about(5.0), about(0.4)),
    (about(10.0), 40.0),
    {
        "drive": ("a * exp((cos(x) - 1) / s**2)", {"a": about(0.8), "s": about(0.6)}),
        "initial": ("0", {}),
    },
)
"""An evoked response, nine inputs of a fifth each."""
BISTABLE = _equation(
    (2.4, 0.5),
    (-2.4, 2.0),
    (20.0, about(0.52)),
    (about(15.0), 300.0),
    {
        "drive": ("0", {}),
        "initial": ("a * exp(k * (cos(x) - 1))", {"a": Uniform(0.2, 1.0), "k": about(2.0)}),
    },
)
"""A bump that survives or dies, by the size of its start and the threshold."""
STEP = {id(SMOOTH): 2.0, id(BISTABLE): 5.0}


def laws(equation: FieldEquation) -> tuple[Law, ...]:
    """The laws of the uncertain inputs, in the order of the columns."""
    return tuple(entry.law for entry in equation.uncertain())


def centre_value(equation: FieldEquation, points: FloatArray) -> FloatArray:
    """u(0) at the end of the run at points (N, d), shape (N,)."""
    inputs = tuple(Input(entry.path, entry.law) for entry in equation.uncertain())
    model = FieldModel(
        equation,
        Scheme("fourier", "collocation", NODES),
        [Value("centre", 0.0)],
        GivenPoints(inputs, points),
        inputs,
        STEP[id(equation)],
    )
    values = [
        model.evaluate(model.level, np.arange(start, min(start + _AT_ONCE, len(points)))).values["centre"]
        for start in range(0, len(points), _AT_ONCE)
    ]
    return np.concatenate(values)
