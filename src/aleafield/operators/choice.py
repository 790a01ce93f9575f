"""Which operator applies a kernel: chosen by counted operations, never timed, so that it repeats itself.

An operation of a large shared matrix product runs out of registers and cache lines that are used many
times; one of a Fourier transform or of a matrix that serves a single sample waits for memory.  In our own
trials (two AVX-512 cores, batches of 64, 33 to 1025 points) an operation of a transform took 4 to 9 times,
one of a matrix per sample 3 to 9 times as long as one of the shared product.  The counts are weighted
accordingly, the weights are part of the choice, and the crossover is where the weighted counts are equal:
for a certain kernel about 290 points on an interval (Toeplitz against a shared matrix) and 120 on a ring;
for an uncertain one about 50 and 25 (against a matrix per sample).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.field.kernels import Connectivity, CosineKernel
from aleafield.geometry import Domain
from aleafield.operators.dense import SampleDenseOperator, SharedDenseOperator
from aleafield.operators.lattice import CirculantOperator, LatticePair, ToeplitzOperator
from aleafield.operators.operator import UNIT_ROUNDING, KernelOperator, transform_operations
from aleafield.operators.symbol import SymbolOperator, sampling_length
from aleafield.quadrature import Rule

Kind = Literal[
    "exact symbol", "circulant", "toeplitz", "shared dense", "dense per sample", "closed between crossings"
]
KernelUse = Literal["sampled", "exact symbol", "closed"]
"""Kernel values at the points; its exact Fourier symbol; closed integrals between threshold crossings."""

WEIGHTS: dict[str, float] = {
    "exact symbol": 6.0,
    "circulant": 6.0,
    "toeplitz": 6.0,
    "shared dense": 1.0,
    "dense per sample": 4.0,
    "closed between crossings": 1.0,
}
"""Cost of one operation, that of a shared matrix product being 1."""


@dataclass(frozen=True)
class _Candidate:
    kind: Kind
    operations: float
    error: float

    @property
    def cost(self) -> float:
        return self.operations * WEIGHTS[self.kind]


@dataclass(frozen=True, eq=False)
class OperatorChoice:
    """The operator of a level, to be built for every batch (once for all where the kernel is certain).

    Attributes
    ----------
    name : str
        "closed between crossings" names no operator: a step rate under cosine kernels needs none.
    reason : str
        Why it was chosen, in words.
    operations : float
        Floating-point operations of one application to one sample.
    error : float
        Rounding bound, see `KernelOperator.rounding`.
    folded : bool
        Whether the projection is part of the operator's matrix, so that it gives unknowns, not values.
    """

    name: Kind
    reason: str
    operations: float
    error: float
    folded: bool
    _domain: Domain
    _test: Rule
    _source: Rule
    _truncated: bool

    @property
    def cost(self) -> float:
        """Operations, weighted by what one of them costs against one of a shared matrix product."""
        return self.operations * WEIGHTS[self.name]

    def build(self, kernel: Connectivity, fold: Callable[[FloatArray], FloatArray]) -> KernelOperator:
        """The operator of a bound kernel.

        Parameters
        ----------
        kernel : Connectivity
            Bound.
        fold : function of a matrix (.., T, Q) to one (.., n, Q)
            The projection of values at the test points, used where `folded`.
        """
        assert self.name != "closed between crossings"
        domain, test, source = self._domain, self._test, self._source
        if self.name == "exact symbol":
            q = len(source.points)
            symbol = kernel.symbol(np.arange(q // 2 + 1), domain.length)
            assert symbol is not None
            return SymbolOperator(symbol, domain.length, q, len(test.points), self._truncated)
        if self.name in ("circulant", "toeplitz"):
            pair = LatticePair.of(test, source)
            assert pair is not None
            lattice = CirculantOperator if self.name == "circulant" else ToeplitzOperator
            return lattice(kernel, domain, pair)
        matrix = fold(kernel.matrix(test.points[:, None], source.points[None, :], domain))
        return SharedDenseOperator(matrix) if matrix.ndim == 2 else SampleDenseOperator(matrix)


def cosine_orders(kernel: Connectivity) -> int:
    """Number of coefficients, that of the constant included, of a kernel all of whose parts are cosines."""
    return max(len(part.coefficients) for part in kernel.parts.values() if isinstance(part, CosineKernel))


def choose_operator(
    kernel: Connectivity,
    domain: Domain,
    test: Rule,
    source: Rule,
    unknowns: int,
    projection_operations: float,
    use: KernelUse,
    truncated: bool,
) -> OperatorChoice:
    """The cheapest operator by weighted count of operations.

    Parameters
    ----------
    kernel : Connectivity
        Bound, to any inputs: only what kind of kernel it is, and whether it is certain, matters.
    domain : Interval or Ring
    test, source : Rule
        The points x and y.
    unknowns : int
        n; dense operators give unknowns directly.
    projection_operations : float
        Operations, for one sample, of the projection that the other operators need besides.
    use : "sampled", "exact symbol" or "closed"
        What the pairing asks for; only sampled kernels leave a choice.
    truncated : bool
        Whether the exact symbol keeps the modes of the space only.
    """
    q = len(source.points)

    def chosen(one: _Candidate, reason: str) -> OperatorChoice:
        folded = one.kind in ("shared dense", "dense per sample", "closed between crossings")
        return OperatorChoice(
            one.kind, reason, one.operations, one.error, folded, domain, test, source, truncated
        )

    if use == "closed":
        waves = 2 * cosine_orders(kernel)
        error = (q + waves) * UNIT_ROUNDING
        return chosen(
            _Candidate("closed between crossings", 2.0 * waves * (q + unknowns), error),
            "step rate under cosine kernels: between the threshold crossings the integral is a difference of "
            "sines, and no kernel matrix is needed",
        )
    if use == "exact symbol":
        points = sampling_length(q, len(test.points), truncated)
        count = transform_operations(q) + transform_operations(points) + 2 * q
        error = SymbolOperator.rounding(max(points, q))
        return chosen(
            _Candidate("exact symbol", count + projection_operations, error),
            "every part of the kernel has an exact Fourier symbol: only f(u) is sampled",
        )
    shared = kernel.certain
    dense_kind: Kind = "shared dense" if shared else "dense per sample"
    dense_error = (SharedDenseOperator if shared else SampleDenseOperator).rounding(q)
    dense = _Candidate(dense_kind, 2.0 * unknowns * q, dense_error)
    whose = "one matrix serves the whole batch" if shared else "every sample has its own matrix"
    if not kernel.shift_invariant:
        return chosen(dense, f"the kernel depends on x and y, not on their distance alone; {whose}")
    pair = LatticePair.of(test, source)
    if pair is None:
        return chosen(dense, f"the points share no uniform grid; {whose}")
    lattice_kind: Kind = "circulant" if domain.periodic else "toeplitz"
    lattice_class = CirculantOperator if domain.periodic else ToeplitzOperator
    lattice = _Candidate(
        lattice_kind,
        lattice_class.operations(pair) + projection_operations,
        lattice_class.rounding(lattice_class.transform_length(pair)),
    )
    best, other = sorted((dense, lattice), key=lambda one: one.cost)
    return chosen(
        best,
        f"weighted operations {best.cost:.3g} against {other.cost:.3g} ({other.kind}); "
        + (whose if best is dense else "the kernel depends on the distance alone and the points are uniform"),
    )
