"""The contract of an approximation space X_n."""

from __future__ import annotations

from abc import ABC, abstractmethod
from typing import ClassVar

import numpy as np

from aleafield.arrays import ComplexArray, FloatArray, IntArray
from aleafield.errors import InputError
from aleafield.geometry import Domain, Refinement
from aleafield.spaces.prolongation import DenseProlongation, IdentityProlongation, Prolongation

_KEPT_PROLONGATIONS = 16


class Space(ABC):
    """A space of functions on a domain, with n unknowns for each of its elements.

    An element is a row of n floats; a batch of S elements is an array (S, n), sample first.  Unless the
    subclass says otherwise the unknowns are the values at the nodes.

    To add a space: set `projector`, `domains`, `nodes` and `integral_weights`, implement the abstract members, and add
    it to `make_space` and to the table of the exactness tests.  Members ending in `_each` take other points
    for every sample and must give a row the same bits whatever the other rows hold and however many they are.

    Parameters
    ----------
    domain : Interval or Ring
    n : int
        Dimension.

    Attributes
    ----------
    projector : str
        Name in a study file.
    domains : tuple of types
        The kinds of domain that it exists on; `make_space` refuses others.
    nodes : float array (n,)
        Where nodal values live, units of length.  Ascending on an interval; on a ring j length / n wrapped,
        in the order j = 0 .. n - 1.
    integral_weights : float array (n,)
        The integral of an element is (u * integral_weights).sum(-1), exactly.

    Raises
    ------
    InputError
        Where n is too small for the space.
    """

    projector: ClassVar[str]
    domains: ClassVar[tuple[type[Domain], ...]]
    nodes: FloatArray
    integral_weights: FloatArray

    def __init__(self, domain: Domain, n: int) -> None:
        self.refinement(domain).check(n)
        self.domain = domain
        self.n = n
        self._prolongations: dict[bytes, Prolongation] = {}

    @classmethod
    @abstractmethod
    def refinement(cls, domain: Domain) -> Refinement:
        """How the dimension grows from level to level on that domain."""

    @abstractmethod
    def evaluation_matrix(self, x: FloatArray) -> FloatArray:
        """Matrix (P, n) that takes unknowns to values at the points x (P,) of the domain."""

    @abstractmethod
    def derivative_matrix(self, x: FloatArray, order: int = 1) -> FloatArray:
        """Matrix (P, n) that takes unknowns to the derivative of that order at the points x (P,)."""

    @abstractmethod
    def evaluate_each(self, u: FloatArray, x: FloatArray) -> FloatArray:
        """Values of u (S, n) at points x (S, P) that differ from sample to sample; shape (S, P)."""

    @abstractmethod
    def differentiate_each(self, u: FloatArray, x: FloatArray, order: int = 1) -> FloatArray:
        """Derivatives of u (S, n) at points x (S, P) that differ from sample to sample; shape (S, P)."""

    @abstractmethod
    def square_integral(self, u: FloatArray) -> FloatArray:
        """Exact integral of the square of each element u (S, n); shape (S,)."""

    @property
    @abstractmethod
    def search_grid(self) -> FloatArray:
        """Ascending points (P,) dense enough to bracket the extrema and level crossings of an element."""

    @property
    def display_order(self) -> IntArray:
        """Order (n,) in which the nodes ascend."""
        return np.argsort(self.nodes, kind="stable").astype(np.int64)

    def coefficients(self, nodal: FloatArray) -> FloatArray:
        """Unknowns (S, n) of the elements with values nodal (S, n) at the nodes."""
        return nodal

    def nodal(self, u: FloatArray) -> FloatArray:
        """Values (S, n) at the nodes of the elements u (S, n)."""
        return u

    def fourier_coefficient(self, u: FloatArray, k: int) -> ComplexArray:
        """(1 / length) integral of u exp(-2 pi i k x / length), exact for each element u (S, n); shape (S,).

        Raises
        ------
        InputError
            On an interval, whose elements are not periodic.
        """
        found = f"a Fourier coefficient, wavenumber {k}, on an interval"
        raise InputError("measure", found, "a ring is needed")

    def prolongation(self, points: FloatArray) -> Prolongation:
        """The map from unknowns to values at points (P,), set up once and kept for the next call."""
        key = points.tobytes()
        found = self._prolongations.get(key)
        if found is None:
            found = self._prolongation_to(np.array(points, dtype=np.float64))
            while len(self._prolongations) >= _KEPT_PROLONGATIONS:
                del self._prolongations[next(iter(self._prolongations))]
            self._prolongations[key] = found
        return found

    def evaluate(self, u: FloatArray, x: FloatArray) -> FloatArray:
        """Values (S, P) of the elements u (S, n) at the points x (P,), the same for all samples."""
        return self.prolongation(x).apply(u)

    def _prolongation_to(self, points: FloatArray) -> Prolongation:
        """Choose the map to a set of points, called once for each: identity at the nodes, else dense.

        A space whose unknowns are not nodal values must override this.
        """
        if agree(points, self.nodes, self.domain.length):
            return IdentityProlongation()
        return DenseProlongation(self.evaluation_matrix(points))


def agree(points: FloatArray, others: FloatArray, length: float) -> bool:
    """Whether two sets of points are the same to rounding, for coordinates of the size of `length`."""
    if points.shape != others.shape:
        return False
    scale = max(length, float(np.abs(others).max()))
    return bool(np.abs(points - others).max() <= 8 * np.finfo(np.float64).eps * scale)


def apply_each(matrices: FloatArray, u: FloatArray) -> FloatArray:
    """Matrices (S, P, n) or (P, n) times u (S, n), one matrix-vector product for each sample; (S, P).

    Every sample is a product of its own, so that its bits do not depend on the batch.
    """
    return np.asarray(np.matmul(matrices, u[:, :, None]))[:, :, 0]
