"""Sets of multi-indices against their definitions, counted one by one."""

from __future__ import annotations

from itertools import product
from math import comb

import pytest

from aleafield.chaos.multi_index import (
    closed_terms,
    first_terms,
    hyperbolic,
    second_terms,
    total_degree,
    total_terms,
)


@pytest.mark.parametrize(("d", "p"), [(1, 7), (3, 4), (6, 4), (12, 3), (20, 2)])
def test_number_of_terms_of_a_total_degree(d: int, p: int) -> None:
    indices = total_degree(d, p)
    assert len(indices) == comb(d + p, p)
    assert len({tuple(row) for row in indices.tolist()}) == len(indices)
    assert indices.sum(axis=1).max() == p
    assert not indices[0].any()


@pytest.mark.parametrize(("p", "q", "most"), [(5, 0.75, 3), (6, 0.6, 3), (4, 1.0, 2), (5, 0.5, 1)])
def test_thinned_sets_are_what_they_are_defined_as(p: int, q: float, most: int) -> None:
    expected = {
        index
        for index in product(range(p + 1), repeat=4)
        if sum(a**q for a in index) ** (1 / q) <= p + 1e-9 and sum(a > 0 for a in index) <= most
    }
    assert {tuple(row) for row in hyperbolic(4, p, q, most).tolist()} == expected


def test_terms_of_inputs_pairs_and_subsets() -> None:
    """By looking at the six indices of two inputs at degree 2, and at three inputs."""
    indices = total_degree(2, 2)
    assert indices.tolist() == [[0, 0], [1, 0], [0, 1], [2, 0], [1, 1], [0, 2]]
    assert first_terms(indices).astype(int).tolist() == [[0, 1, 0, 1, 0, 0], [0, 0, 1, 0, 0, 1]]
    assert total_terms(indices).astype(int).tolist() == [[0, 1, 0, 1, 1, 0], [0, 0, 1, 0, 1, 1]]
    assert second_terms(indices).astype(int).tolist() == [[0, 0, 0, 0, 1, 0]]
    three = total_degree(3, 2)
    chosen = closed_terms(three, [0, 2])
    assert {tuple(row) for row in three[chosen].tolist()} == {
        (1, 0, 0),
        (0, 0, 1),
        (2, 0, 0),
        (0, 0, 2),
        (1, 0, 1),
    }
