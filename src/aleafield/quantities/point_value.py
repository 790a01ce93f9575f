"""The measure "value": the field at one point."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.geometry import Domain
from aleafield.quantities.in_time import Reading
from aleafield.quantities.point import PointEvaluation, off_the_nodes, refuse_outside
from aleafield.quantities.quantity import At, When
from aleafield.quantities.timed import TimedQuantity
from aleafield.spaces import Space
from aleafield.units import ACTIVITY, Dimension


@dataclass(frozen=True)
class Value(TimedQuantity):
    """u(at).

    Parameters
    ----------
    name : str
    at : float
        Point of the domain, units of length.
    when : At or Over
    """

    measure = "value"
    name: str
    at: float
    when: When = At()

    @property
    def dimension(self) -> Dimension:
        """The unit of activity."""
        return ACTIVITY

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError where the point lies outside."""
        refuse_outside(self.at, domain, self.key("at"))

    def reading(self, space: Space) -> Reading:
        """The element's value at the point."""
        evaluate = PointEvaluation(space, self.at)
        return Reading(lambda u, t, inside: (evaluate(u), None))

    def off_the_nodes(self, spaces: tuple[Space, ...]) -> bool:
        """Whether the point is not a node of each piecewise-linear space."""
        return off_the_nodes(self.at, spaces)
