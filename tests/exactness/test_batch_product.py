"""The matrix product of a batch: right, and with bits of a row that owe nothing to the other rows.

Oracle of the values: products in extended precision.  On processors with AVX-512 one plain product of all
rows fails the second and third test for some of these shapes (OpenBLAS 0.3.31).
"""

from __future__ import annotations

import numpy as np
import pytest

from aleafield.arrays import batch_product

SHAPES = [(17, 17), (64, 253), (257, 257), (801, 97)]
N_ROWS = 64


@pytest.mark.parametrize(("n", "p"), SHAPES)
@pytest.mark.parametrize("rows", [1, 8, 13])
def test_values(n: int, p: int, rows: int) -> None:
    rng = np.random.default_rng(n)
    batch, matrix = rng.normal(size=(rows, n)), rng.normal(size=(n, p))
    exact = batch.astype(np.longdouble) @ matrix.astype(np.longdouble)
    bound = n * np.finfo(np.float64).eps * (np.abs(batch) @ np.abs(matrix))
    assert np.all(np.abs(batch_product(batch, matrix) - exact) <= bound)


@pytest.mark.parametrize(("n", "p"), SHAPES)
def test_every_width_gives_the_same_bits(n: int, p: int) -> None:
    rng = np.random.default_rng(n)
    batch, matrix = rng.normal(size=(N_ROWS, n)), rng.normal(size=(n, p))
    whole = batch_product(batch, matrix)
    for width in (1, 8, 13, 16, 24, 40):
        assert np.array_equal(batch_product(batch[:width], matrix), whole[:width]), width


@pytest.mark.parametrize(("n", "p"), SHAPES)
def test_every_order_of_the_rows_gives_the_same_bits(n: int, p: int) -> None:
    rng = np.random.default_rng(n)
    batch, matrix = rng.normal(size=(N_ROWS, n)), rng.normal(size=(n, p))
    whole = batch_product(batch, matrix)
    for _ in range(5):
        order = rng.permutation(N_ROWS)
        assert np.array_equal(batch_product(batch[order], matrix), whole[order])


def test_a_failed_row_does_not_spoil_the_others() -> None:
    rng = np.random.default_rng(2)
    batch, matrix = rng.normal(size=(16, 33)), rng.normal(size=(33, 65))
    whole = batch_product(batch, matrix)
    batch[3, 4], batch[9, 0] = np.nan, np.inf
    with np.errstate(all="ignore"):
        found = batch_product(batch, matrix)
    sound = np.setdiff1d(np.arange(16), [3, 9])
    assert np.array_equal(found[sound], whole[sound])
    assert not np.isfinite(found[[3, 9]]).any()
