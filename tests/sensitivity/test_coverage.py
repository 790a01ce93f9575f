"""Intervals of first and total indices hold the published values as often as they say."""

from __future__ import annotations

import pytest

from tests.sensitivity.coverage import count_hits, least_hits
from tests.sensitivity.known_functions import FUNCTIONS, KnownFunction

DESIGNS = 100
POINTS = 32
FLOOR = 0.92
"""Of every single index, as the benchmark measures it over 1,000 designs."""


@pytest.mark.parametrize("function", FUNCTIONS, ids=lambda f: f.name)
def test_each_index_is_covered(function: KnownFunction) -> None:
    for kind, hits in count_hits(function, POINTS, DESIGNS, seed=71_000).items():
        assert (hits >= least_hits(DESIGNS, FLOOR)).all(), (kind, hits / DESIGNS)
