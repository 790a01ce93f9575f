"""The orders that theory gives for the parts of the discretisation error, and why.

Verified pair by pair by tests/convergence, whose table is docs/orders.md.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from aleafield.field.noise import Roughness
from aleafield.projection.smoothness import RateSmoothness

RULE_ORDERS: dict[str, float | None] = {
    "trapezoid": 2.0,
    "simpson": 4.0,
    "composite gauss": 4.0,
    "gauss-legendre": None,
    "clenshaw-curtis": None,
}
"""Order of a rule for smooth integrands on an interval; None is faster than any power."""


@dataclass(frozen=True)
class Expected:
    """The expected order of one part of the error.

    Attributes
    ----------
    order : float or None
        None: faster than any power of the mesh width.
    reason : str
        In words.
    observed_only : bool
        Whether no order is proven, so that only the observed one counts.
    """

    order: float | None
    reason: str
    observed_only: bool = False

    @property
    def text(self) -> str:
        """The order for tables."""
        words = "faster than any power" if self.order is None else f"{self.order:g}"
        return f"{words} (observed only)" if self.observed_only else words


_UNSCHEDULED = "the drive switches at times that are uncertain or depend on x: not on the schedule"
_ROUGH = "the noise, and with it the field, is as rough in x as Brownian motion: "
_WHITE = "the noise is white in space and the field no function: "
_JUMP = Expected(1.0, "the rate jumps and is sampled at the points, which pins where it jumps to them", True)


@dataclass(frozen=True)
class Ingredients:
    """What the orders depend on.

    Attributes
    ----------
    projector, method : str
    rule : str
        Of the integral over y.
    periodic : bool
    rate : "smooth", "kinked", "jump" or "step"
        "jump" is a formula that jumps; a step has its crossings resolved.
    kernel_smooth : bool
    data_smooth : bool
        Whether drive and initial state are smooth in x.
    sampled, closed : bool
        Whether the kernel is sampled at the points, or integrated in closed form between threshold crossings;
        otherwise its exact symbol is used.
    aligned : bool
        Whether the elements of a piecewise-linear mesh are unions of panels; on a ring, whether every node is
        a quadrature point.
    drive_in_time : bool
        Whether every switch of the drive lies on the schedule.
    noise : "smooth", "rough", "white" or None
        How smooth the noise is in x; None where there is none.
    """

    projector: str
    method: str
    rule: str
    periodic: bool
    rate: RateSmoothness
    kernel_smooth: bool
    data_smooth: bool
    sampled: bool
    closed: bool
    aligned: bool
    drive_in_time: bool
    noise: Roughness | None = None

    @property
    def spectral(self) -> bool:
        """Whether the projector converges faster than any power for smooth fields."""
        return self.projector != "piecewise linear"


def space_order(of: Ingredients) -> Expected:
    """Order of the error that the projector makes, the quadrature points held.

    A field is as smooth in x as its noise.  Smooth noise changes no order.  Rough noise has paths like Brownian
    motion: a point between nodes is missed by h^(1/2), an inner product by h, in root mean square; but all levels
    keep the same finite number of modes, about as many as the run has unknowns, so that no order is claimed.
    Of white noise only functionals of L2 exist; a linear functional g of the projection of W is that of W at
    P_n g, so that it converges, in root mean square, as the projection of g does.
    """
    if of.rate == "jump":
        return _JUMP
    if of.noise == "rough":
        return Expected(0.5, _ROUGH + "h^(1/2) at a point, h in integrals", observed_only=True)
    if of.noise == "white":
        order = None if of.spectral and of.projector != "chebyshev" else 2.0
        return Expected(order, _WHITE + "smooth functionals of it converge as their projections do", True)
    step = of.rate == "step"
    if not of.data_smooth:
        reason = "the drive or the initial state has a kink or a jump: "
        if of.spectral:
            return Expected(1.0, reason + "an algebraic order", observed_only=True)
        return Expected(2.0, reason + "h^2 only where it stays on a node", observed_only=True)
    if not of.spectral:
        return Expected(2.0, "piecewise-linear approximation of a smooth field: h^2", step)
    if of.kernel_smooth:
        return Expected(None, "spectral approximation of a smooth field", step)
    if of.rate != "smooth":
        return Expected(2.0, "a kernel and a rate with kinks make a field with few derivatives", True)
    if of.sampled and not (of.periodic and of.aligned):
        return Expected(2.0, "the sampled kernel leaves a kink at every quadrature point in the field", True)
    return Expected(None, "spectral approximation of a field that the kernel smooths")


def quadrature_order(of: Ingredients) -> Expected:
    """Order of the error of the integrals, the projector held.

    Under rough noise f(u) is as rough as Brownian motion, whose integral every rule misses by h in root mean
    square.  Under white noise, with a linear rate, the rules meet the product of the kernel and rough elements.
    """
    if of.rate == "jump":
        return _JUMP
    if of.noise == "rough":
        return Expected(1.0, _ROUGH + "no rule is of a higher order", observed_only=True)
    if of.noise == "white":
        return replace(_deterministic_quadrature_order(of), observed_only=True)
    return _deterministic_quadrature_order(of)


def _deterministic_quadrature_order(of: Ingredients) -> Expected:
    if of.rate == "step" and of.closed and not of.spectral:
        return _closed_order(of)
    if of.rate == "step":
        return Expected(2.0, "threshold crossings by linear interpolation between the points", True)
    if of.spectral and not of.data_smooth:
        return Expected(
            1.0, "the drive or the initial state has a kink or a jump, and so has the integrand", True
        )
    order = RULE_ORDERS[of.rule]
    reason = f"{of.rule} rule"
    if of.rule == "trapezoid" and of.periodic and of.spectral:
        order, reason = None, "periodic trapezoid rule of a smooth periodic integrand"
    at_most_two = order is not None and order <= 2.0
    if of.rate == "kinked":
        return Expected(2.0, "the rate has a kink, and so has the integrand: order 2 with fluctuations", True)
    if of.sampled and not of.kernel_smooth and not at_most_two and not _kink_at_panel_ends(of):
        return Expected(2.0, "the kernel has a kink inside the panels (on the diagonal)")
    if not of.spectral and not of.aligned and not at_most_two:
        return Expected(2.0, "the elements are no unions of panels: the integrand has kinks inside panels")
    if not of.spectral and of.method == "galerkin" and not of.periodic and not at_most_two:
        return Expected(3.5, "order 4 inside, 3 in the inner products with the half hats at the ends")
    return Expected(order, reason)


def _closed_order(of: Ingredients) -> Expected:
    """Piecewise-linear field, step rate, cosine kernels: nothing but the test integrals is approximated."""
    if of.method == "collocation":
        return Expected(
            None, "crossings of a piecewise-linear field and the integral between them are exact", True
        )
    return Expected(
        4.0, "crossings and the integral between them are exact, test integrals by Gauss points", True
    )


def _kink_at_panel_ends(of: Ingredients) -> bool:
    """Piecewise-linear collocation: every test point is the end of a panel, and the diagonal kink with it."""
    return not of.spectral and of.method == "collocation" and of.aligned


def time_order(of: Ingredients) -> Expected:
    """Order over the whole run: of the classical Runge-Kutta method, under noise of Euler-Maruyama.

    References
    ----------
    Kloeden and Platen 1992, "Numerical Solution of Stochastic Differential Equations", section 10.3: additive
    noise and a drift with two derivatives, strong order 1 (from memory).
    """
    if of.noise is not None:
        return _order_under_noise(of)
    if not of.drive_in_time:
        return Expected(1.0, _UNSCHEDULED)
    if of.rate == "jump":
        return _JUMP
    if of.rate != "smooth":
        return Expected(2.0, "the rate is not differentiable: nor is the right-hand side in time", True)
    return Expected(4.0, "classical Runge-Kutta")


def _order_under_noise(of: Ingredients) -> Expected:
    if of.rate == "jump":
        return _JUMP
    if of.rate != "smooth":
        return Expected(1.0, "Euler-Maruyama for a rate that is not differentiable", observed_only=True)
    reason = "Euler-Maruyama, additive noise: strong order 1"
    return Expected(1.0, reason if of.drive_in_time else f"{reason}; {_UNSCHEDULED}")
