"""The number of probes against the counts of the specification."""

from __future__ import annotations

import pytest

from aleafield.accounting import number_of_probes, share_of_probes


@pytest.mark.parametrize(
    ("samples", "extra", "expected"),
    [
        (2048, 2.5, 192),
        (128, 2.5, 32),
        (100_000, 2.5, 10_000),
        (2048, 0.1, 2048),
        (40, 0.1, 32),
        (20, 2.5, 20),
        (1, 7.0, 1),
    ],
)
def test_a_quarter_of_the_main_samples_but_at_least_32(samples: int, extra: float, expected: int) -> None:
    """0.25 * 2048 / 2.5 = 204.8, that is 12 blocks of 16; 32 where that is less; never more than all."""
    assert number_of_probes(samples, 1.0, extra) == expected


def test_the_least_is_rounded_up_to_whole_blocks() -> None:
    assert number_of_probes(1000, 1.0, 10.0, at_least=50) == 64


def test_more_are_asked_for_as_far_as_they_cost_no_more_than_the_samples() -> None:
    """1000 / 10 = 100 probes cost as much as the samples, that is 6 blocks of 16; 32 whatever they cost."""
    assert number_of_probes(1000, 1.0, 10.0, at_least=500) == 96
    assert number_of_probes(1000, 1.0, 1e6, at_least=500) == 32


def test_share_of_the_cost() -> None:
    assert share_of_probes(32, 128, 2.0, 5.0) == pytest.approx(160 / 256)
