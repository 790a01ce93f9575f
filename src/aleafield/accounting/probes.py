"""How many samples are also solved at the other levels."""

from __future__ import annotations

from aleafield.randomness.points import SCRAMBLINGS

LEAST = 32
SHARE = 0.25
"""The extra levels may cost this share of the main samples."""


def number_of_probes(
    samples: int, main_cost_per_sample: float, extra_cost_per_probe: float, at_least: int = LEAST
) -> int:
    """Number of probes n_p from counted operations, never from measured time.

    The largest multiple of 16, at most `samples`, whose extra levels cost at most a quarter of the main
    samples; at least `at_least` (rounded up to a multiple of 16) where there are as many samples, even if
    that costs more.

    Parameters
    ----------
    samples : number of parameter samples
    main_cost_per_sample : operations of one sample at the run's level, > 0
    extra_cost_per_probe : operations of one probe at all extra levels together, > 0
    at_least : what the recipe asks

    Returns
    -------
    int
        1 <= n_p <= samples.
    """
    affordable = SHARE * samples * main_cost_per_sample / extra_cost_per_probe
    # a multiple of the number of scramblings
    count = SCRAMBLINGS * int(min(affordable, samples) // SCRAMBLINGS)
    return min(samples, max(count, SCRAMBLINGS * -(-at_least // SCRAMBLINGS)))


def share_of_probes(
    probes: int, samples: int, main_cost_per_sample: float, extra_cost_per_probe: float
) -> float:
    """Cost of the extra levels over that of the main samples; above 0.25 it is said."""
    return probes * extra_cost_per_probe / (samples * main_cost_per_sample)
