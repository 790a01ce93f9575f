"""Types of the arrays that pass through the whole package, and the matrix product of a batch."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]
ComplexArray = NDArray[np.complex128]

_BLOCK = 8


def batch_product(batch: FloatArray, matrix: FloatArray) -> FloatArray:
    """batch (S, n) times matrix (n, P), shape (S, P); a row's bits do not depend on the other rows.

    One product of all rows would not do: the kernels of a BLAS library, and with them the order of summation,
    depend on the number of rows and on the place of a row among them (seen with OpenBLAS 0.3.31 on processors
    with AVX-512, for batches of every multiple of 8 and for permuted rows of one batch).  Blocks of always 8
    rows are products of always the same shape.  The last block is filled up with zeros.
    """
    n_samples, n = batch.shape
    missing = -n_samples % _BLOCK
    if missing:
        batch = np.concatenate((batch, np.zeros((missing, n))))
    product: FloatArray = np.matmul(batch.reshape(-1, _BLOCK, n), matrix)
    rows: FloatArray = product.reshape(n_samples + missing, matrix.shape[1])[:n_samples]
    return rows
