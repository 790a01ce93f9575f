"""The measure "spectral power": the squared size of one Fourier mode on a ring."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.geometry import Domain
from aleafield.quantities.in_time import Reading, plain
from aleafield.quantities.quantity import At, When
from aleafield.quantities.timed import TimedQuantity
from aleafield.spaces import Space


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
    dimension = (2, 0, 0)
    name: str
    wavenumber: int
    when: When = At()

    @property
    def defined_for_white_noise(self) -> bool:
        """It is: the variance of one mode does not depend on the mesh."""
        return True

    def refuse_domain(self, domain: Domain) -> None:
        """Raise InputError on an interval."""
        if not domain.periodic:
            raise InputError(self.key("measure"), "'spectral power' on an interval", "a ring is needed")

    def reading(self, space: Space) -> Reading:
        """Squared modulus of the Fourier coefficient."""

        def power(u: FloatArray) -> FloatArray:
            coefficient = space.fourier_coefficient(u, self.wavenumber)
            return np.asarray(coefficient.real**2 + coefficient.imag**2)

        return plain(power)
