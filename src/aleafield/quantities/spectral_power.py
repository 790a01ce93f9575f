"""The measure "spectral power": the squared size of one Fourier mode on a ring."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.geometry import Domain
from aleafield.quantities.in_time import Reading
from aleafield.quantities.quantity import At, When
from aleafield.quantities.timed import TimedQuantity
from aleafield.spaces import Space
from aleafield.units import Dimension


@dataclass(frozen=True)
class SpectralPower(TimedQuantity):
    """|(1 / length) integral of u exp(-2 pi i k x / length)|^2, exact for the element.

    Parameters
    ----------
    name : str
    wavenumber : int
        k, number of waves on the ring.
    when : At or Over
    """

    measure = "spectral power"
    name: str
    wavenumber: int
    when: When = At()

    @property
    def dimension(self) -> Dimension:
        """Activity squared."""
        return (2, 0, 0)

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError on an interval."""
        if not domain.periodic:
            raise InputError(self.key("measure"), "'spectral power' on an interval", "a ring is needed")

    def reading(self, space: Space) -> Reading:
        """Squared modulus of the Fourier coefficient."""

        def power(u: FloatArray, t: float, inside: float | None) -> tuple[FloatArray, None]:
            coefficient = space.fourier_coefficient(u, self.wavenumber)
            return coefficient.real**2 + coefficient.imag**2, None

        return Reading(power)
