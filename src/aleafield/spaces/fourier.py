"""Trigonometric polynomials by their values at equally spaced points."""

from __future__ import annotations

from functools import cached_property

import numpy as np
import scipy.fft

from aleafield.arrays import ComplexArray, FloatArray, IntArray
from aleafield.geometry import Domain, Refinement, Ring, ring_grid
from aleafield.spaces.prolongation import Prolongation
from aleafield.spaces.spectral import Jets, SpectralSpace

_TRANSFORM_PAYS = 2**15
"""n P above which two Fourier transforms cost less than a matrix product, from our own trials."""


class PaddedFourierProlongation(Prolongation):
    """From n equally spaced points to m > n of them: Fourier transform, zeros appended, transform back.

    Parameters
    ----------
    n, m : int
    order : int array (m,)
        The place on the finer grid j length / m of each point asked for.
    """

    name = "fourier transform"

    def __init__(self, n: int, m: int, order: IntArray) -> None:
        self._n, self._m = n, m
        self._order = None if np.array_equal(order, np.arange(m)) else order

    def apply(self, u: FloatArray) -> FloatArray:
        """Values at the finer grid; the last mode of an even n, a cosine, is halved between +n/2 and -n/2."""
        spectrum = scipy.fft.rfft(u, axis=-1)
        spectrum *= self._m / self._n
        if self._n % 2 == 0:
            spectrum[:, -1] *= 0.5
        values = np.asarray(scipy.fft.irfft(spectrum, self._m, axis=-1))
        return values if self._order is None else values[:, self._order]


class Fourier(SpectralSpace):
    """Trigonometric polynomials with n modes; the unknowns are the values at j length / n, j = 0 .. n - 1.

    For odd n the modes are 1 and the cosines and sines up to (n - 1)/2; for even n those up to n/2 - 1 and
    the cosine of n/2.  Interpolation and projection converge faster than any power for analytic periodic
    functions.

    Parameters
    ----------
    domain : Ring
    n : int, at least 1

    Raises
    ------
    InputError
        For n < 1.
    """

    projector = "fourier"
    domains = (Ring,)

    def __init__(self, domain: Ring, n: int) -> None:
        super().__init__(domain, n)
        self._ring = domain
        self.nodes = ring_grid(domain, n)
        self.integral_weights = np.full(n, domain.length / n)
        self._waves = np.arange(n // 2 + 1)
        self._multiplicity = np.full(n // 2 + 1, 2.0)
        self._multiplicity[0] = 1.0
        if n % 2 == 0:
            self._multiplicity[-1] = 1.0

    @classmethod
    def refinement(cls, domain: Domain) -> Refinement:
        """n -> 2n points on the ring, and back to n // 2."""
        return Refinement(both_ends=False, smallest=1, key="scheme.nodes")

    def _factor(self, order: int) -> ComplexArray:
        """What a derivative multiplies the coefficients by, times their multiplicity / n; (n // 2 + 1,)."""
        symbol = (2j * np.pi / self._ring.length * self._waves) ** order
        return np.asarray(symbol * (self._multiplicity / self.n), dtype=np.complex128)

    def _analysis(self) -> ComplexArray:
        """Matrix (n // 2 + 1, n) of exp(-2 pi i j k / n), the angle reduced in whole numbers."""
        turns = np.outer(self._waves, np.arange(self.n)) % self.n
        matrix: ComplexArray = np.exp(-2j * np.pi * turns / self.n)
        if self.n % 2 == 0:
            matrix[-1] = matrix[-1].real
        return matrix

    def evaluation_matrix(self, x: FloatArray) -> FloatArray:
        """The trigonometric cardinal functions of the nodes at x (P,); shape (P, n)."""
        return self.derivative_matrix(x, 0)

    def derivative_matrix(self, x: FloatArray, order: int = 1) -> FloatArray:
        """Derivatives of the cardinal functions at x (P,); shape (P, n)."""
        waves = np.exp(2j * np.pi / self._ring.length * np.outer(self._ring.wrap(x), self._waves))
        return np.ascontiguousarray(((waves * self._factor(order)) @ self._analysis()).real)

    def _amplitudes(self, u: FloatArray, order: int) -> FloatArray:
        """Factors of the cosines, then of the sines."""
        spectrum = np.fft.rfft(u, axis=-1) * self._factor(order)
        return np.concatenate((spectrum.real, -spectrum.imag), axis=-1)

    def _profiles(self, x: FloatArray) -> FloatArray:
        """cos(2 pi k x / length), k = 0 .. n // 2, then the sines.

        From the first of them by the addition theorems, the number known doubled each time: errors grow with
        k as those of the products k x do.  Only sums and products of single numbers, so that no bit depends
        on the shape.
        """
        count = len(self._waves)
        waves = np.empty((*x.shape, 2 * count))
        cosines, sines = waves[..., :count], waves[..., count:]
        cosines[..., 0], sines[..., 0] = 1.0, 0.0
        with np.errstate(invalid="ignore"):
            angle = (2.0 * np.pi / self._ring.length) * self._ring.wrap(x)
            if count > 1:
                cosines[..., 1], sines[..., 1] = np.cos(angle), np.sin(angle)
        known = 2
        while known < count:
            more = min(known - 1, count - known)
            low, high, new = slice(1, more + 1), slice(known - 1, known), slice(known, known + more)
            cosines[..., new] = cosines[..., low] * cosines[..., high] - sines[..., low] * sines[..., high]
            sines[..., new] = cosines[..., low] * sines[..., high] + sines[..., low] * cosines[..., high]
            known += more
        waves[~np.isfinite(x)] = np.nan
        return waves

    def jets(self, u: FloatArray) -> Jets:
        """With the modes at a point for all orders: a derivative turns a mode and multiplies it."""
        spectrum = np.fft.rfft(u, axis=-1) * self._factor(0)
        real, imaginary = spectrum.real.copy(), spectrum.imag.copy()
        wavenumbers = (2.0 * np.pi / self._ring.length) * self._waves
        count = len(self._waves)

        def at(which: IntArray, x: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
            every = len(which) == len(real)
            a, b = (real, imaginary) if every else (real[which], imaginary[which])
            waves = self._profiles(x)
            cosines, sines = waves[:, :count], waves[:, count:]
            modes = cosines * a - sines * b
            slopes = cosines * b
            slopes += sines * a
            slopes *= wavenumbers
            value = modes.sum(axis=-1)
            modes *= wavenumbers**2
            return value, -slopes.sum(axis=-1), -modes.sum(axis=-1)

        return at

    def square_integral(self, u: FloatArray) -> FloatArray:
        """Trapezoid rule, less what it counts too much of the last cosine of an even n; shape (S,)."""
        total = (u * u).sum(axis=-1) * (self._ring.length / self.n)
        if self.n % 2 == 0:
            total = total - 0.5 * self._ring.length * self._last_cosine(u) ** 2
        return np.asarray(total)

    def _last_cosine(self, u: FloatArray) -> FloatArray:
        signs = np.where(np.arange(self.n) % 2 == 0, 1.0, -1.0)
        return np.asarray((u * signs).sum(axis=-1) / self.n)

    def fourier_coefficient(self, u: FloatArray, k: int) -> ComplexArray:
        """The discrete coefficient for 2 |k| < n, half the last cosine for 2 |k| = n, 0 above; shape (S,)."""
        if 2 * abs(k) > self.n:
            return np.zeros(u.shape[0], dtype=np.complex128)
        if 2 * abs(k) == self.n:
            return np.asarray(0.5 * self._last_cosine(u), dtype=np.complex128)
        turns = (np.arange(self.n) * k) % self.n
        return np.asarray((u * np.exp(-2j * np.pi * turns / self.n)).sum(axis=-1) / self.n)

    @cached_property
    def search_grid(self) -> FloatArray:
        """4n equally spaced points, ascending; the nodes are among them."""
        return np.sort(ring_grid(self._ring, 4 * self.n))

    def _prolongation_to(self, points: FloatArray) -> Prolongation:
        m = len(points)
        if m > self.n and self.n * m >= _TRANSFORM_PAYS:
            order = self._grid_order(points)
            if order is not None:
                return PaddedFourierProlongation(self.n, m, order)
        return super()._prolongation_to(points)

    def _grid_order(self, points: FloatArray) -> IntArray | None:
        """Places of the m points on the grid j length / m, None where they are not all of that grid."""
        m = len(points)
        steps = np.mod(points, self._ring.length) / (self._ring.length / m)
        nearest = np.rint(steps)
        if np.abs(steps - nearest).max() > 8 * np.finfo(np.float64).eps * m:
            return None
        order: IntArray = nearest.astype(np.int64) % m
        return order if np.array_equal(np.sort(order), np.arange(m)) else None
