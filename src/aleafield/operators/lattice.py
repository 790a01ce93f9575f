"""Shift-invariant kernels between uniform grids: Toeplitz matrices on an interval, circulant ones on a ring.

Points of several interleaved grids of one spacing (two Gauss points in every element) give one such matrix
for every pair of a test grid and a source grid.
"""

from __future__ import annotations

from abc import abstractmethod
from dataclasses import dataclass
from typing import ClassVar, Self

import numpy as np
import scipy.fft

from aleafield.arrays import ComplexArray, FloatArray
from aleafield.field.kernels import Connectivity
from aleafield.geometry import Domain
from aleafield.operators.operator import KernelOperator, transform_operations, transform_rounding
from aleafield.quadrature import Rule


@dataclass(frozen=True)
class LatticePair:
    """Test points and source points on the grid of the finer of the two.

    With s = `spacing`, test point i of grid a is origin + test_offsets[a] + i test_step s, source point j of
    grid b is origin + source_offsets[b] + j source_step s.

    Attributes
    ----------
    spacing : float
        Units of length.
    test_step, source_step : int
        One of them is 1.
    n_test, n_source : int
        Points of one grid.
    test_offsets, source_offsets : tuple of float
    """

    spacing: float
    test_step: int
    source_step: int
    n_test: int
    n_source: int
    test_offsets: tuple[float, ...]
    source_offsets: tuple[float, ...]

    @classmethod
    def of(cls, test: Rule, source: Rule) -> Self | None:
        """The pair, or None where the points of the two rules share no uniform grid."""
        a, b = test.lattice, source.lattice
        if a is None or b is None:
            return None
        spacing = min(a.spacing, b.spacing)
        test_step, source_step = a.spacing / spacing, b.spacing / spacing
        steps = np.array([test_step, source_step])
        if a.origin != b.origin or np.any(np.abs(steps - np.rint(steps)) > 1e-9 * steps):
            return None
        return cls(
            spacing,
            round(test_step),
            round(source_step),
            len(test.points) // len(a.offsets),
            len(source.points) // len(b.offsets),
            a.offsets,
            b.offsets,
        )

    @property
    def test_span(self) -> int:
        """Places on the fine grid from the first to the last test point of an interval."""
        return self.test_step * (self.n_test - 1) + 1

    @property
    def source_span(self) -> int:
        """Places on the fine grid from the first to the last source point of an interval."""
        return self.source_step * (self.n_source - 1) + 1

    @property
    def blocks(self) -> int:
        """Number of pairs of a test grid and a source grid."""
        return len(self.test_offsets) * len(self.source_offsets)

    def shifts(self, places: FloatArray) -> FloatArray:
        """Displacements x - y for whole numbers of places (L,), shape (test grids, source grids, L)."""
        between = np.subtract.outer(np.asarray(self.test_offsets), np.asarray(self.source_offsets))
        return np.asarray(between[:, :, None] + places * self.spacing)


class _LatticeOperator(KernelOperator):
    """Convolution by Fourier transforms; subclasses say how displacements are laid out in the transform."""

    def __init__(self, kernel: Connectivity, domain: Domain, pair: LatticePair) -> None:
        self._pair = pair
        self._length = self.transform_length(pair)
        shifts = pair.shifts(self._places(pair, self._length))
        values = kernel.matrix(shifts, np.zeros(1), domain)
        values[..., self._outside(pair, self._length)] = 0.0
        self._spectrum: ComplexArray = np.asarray(scipy.fft.rfft(values, axis=-1))

    @staticmethod
    @abstractmethod
    def transform_length(pair: LatticePair) -> int:
        """Length of the transforms."""

    @staticmethod
    @abstractmethod
    def _places(pair: LatticePair, length: int) -> FloatArray:
        """The whole number of places that each entry of the transform stands for."""

    @staticmethod
    def _outside(pair: LatticePair, length: int) -> slice:
        """Entries that stand for no displacement between two points."""
        return slice(0, 0)

    @classmethod
    def operations(cls, pair: LatticePair) -> float:
        """Floating-point operations of an application to one sample."""
        length = cls.transform_length(pair)
        transforms = len(pair.test_offsets) + len(pair.source_offsets)
        return transforms * transform_operations(length) + 8 * pair.blocks * (length // 2 + 1)

    @staticmethod
    def rounding(points: int) -> float:
        """Three Fourier transforms."""
        return transform_rounding(points)

    def _source_spectrum(self, source: FloatArray, grid: int) -> ComplexArray:
        """Transform of the sources on one grid, spread over the fine grid; (S, length // 2 + 1)."""
        own = source[:, grid :: len(self._pair.source_offsets)]
        step = self._pair.source_step
        if step > 1:
            spread = np.zeros((len(source), self._length))
            spread[:, : step * own.shape[1] : step] = own
            own = spread
        return np.asarray(scipy.fft.rfft(own, self._length, axis=-1))

    def _values(self, spectrum: ComplexArray) -> FloatArray:
        """Inverse transform, taken at the test points of one grid; (S, n_test)."""
        pair = self._pair
        values = np.asarray(scipy.fft.irfft(spectrum, self._length, axis=-1))
        return values[:, : pair.test_step * (pair.n_test - 1) + 1 : pair.test_step]

    def apply(self, source: FloatArray) -> FloatArray:
        """Transform every source grid, combine, transform back on every test grid."""
        pair = self._pair
        spectra = [self._source_spectrum(source, b) for b in range(len(pair.source_offsets))]
        if pair.blocks == 1:
            spectra[0] *= self._spectrum[..., 0, 0, :]
            return self._values(spectra[0])
        n_grids = len(pair.test_offsets)
        result = np.empty((len(source), n_grids * pair.n_test))
        for a in range(n_grids):
            total = spectra[0] * self._spectrum[..., a, 0, :]
            for b in range(1, len(spectra)):
                total += spectra[b] * self._spectrum[..., a, b, :]
            result[:, a::n_grids] = self._values(total)
        return result


class ToeplitzOperator(_LatticeOperator):
    """A shift-invariant kernel on an interval: the Toeplitz matrix embedded in a circulant one.

    Parameters
    ----------
    kernel : Connectivity
        Bound, shift-invariant.
    domain : Interval
    pair : LatticePair

    References
    ----------
    Golub and Van Loan 2013, "Matrix Computations", section 4.8 (from memory).
    """

    name: ClassVar[str] = "toeplitz"

    @staticmethod
    def transform_length(pair: LatticePair) -> int:
        """A fast length that holds every displacement without overlap."""
        return int(scipy.fft.next_fast_len(pair.test_span + pair.source_span - 1, real=True))

    @staticmethod
    def _places(pair: LatticePair, length: int) -> FloatArray:
        """0 .. test_span - 1 from the front, -1 .. -(source_span - 1) from the back, unused between."""
        place = np.arange(length, dtype=np.float64)
        place[length - (pair.source_span - 1) :] -= length
        place[pair.test_span : length - (pair.source_span - 1)] = 0.0
        return place

    @staticmethod
    def _outside(pair: LatticePair, length: int) -> slice:
        """The unused middle."""
        return slice(pair.test_span, length - (pair.source_span - 1))


class CirculantOperator(_LatticeOperator):
    """A shift-invariant kernel on a ring, sampled: the kernel matrix is circulant as it stands.

    Parameters
    ----------
    kernel : Connectivity
        Bound, shift-invariant; kernels of the line are periodised by it.
    domain : Ring
    pair : LatticePair

    References
    ----------
    Golub and Van Loan 2013, "Matrix Computations", section 4.8 (from memory).
    """

    name: ClassVar[str] = "circulant"

    @staticmethod
    def transform_length(pair: LatticePair) -> int:
        """All places of the fine grid round the ring."""
        return pair.test_step * pair.n_test

    @staticmethod
    def _places(pair: LatticePair, length: int) -> FloatArray:
        """0 .. length - 1."""
        return np.arange(length, dtype=np.float64)
