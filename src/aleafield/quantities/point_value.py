"""The measure "value": the field at one point."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.arrays import FloatArray
from aleafield.geometry import Domain
from aleafield.quantities.point import off_the_nodes, point_evaluation, refuse_outside, value_at
from aleafield.quantities.quantity import At, When
from aleafield.quantities.timed import LinearQuantity
from aleafield.spaces import Space
from aleafield.units import ACTIVITY


@dataclass(frozen=True)
class Value(LinearQuantity):
    """u(at).

    Parameters
    ----------
    name : str
    at : float
        Point of the domain, units of length.
    when : At or Over
    """

    measure = "value"
    dimension = ACTIVITY
    name: str
    at: float
    when: When = At()

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError where the point lies outside."""
        refuse_outside(self.at, domain, self.key("at"))

    @property
    def functional_name(self) -> str:
        """The value at that point."""
        return value_at(self.at)

    def functional(self, space: Space) -> FloatArray:
        """The element's value at the point."""
        return point_evaluation(space, self.at)

    def off_the_nodes(self, spaces: tuple[Space, ...]) -> bool:
        """Whether the point is not a node of each piecewise-linear space."""
        return off_the_nodes(self.at, spaces)
