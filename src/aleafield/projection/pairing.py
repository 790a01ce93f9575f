"""Which projector, method and quadrature go together, and what is to be expected of them."""

from __future__ import annotations

from dataclasses import dataclass, replace

from aleafield.errors import InputError
from aleafield.field.equation import FieldEquation
from aleafield.field.kernels import CosineKernel, FormulaKernel
from aleafield.field.switching import switching
from aleafield.geometry import Domain, Refinement
from aleafield.operators import KernelUse
from aleafield.projection.expectation import (
    RULE_ORDERS,
    Expected,
    Ingredients,
    quadrature_order,
    space_order,
    time_order,
)
from aleafield.projection.scheme import METHODS, QUADRATURES, Method, Projector, Scheme
from aleafield.projection.smoothness import (
    data_jump,
    drive_is_smooth,
    initial_is_smooth,
    kernel_is_smooth,
    rate_smoothness,
    typical,
)
from aleafield.quadrature import Rule, count_refinement, make_rule
from aleafield.spaces import nodes_refinement

_FORCED: dict[str, tuple[str, ...]] = {
    "piecewise linear": ("trapezoid", "simpson", "gauss-legendre"),
    "chebyshev": ("trapezoid", "simpson", "gauss-legendre", "clenshaw-curtis"),
    "legendre": ("trapezoid", "simpson", "gauss-legendre", "clenshaw-curtis"),
    "fourier": ("trapezoid",),
}


@dataclass(frozen=True)
class Pairing:
    """A projector and a quadrature that go together, for one equation.

    Attributes
    ----------
    projector, method : names of the study file
    domain : Interval or Ring
    nodes, quadrature_points : int
        Counts of the run, made odd, or even on a ring, where a coarser level needs it.
    rule : str
        Name of the rule of the integral over y, as `quadrature.make_rule` takes it; its count is
        `quadrature_points`.
    inner_rule : str or None
        Piecewise-linear Galerkin: the rule of mass and test integrals, with the same count.
    kernel_use : "sampled", "exact symbol" or "closed"
        Sampled at the points; exact Fourier symbol; integral between threshold crossings in closed form.
    crossings : bool
        Step rate: sources are the weights of `quadrature.crossing_weights`.
    space, quadrature, time : Expected
        The expected orders of the three parts of the error.
    data_jump : bool
        Whether the initial state or the drive jumps in x.
    notes : tuple of str
        Counts that were changed.
    warnings : tuple of str
        What an expert would say of the pairing.
    """

    projector: Projector
    method: Method
    domain: Domain
    nodes: int
    quadrature_points: int
    rule: str
    inner_rule: str | None
    kernel_use: KernelUse
    crossings: bool
    space: Expected
    quadrature: Expected
    time: Expected
    data_jump: bool = False
    notes: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()

    @property
    def overshoots(self) -> bool:
        """Whether a spectral interpolant overshoots at a jump (Gibbs), which no refinement makes smaller."""
        return self.data_jump and self.projector != "piecewise linear"

    @property
    def node_refinement(self) -> Refinement:
        """How `nodes` grows from level to level."""
        return nodes_refinement(self.projector, self.domain)

    @property
    def point_refinement(self) -> Refinement:
        """How `quadrature_points` grows from level to level."""
        return _point_refinement(self.projector, self.rule, self.domain)

    def source_rule(self, count: int) -> Rule:
        """The rule of the integral over y with that count."""
        return make_rule(self.rule, self.domain, count)

    def refined(self, nodes: int, points: int) -> tuple[int, int]:
        """The counts of the next finer level."""
        return self.node_refinement.refined(nodes), self.point_refinement.refined(points)

    def coarsened(self, nodes: int, points: int) -> tuple[int, int]:
        """The counts of the next coarser level.

        Raises
        ------
        InputError
            Where there is none.
        """
        return self.node_refinement.coarsened(nodes)[0], self.point_refinement.coarsened(points)[0]


def resolve(scheme: Scheme, equation: FieldEquation) -> Pairing:
    """The pairing of a scheme for an unbound equation.

    Raises
    ------
    InputError
        For a pair that makes no sense, naming scheme.projector, scheme.method, scheme.quadrature,
        scheme.nodes or scheme.quadrature_points and what would be right.
    """
    domain = equation.domain
    step = equation.rate.smoothness == "step"
    node_refinement = nodes_refinement(scheme.projector, domain)
    _refuse(scheme, domain, step)
    nodes, node_note = node_refinement.admissible(scheme.nodes)
    rule = "trapezoid" if step else _rule(scheme, domain)
    default = _default_points(scheme.projector, domain, nodes, step)
    asked = default if scheme.quadrature_points is None else scheme.quadrature_points
    point_refinement = _point_refinement(scheme.projector, rule, domain)
    points, point_note = point_refinement.admissible(asked)
    inner_rule = None
    if scheme.projector == "piecewise linear" and scheme.method == "galerkin":
        inner_rule = "composite gauss" if step else rule
    aligned = _aligned(domain, nodes, points)
    if inner_rule is not None and not aligned:
        raise InputError(
            "scheme.quadrature_points",
            f"{points} with {nodes} nodes",
            "every element must be a whole number of panels under piecewise linear Galerkin: "
            f"use {default} or its refinement {point_refinement.refined(default)}",
        )
    sample = typical(equation)
    kernel_use = _kernel_use(scheme, equation, step)
    ingredients = Ingredients(
        projector=scheme.projector,
        method=scheme.method,
        rule=rule,
        periodic=domain.periodic,
        rate=rate_smoothness(sample.rate),
        kernel_smooth=kernel_is_smooth(sample),
        data_smooth=initial_is_smooth(sample) and drive_is_smooth(sample),
        sampled=kernel_use == "sampled",
        closed=kernel_use == "closed",
        aligned=aligned,
        drive_in_time=not switching(equation).uncertain,
        noise=None if equation.noise is None else equation.noise.correlation.roughness,
    )
    return Pairing(
        projector=scheme.projector,
        method=scheme.method,
        domain=domain,
        nodes=nodes,
        quadrature_points=points,
        rule=rule,
        inner_rule=inner_rule,
        kernel_use=kernel_use,
        crossings=step,
        space=space_order(ingredients),
        quadrature=quadrature_order(ingredients),
        time=time_order(ingredients),
        data_jump=data_jump(sample),
        notes=tuple(note for note in (node_note, point_note) if note is not None),
        warnings=tuple(_warnings(ingredients, equation)),
    )


def _one_of(key: str, value: str, names: tuple[str, ...]) -> None:
    if value not in names:
        raise InputError(key, f"{value!r}", "one of " + ", ".join(names) + " is needed")


def _refuse(scheme: Scheme, domain: Domain, step: bool) -> None:
    """Raise for pairs that make no sense; that the projector exists on the domain is known."""
    projector, method, quadrature = scheme.projector, scheme.method, scheme.quadrature
    _one_of("scheme.method", method, METHODS)
    _one_of("scheme.quadrature", quadrature, QUADRATURES)
    if projector == "chebyshev" and method == "galerkin":
        raise InputError(
            "scheme.method",
            "'galerkin' under chebyshev",
            "use 'collocation', or 'legendre' for an orthogonal projection on polynomials",
        )
    if projector == "legendre" and method == "collocation":
        raise InputError(
            "scheme.method",
            "'collocation' under legendre",
            "use 'galerkin', or 'chebyshev' for interpolation by polynomials",
        )
    if quadrature == "matched":
        return
    if step:
        raise InputError(
            "scheme.quadrature",
            f"{quadrature!r} with a step rate",
            "use 'matched': it resolves the threshold crossings, and no other rule does",
        )
    if quadrature not in _FORCED[projector]:
        where = "a ring" if domain.periodic else "an interval"
        allowed = ", ".join(("matched", *_FORCED[projector]))
        raise InputError(
            "scheme.quadrature", f"{quadrature!r} under {projector} on {where}", f"one of {allowed} is needed"
        )


def _rule(scheme: Scheme, domain: Domain) -> str:
    """Name of the rule of the y-integral for a rate that is no step."""
    if scheme.projector == "piecewise linear":
        matched = "composite gauss" if scheme.method == "galerkin" else "trapezoid"
        names = {"matched": matched, "gauss-legendre": "composite gauss"}
        return names.get(scheme.quadrature, scheme.quadrature)
    if scheme.quadrature != "matched":
        return scheme.quadrature
    return {"chebyshev": "clenshaw-curtis", "legendre": "gauss-legendre", "fourier": "trapezoid"}[
        scheme.projector
    ]


def _point_refinement(projector: str, rule: str, domain: Domain) -> Refinement:
    """How the count of a rule grows; the kinks of a piecewise-linear field stay at the ends of panels."""
    return replace(count_refinement(rule, domain), unions=projector == "piecewise linear")


def _default_points(projector: str, domain: Domain, nodes: int, step: bool) -> int:
    """The matched number of quadrature points."""
    if step and projector != "piecewise linear":
        return 4 * nodes if domain.periodic else 4 * nodes + 1
    return nodes


def _aligned(domain: Domain, nodes: int, points: int) -> bool:
    """Whether every element of the mesh of the nodes is a whole number of panels."""
    ends = 0 if domain.periodic else 1
    return points >= nodes and (points - ends) % (nodes - ends) == 0


def _kernel_use(scheme: Scheme, equation: FieldEquation, step: bool) -> KernelUse:
    parts = equation.kernel.parts.values()
    if step:
        return "closed" if all(isinstance(part, CosineKernel) for part in parts) else "sampled"
    has_symbol = not any(isinstance(part, FormulaKernel) for part in parts)
    if scheme.projector == "fourier" and scheme.quadrature == "matched" and has_symbol:
        return "exact symbol"
    return "sampled"


def _warnings(of: Ingredients, equation: FieldEquation) -> list[str]:
    """What an expert would say before any time is spent."""
    found: list[str] = []
    if of.rate == "step":
        found.append(
            "rate: a step is not differentiable, which the convergence theory asks for; its threshold "
            "crossings are resolved inside the elements, and only observed orders are claimed"
        )
    else:
        found.extend(_quadrature_warnings(of))
        if of.rate == "kinked":
            found.append("rate: it has a kink, so that integrals are of order 2 at best")
        if of.rate == "jump":
            found.append(
                "rate: it jumps; sampled at the points a jump is of order 1 at best and pins bumps and fronts to "
                'them: use form = "step", whose threshold crossings are resolved'
            )
        if not equation.rate.bounded:
            found.append(
                "rate: not known to be bounded, which the convergence theory asks for; solutions may blow up"
            )
    if not of.data_smooth:
        found.append(
            "the drive or the initial state has a kink or a jump in x"
            + (" (on a ring also where the ring closes)" if of.periodic else "")
            + ": "
            + (
                "the projector converges only algebraically; piecewise linear with a node there does better"
                if of.spectral
                else "order 2 only where it lies on a node of every level"
            )
        )
    if of.noise == "rough":
        found.append(
            "noise: with an exponential correlation the field is as rough in x as Brownian motion: space and "
            "quadrature converge slowly, at orders that are only observed"
            + (", and a spectral projector gains nothing" if of.spectral else "")
        )
    if of.noise == "white":
        found.append(
            "noise: white in space, so that the field is not a function: its variance at a point grows like 1 / h, "
            "and only its integrals against smooth functions converge"
        )
    if not of.drive_in_time:
        found.append(
            "drive: it switches at times that are uncertain or depend on x; they cannot lie on the schedule, "
            "and the time step is of order 1 across them"
        )
    return found


def _quadrature_warnings(of: Ingredients) -> list[str]:
    found: list[str] = []
    if of.sampled and not of.kernel_smooth and of.spectral:
        remedy = (
            "'matched' takes the exact symbol of gaussian, exponential and cosine kernels"
            if of.periodic
            else "use projector = 'piecewise linear'"
        )
        found.append(
            f"kernel: it is not smooth (a kink on the diagonal, say), so that the {of.rule} rule is of "
            f"order 2 and sets the error under {of.projector}; {remedy}"
        )
    rule_order = RULE_ORDERS[of.rule]
    if of.spectral and not of.periodic and rule_order is not None:
        found.append(
            f"quadrature: the {of.rule} rule, order {rule_order:g}, is of lower order than the "
            f"{of.projector} projector and sets the error; 'matched' is not"
        )
    if not of.spectral and of.method == "collocation" and of.rule != "trapezoid":
        found.append(
            f"quadrature: the {of.rule} rule is of higher order than piecewise linear collocation, which "
            "stays at order 2: the extra points are wasted"
        )
    if not of.spectral and not of.aligned:
        found.append(
            "quadrature_points: elements are not whole numbers of panels; the rule is of order 2 at best"
        )
    return found
