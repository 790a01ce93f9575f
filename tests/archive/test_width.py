"""Chunks are narrow where every sample has a kernel matrix of its own."""

from __future__ import annotations

import pytest

from aleafield.runs.plan_file import MATRIX_NUMBERS, default_width
from aleafield.runs.planning import make_plan, matrix_numbers
from aleafield.study.reading import read_text
from tests.archive.studies import linear_ring


@pytest.mark.parametrize(("points", "width"), [(65, 256), (257, 248), (513, 56), (2001, 8)])
def test_matrices_of_a_chunk_stay_within_the_budget(points: int, width: int) -> None:
    """By hand: 2^24 // points^2, down to a multiple of 8, from 8 to 256."""
    found = default_width(16, 256 * 248, points**2)
    assert found <= width
    assert found == 8 or found * points**2 <= MATRIX_NUMBERS


def test_the_finest_level_is_what_counts() -> None:
    """A formula of x and y with an uncertain number: a matrix per sample, 64 x 64 at the finest level."""
    text = linear_ring(64).source.text.replace(
        'form = "cosine"\ncoefficients = [0.0, "uniform(0.1, 0.2)"]',
        'form = "formula"\nformula = "a * cos(x) * cos(y)"\na = "uniform(0.1, 0.2)"',
    )
    plan, model = make_plan(read_text(text.replace("nodes = 16", "nodes = 32")))
    assert max(matrix_numbers(model, level) for level in plan.extra_levels) == 64 * 64
    assert matrix_numbers(model, plan.level) == 32 * 32


def test_a_transform_needs_no_matrix() -> None:
    plan, model = make_plan(linear_ring(64))
    assert matrix_numbers(model, plan.level) == 0
