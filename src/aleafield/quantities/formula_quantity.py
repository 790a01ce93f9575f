"""The measure "formula": a formula of u, x and t, reduced over space."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal, get_args

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.field.formula_term import FormulaTerm
from aleafield.geometry import Domain, Interval
from aleafield.quadrature import composite_gauss, gauss_legendre, periodic_trapezoid
from aleafield.quantities.functional import LinearFunctional
from aleafield.quantities.in_time import Reading
from aleafield.quantities.peaks import parabolic_peak
from aleafield.quantities.point import off_the_nodes, point_evaluation, refuse_outside
from aleafield.quantities.quantity import At, When
from aleafield.quantities.timed import TimedQuantity
from aleafield.spaces import PiecewiseLinear, Space
from aleafield.units import DIMENSIONLESS

InSpace = Literal["mean", "maximum", "integral", "value"]
Pointwise = Callable[[FloatArray, FloatArray], FloatArray]
"""(values of u (S, P), points (P,) or (S, P)) -> values of the formula (S, P)."""

_GOLDEN = 0.5 * (np.sqrt(5.0) - 1.0)
_GOLDEN_STEPS = 40
"""The bracket shrinks to 4e-9 of itself; the height is then wrong by the square of that."""


@dataclass(frozen=True)
class FormulaQuantity(TimedQuantity):
    """A formula of u, x and t, reduced over space.

    mean and integral: by three Gauss points on each element (piecewise linear), 2n Gauss points (Chebyshev,
    Legendre) or 4n equally spaced points (Fourier).  maximum: of a piecewise-linear field by the parabola
    through three nodal values of the formula, as for the maximum of the field, and for a formula that may have
    kinks or jumps in u or x the largest nodal value; else the largest value on the search grid, refined by
    golden-section search of the formula of the element, which needs no derivative and never overshoots.
    value: at a point.

    Comparisons with t inside a step of a window take the limit from inside that step.  The unit of a formula
    is not known: it is labelled "1".

    Parameters
    ----------
    name : str
    term : FormulaTerm
        In u, x and t; numbers beside it may be uncertain.
    in_space : "mean", "maximum", "integral" or "value"
    at : float, optional
        Point of the domain for "value", else None.
    when : At or Over

    Raises
    ------
    InputError
        For another `in_space`, for "value" without a point and for a point without "value".
    """

    measure = "formula"
    dimension = DIMENSIONLESS
    name: str
    term: FormulaTerm
    in_space: InSpace = "mean"
    at: float | None = None
    when: When = At()

    def takes_extremum(self, domain: Domain) -> bool:
        """Whether the formula is reduced by its maximum."""
        return self.in_space == "maximum"

    @property
    def defined_for_white_noise(self) -> bool:
        """Whether it is linear in u, up to a constant, and integrated over space."""
        return self.in_space in ("mean", "integral") and self.term.degree_in("u") <= 1

    def __post_init__(self) -> None:
        if self.in_space not in get_args(InSpace):
            needed = "one of " + ", ".join(get_args(InSpace)) + " is needed"
            raise InputError(self.key("in_space"), f"{self.in_space!r}", needed)
        if (self.in_space == "value") != (self.at is not None):
            found = "no point given" if self.at is None else f"{self.at:g} given"
            raise InputError(self.key("at"), found, "`at` and in_space = 'value' go together")

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError where the point lies outside."""
        if self.at is not None:
            refuse_outside(self.at, domain, self.key("at"))

    def off_the_nodes(self, spaces: tuple[Space, ...]) -> bool:
        """Whether the point, if there is one, is not a node of each piecewise-linear space."""
        return self.at is not None and off_the_nodes(self.at, spaces)

    def reading(self, space: Space) -> Reading:
        """The formula of the element, reduced over space."""
        reduce = self._reduction(space)

        def take(u: FloatArray, t: float, inside: float | None) -> tuple[FloatArray, None]:
            def formula(values: FloatArray, x: FloatArray) -> FloatArray:
                found = self.term.evaluate({"u": values, "x": x, "t": t}, axes=1, inside=inside)
                return np.array(np.broadcast_to(found, values.shape))

            return reduce(u, formula), None

        return Reading(take, jumps=self.term.depends_on("t"))

    def _reduction(self, space: Space) -> Callable[[FloatArray, Pointwise], FloatArray]:
        if self.at is not None:
            evaluate = LinearFunctional(point_evaluation(space, self.at))
            point = np.array([self.at])
            return lambda u, formula: formula(evaluate(u)[:, None], point)[:, 0]
        if self.in_space == "maximum":
            smooth = not (self.term.kinks_in("u") or self.term.kinks_in("x"))
            return lambda u, formula: largest(space, u, formula, smooth)
        points, weights = formula_rule(space)
        if self.in_space == "mean":
            weights = weights / space.domain.length
        return lambda u, formula: (formula(space.evaluate(u, points), points) * weights).sum(axis=-1)


def formula_rule(space: Space) -> tuple[FloatArray, FloatArray]:
    """Points and weights (P,) of the rule that integrates a formula of an element."""
    domain = space.domain
    if isinstance(space, PiecewiseLinear):
        rule = composite_gauss(domain, space.n if domain.periodic else space.n - 1, 3)
    elif isinstance(domain, Interval):
        rule = gauss_legendre(domain, 2 * space.n)
    else:
        rule = periodic_trapezoid(domain, 4 * space.n)
    return rule.points, rule.weights


def largest(space: Space, u: FloatArray, formula: Pointwise, smooth: bool) -> FloatArray:
    """Largest value in space of a formula of the elements u (S, n); shape (S,).

    Parameters
    ----------
    smooth : bool
        Whether the formula has neither kinks nor jumps in u and x, so that a parabola may pass through it.

    References
    ----------
    Kiefer 1953, "Sequential minimax search for a maximum", Proc. Amer. Math. Soc. 4: golden-section search
    (from memory).
    """
    grid = space.search_grid
    if isinstance(space, PiecewiseLinear):
        nodal = formula(np.take(u, space.display_order, axis=1), grid)
        return parabolic_peak(nodal, grid, space.domain).height if smooth else nodal.max(axis=1)
    values = formula(space.evaluate(u, grid), grid)
    best = values.argmax(axis=1)
    before, after = np.roll(grid, 1), np.roll(grid, -1)
    if space.domain.periodic:
        before[0] -= space.domain.length
        after[-1] += space.domain.length
    else:
        before[0], after[-1] = grid[0], grid[-1]

    def at(x: FloatArray) -> FloatArray:
        place = space.domain.wrap(x[:, None])
        return formula(space.evaluate_each(u, place), place)[:, 0]

    low, high = before[best], after[best]
    inner, outer = high - _GOLDEN * (high - low), low + _GOLDEN * (high - low)
    at_inner, at_outer = at(inner), at(outer)
    height = np.asarray(values.max(axis=1))
    for _ in range(_GOLDEN_STEPS):
        height = np.maximum(height, np.maximum(at_inner, at_outer))
        left = at_inner > at_outer
        low, high = np.where(left, low, inner), np.where(left, outer, high)
        fresh = np.where(left, high - _GOLDEN * (high - low), low + _GOLDEN * (high - low))
        at_fresh = at(fresh)
        inner, outer = np.where(left, fresh, outer), np.where(left, inner, fresh)
        at_inner, at_outer = np.where(left, at_fresh, at_outer), np.where(left, at_inner, at_fresh)
    return height
