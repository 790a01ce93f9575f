"""How many samples and noise paths a request gets, by hand from the rules of the study file."""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import pytest

from aleafield.errors import InputError
from aleafield.sampling.allocation import Allocation, allocate, extended
from aleafield.sampling.request import SamplingRequest

QUASI: Final = "quasi-monte carlo"
PLAIN: Final = "monte carlo"
CHAOS: Final = "polynomial chaos"


@pytest.mark.parametrize(
    ("request_", "n_inputs", "noisy", "expected"),
    [
        (SamplingRequest("auto", 1024, 2), 3, True, (QUASI, 1024, 16, 2, 2048)),
        (SamplingRequest("auto", 1000, 2), 3, False, (QUASI, 1024, 16, 1, 1024)),
        (SamplingRequest(PLAIN, 1000, 3), 3, True, (PLAIN, 1000, 1, 3, 3000)),
        (SamplingRequest("auto", 500, 1), 0, True, (PLAIN, 500, 1, 1, 500)),
        (SamplingRequest(QUASI, 500, 2), 0, True, (PLAIN, 500, 1, 2, 1000)),
        (SamplingRequest("auto", 500, 4), 0, False, (PLAIN, 1, 1, 1, 1)),
    ],
)
def test_counts(
    request_: SamplingRequest, n_inputs: int, noisy: bool, expected: tuple[str, int, int, int, int]
) -> None:
    found = allocate(request_, n_inputs, noisy)
    counts = (found.method, found.samples, found.replicates, found.repeats, found.realizations)
    assert counts == expected


def test_chaos_is_fitted_to_the_points_of_quasi_monte_carlo() -> None:
    found = allocate(SamplingRequest(CHAOS, 1000), 3, noisy=False)
    points = allocate(SamplingRequest(QUASI, 1000), 3, noisy=False)
    assert found.surrogate
    assert not points.surrogate
    assert replace(found, surrogate=False, note="") == replace(points, note="")
    longer = extended(found, 1)
    assert (longer.surrogate, longer.method, longer.samples) == (True, QUASI, 2048)


def test_what_was_changed_is_said() -> None:
    assert "Monte Carlo" in allocate(SamplingRequest(QUASI, 500), 0, noisy=True).note
    assert allocate(SamplingRequest("auto", 500), 0, noisy=True).note == ""
    assert "one run" in allocate(SamplingRequest("auto", 500), 0, noisy=False).note
    assert "1000 samples asked, 1024 used" in allocate(SamplingRequest("auto", 1000, 2), 1, noisy=True).note
    assert "used: polynomial chaos takes" in allocate(SamplingRequest(CHAOS, 1000), 1, noisy=False).note


def test_extension_keeps_the_paths() -> None:
    longer = extended(Allocation(QUASI, 64, 16, "", 3), 10)
    assert (longer.samples, longer.repeats, longer.realizations) == (128, 3, 384)
    longer = extended(Allocation(PLAIN, 64, 1, "", 3), 10)
    assert (longer.samples, longer.repeats, longer.realizations) == (74, 3, 222)


def test_more_realizations_than_can_be_numbered() -> None:
    with pytest.raises(InputError, match="at most 2,000,000,000 realizations"):
        allocate(SamplingRequest(PLAIN, 10**9, 3), 1, noisy=True)
    with pytest.raises(InputError, match="realizations"):
        extended(Allocation(PLAIN, 10**9, 1, "", 2), 1)
