"""The field equation: tau du = (-u + integral of w f(u) + xi) dt + sigma dW, u(x, 0) = u0(x)."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

from aleafield.arrays import FloatArray
from aleafield.field.formula_term import FormulaTerm, constant
from aleafield.field.kernels import Connectivity
from aleafield.field.noise import Noise
from aleafield.field.parameter import (
    Bindable,
    Binding,
    Parameter,
    Uncertain,
    bind_parameters,
    number,
)
from aleafield.field.rates import Rate
from aleafield.geometry import Domain
from aleafield.randomness.laws import Law
from aleafield.units import DIMENSIONLESS, TIME


@dataclass(frozen=True)
class Dynamics(Bindable):
    """Time constant (units of time, may be uncertain) and duration (units of time, certain)."""

    time_constant: Parameter = number(TIME, positive=True)
    duration: float = 1.0


@dataclass(frozen=True)
class FieldEquation:
    """A neural field on a domain.

    Parameters
    ----------
    domain : Interval or Ring
    kernel : Connectivity
    rate : Rate
    dynamics : Dynamics
    drive : FormulaTerm in x and t, units of activity
    initial : FormulaTerm in x, units of activity
    parameters : named numbers that the other entries use
    noise : Noise, None where there is none
    """

    domain: Domain
    kernel: Connectivity
    rate: Rate
    dynamics: Dynamics
    drive: FormulaTerm = field(default_factory=lambda: constant(0.0))
    initial: FormulaTerm = field(default_factory=lambda: constant(0.0))
    parameters: Mapping[str, Parameter] = field(default_factory=dict)
    noise: Noise | None = None

    def uncertain(self) -> Iterator[Uncertain]:
        """All laws of the model in the order parameters, kernel, rate, drive, initial, dynamics, noise."""
        for name, value in self.parameters.items():
            if isinstance(value, Law):
                yield Uncertain(name, value, DIMENSIONLESS)
        yield from self.kernel.uncertain()
        yield from self.rate.uncertain("rate")
        yield from self.drive.uncertain("drive")
        yield from self.initial.uncertain("initial")
        yield from self.dynamics.uncertain("dynamics")
        if self.noise is not None:
            yield from self.noise.uncertain("noise")

    def binding(self, inputs: Mapping[str, FloatArray]) -> Binding:
        """Inputs and evaluated parameters of a batch."""
        return bind_parameters(self.parameters, inputs)

    def bind(self, binding: Binding) -> FieldEquation:
        """The equation of a batch: every number a float or an array of shape (S,)."""
        return FieldEquation(
            domain=self.domain,
            kernel=self.kernel.bind(binding),
            rate=self.rate.bind("rate", binding),
            dynamics=self.dynamics.bind("dynamics", binding),
            drive=self.drive.bind("drive", binding),
            initial=self.initial.bind("initial", binding),
            noise=None if self.noise is None else self.noise.bind("noise", binding),
        )

    def bindables(self) -> Iterator[tuple[str, Bindable]]:
        """Every object that holds numbers, with its path."""
        for name, part in self.kernel.parts.items():
            yield self.kernel.path(name), part
        yield "rate", self.rate
        yield "drive", self.drive
        yield "initial", self.initial
        yield "dynamics", self.dynamics
        if self.noise is not None:
            yield "noise", self.noise
