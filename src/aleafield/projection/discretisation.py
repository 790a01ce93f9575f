"""Everything of a level that does not depend on the sample."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.field.equation import FieldEquation
from aleafield.field.noise_modes import NoiseModes
from aleafield.field.parameter import bound
from aleafield.field.rates import StepRate
from aleafield.field.switching import switching
from aleafield.operators import KernelOperator, OperatorChoice, choose_operator
from aleafield.projection.forcing import Forcing, NoiseProjection
from aleafield.projection.integral import (
    ClosedIntegral,
    CrossingSources,
    IntegralTerm,
    RateSources,
    SampledIntegral,
    Sources,
)
from aleafield.projection.pairing import Pairing
from aleafield.projection.restriction import MassRestriction, ModalRestriction, NodalRestriction, Restriction
from aleafield.projection.semidiscrete import ProjectedTerm, SemiDiscreteField
from aleafield.projection.smoothness import typical
from aleafield.quadrature import Rule, make_rule
from aleafield.spaces import PiecewiseLinear, Space, make_space

_PER_POINT = 300.0
"""Operations, in those of a shared matrix product, that the rate costs at a point (8 ns measured)."""
_PER_UNKNOWN = 150.0
"""The same for the arithmetic of a Runge-Kutta stage on an unknown."""
_PER_NUMBER = 700.0
"""The same for a normal random number (20 ns measured)."""
_ROWS = 9
"""Rows of the kernel matrix from which its largest row sum is sampled."""


class Discretisation:
    """Space, rules, projection and operator of a level, prepared once and used for every batch.

    Parameters
    ----------
    equation : FieldEquation
        Unbound.
    level : Level
    pairing : Pairing
        Of the same equation.
    noise : NoiseModes, optional
        The ring whose modes the noise has; how many are kept the level says.

    Attributes
    ----------
    space : Space
    rule : Rule
        Of the integral over y.
    test_rule : Rule
        Its points are the test points x.
    operator_choice : OperatorChoice
    operations, noise_operations : float
        Cost of one rate of change, and of the noise of one step, of one realization, counted in operations of a
        shared matrix product.

    Raises
    ------
    InputError
        Where the level's counts are too small.
    """

    def __init__(
        self, equation: FieldEquation, level: Level, pairing: Pairing, noise: NoiseModes | None = None
    ) -> None:
        self.pairing = pairing
        self.domain = equation.domain
        self.space: Space = make_space(pairing.projector, self.domain, level.nodes)
        self.rule: Rule = pairing.source_rule(level.quadrature_points)
        self.test_rule, self.restriction = _projection(pairing, self.space, level.quadrature_points)
        self._noise: NoiseProjection | None = None
        if noise is not None:
            self._noise = NoiseProjection(
                self.space, self.test_rule.points, self.restriction, level.modes, noise.length, noise.white
            )
        self._restarts = switching(equation).uncertain
        self._prolongation = self.space.prolongation(self.rule.points)
        kernel = typical(equation).kernel
        self.operator_choice: OperatorChoice = choose_operator(
            kernel,
            self.domain,
            self.test_rule,
            self.rule,
            unknowns=self.space.n,
            projection_operations=self.restriction.operations,
            use=pairing.kernel_use,
            truncated=pairing.method == "galerkin",
        )
        self._shared: KernelOperator | None = None
        if kernel.certain and pairing.kernel_use != "closed":
            self._shared = self.operator_choice.build(kernel, self.restriction.fold)

    @property
    def operations(self) -> float:
        """Cost of one rate of change of one sample, counted in operations of a shared matrix product."""
        n, q = self.space.n, len(self.rule.points)
        prolongation = {"identity": 0.0, "dense": 2.0 * n * q}.get(self._prolongation.name, _PER_UNKNOWN * q)
        return self.operator_choice.cost + prolongation + _PER_POINT * q + _PER_UNKNOWN * n

    @property
    def noise_operations(self) -> float:
        """Cost of the noise of one step of one realization: numbers drawn, and the product with the modes."""
        if self._noise is None:
            return 0.0
        return self._noise.modes * (_PER_NUMBER + 2.0 * self.space.n)

    def system(self, equation: FieldEquation, batch_size: int) -> SemiDiscreteField:
        """The semi-discrete field of a batch.

        Parameters
        ----------
        equation : FieldEquation
            Bound to the batch.
        batch_size : int
            S; a multiple of 8 where equality to the bit is wanted.
        """
        points = self.test_rule.points
        return SemiDiscreteField(
            self.space,
            self._integral(equation),
            ProjectedTerm(equation.drive, points, self.restriction),
            ProjectedTerm(equation.initial, points, self.restriction),
            equation.dynamics.time_constant,  # type: ignore[arg-type]
            batch_size,
            self._restarts,
            self._forcing(equation),
        )

    def _forcing(self, equation: FieldEquation) -> Forcing | None:
        if self._noise is None or equation.noise is None:
            return None
        return self._noise.forcing(equation.noise, bound(equation.dynamics.time_constant))

    def gain(self, equation: FieldEquation) -> FloatArray | None:
        """Size of the linearised integral term: max |f'| times a sampled largest row sum of |w|; () or (S,).

        The modes of the linearised field change at rates of at most (1 + gain) / time constant.  The row sums
        are sampled at about nine test points spread over the domain: for a kernel of the distance the rows
        next to the middle are as large as any, for a formula of x and y a larger one may lie between them, and
        the number is no bound.  None where the slope of the rate is not known.

        Parameters
        ----------
        equation : FieldEquation
            Bound.
        """
        slope = equation.rate.slope()
        if slope is None:
            return None
        rows = self.test_rule.points[:: max(1, len(self.test_rule.points) // _ROWS)]
        matrix = equation.kernel.matrix(rows[:, None], self.rule.points[None, :], self.domain)
        row_sum = (np.abs(matrix) * self.rule.weights).sum(axis=-1).max(axis=-1)
        return np.asarray(slope * row_sum)

    def _integral(self, equation: FieldEquation) -> IntegralTerm:
        if self.pairing.kernel_use == "closed":
            assert isinstance(equation.rate, StepRate)
            return ClosedIntegral(
                self._prolongation,
                self.rule,
                equation.rate,
                equation.kernel,
                self.domain,
                self.test_rule.points,
                self.restriction,
            )
        operator = self._shared
        if operator is None:
            operator = self.operator_choice.build(equation.kernel, self.restriction.fold)
        folded = self.operator_choice.folded or isinstance(self.restriction, NodalRestriction)
        return SampledIntegral(
            self._prolongation, self._sources(equation), operator, None if folded else self.restriction
        )

    def _sources(self, equation: FieldEquation) -> Sources:
        if self.pairing.crossings:
            assert isinstance(equation.rate, StepRate)
            assert self.rule.spacing is not None
            return CrossingSources(equation.rate, self.rule.spacing, self.domain.periodic)
        return RateSources(equation.rate, self.rule.weights)


def _projection(pairing: Pairing, space: Space, count: int) -> tuple[Rule, Restriction]:
    """The test points, as those of a rule, and the projection of values there."""
    domain, n = pairing.domain, space.n
    if isinstance(space, PiecewiseLinear) and pairing.inner_rule is not None:
        lumped = pairing.inner_rule == "trapezoid" and count == n
        if not lumped:
            rule = make_rule(pairing.inner_rule, domain, count)
            return rule, MassRestriction(space, rule)
    own = {"chebyshev": "clenshaw-curtis", "legendre": "gauss-legendre"}.get(pairing.projector, "trapezoid")
    rule = make_rule(own, domain, n)
    return rule, ModalRestriction(space) if pairing.projector == "legendre" else NodalRestriction()
