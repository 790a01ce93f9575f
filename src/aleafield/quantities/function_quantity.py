"""Any function of a field, from Python."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.quantities.in_time import Reading
from aleafield.quantities.quantity import At, When
from aleafield.quantities.timed import TimedQuantity
from aleafield.spaces import Space
from aleafield.units import DIMENSIONLESS, Dimension


@dataclass(frozen=True)
class FunctionQuantity(TimedQuantity):
    """A Python function of the field at the space's nodes.

    The function gets u, shape (S, P), and the nodes x, shape (P,), ascending, and returns one number for each
    row, shape (S,).  A row's number must not depend on the other rows.  Rows of samples that failed are
    handed over as zeros and their numbers dropped.  How fast it converges as the mesh is refined is its own
    affair.

    Parameters
    ----------
    name : str
    function : callable
        At the top level of a module, so that workers can be handed it.
    when : At or Over
    dimension : exponents of (activity, length, time)
    """

    measure = "function"
    name: str
    function: Callable[[FloatArray, FloatArray], FloatArray]
    when: When = At()
    dimension: Dimension = DIMENSIONLESS

    def reading(self, space: Space) -> Reading:
        """The function of the nodal values; InputError where it does not return one number for each row."""
        order = space.display_order
        x = space.nodes[order]

        def take(u: FloatArray, t: float, inside: float | None) -> tuple[FloatArray, None]:
            found = np.asarray(self.function(np.take(space.nodal(u), order, axis=1), x), dtype=np.float64)
            if found.shape != (u.shape[0],):
                needed = f"one number for each row of u, shape {(u.shape[0],)}, is needed"
                raise InputError(self.key("function"), f"an array of shape {found.shape}", needed)
            return found, None

        return Reading(take)
