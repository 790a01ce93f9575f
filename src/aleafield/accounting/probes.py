"""How many samples are also solved at the other levels."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.randomness.points import SCRAMBLINGS

LEAST = 32
SHARE = 0.25
"""The extra levels may cost this share of the main samples."""
LARGEST_SHARE = 1.0
"""They may cost as much where noise between the levels asks for more probes."""


@dataclass(frozen=True, eq=False)
class PilotDifferences:
    """One quantity of pilot samples and its difference between the two levels of one part.

    Attributes
    ----------
    quantity : float array (A, R)
        The run's level: A parameter samples with R noise paths each.
    difference : float array (A, R)
        Run less finer level; NaN (as in `quantity`) where it does not occur or has failed.
    factor : float
        F of the part, as `anticipated_factor` gives it.
    """

    quantity: FloatArray
    difference: FloatArray
    factor: float


def demand(pilots: Iterable[PilotDifferences]) -> float:
    """Probes per sample that keep the noise of each bias at half the sampling half-width.

    The half-width F t sd(D) / sqrt(n_p) of a mean bias is at most half of t sd(Q) / sqrt(S) where
    n_p >= S (2 F sd(D) / sd(Q))^2; the standard deviations are those of means over the noise paths of a parameter
    sample, which are what is independent.

    Parameters
    ----------
    pilots : iterable of PilotDifferences
        By quantity and part; parameter samples without a finite path and quantities without spread are left out.

    Returns
    -------
    float
        The largest (2 F sd(D) / sd(Q))^2; 0 where there is nothing to judge by.
    """
    largest = 0.0
    for pilot in pilots:
        finite = np.isfinite(pilot.quantity) & np.isfinite(pilot.difference)
        held = finite.any(axis=1)
        if held.sum() < 2:
            continue
        with np.errstate(all="ignore"):  # pilots about to leave every bound are nothing to judge by
            spread, noise = (
                float(np.mean(values[held], axis=1, where=finite[held]).std(ddof=1))
                for values in (pilot.quantity, pilot.difference)
            )
        if spread > 0.0 and math.isfinite(spread) and math.isfinite(noise):
            largest = max(largest, (2.0 * pilot.factor * noise / spread) ** 2)
    return largest


def least_number(samples: int, wanted: float) -> int:
    """The least number of probes for so many parameter samples and a `demand`: at least 32."""
    return max(LEAST, math.ceil(samples * min(wanted, 1.0)))


def number_of_probes(
    samples: int, main_cost_per_sample: float, extra_cost_per_probe: float, at_least: int = LEAST
) -> int:
    """Number of probes n_p from counted operations, never from measured time.

    The largest multiple of 16, at most `samples`, whose extra levels cost at most a quarter of the main
    samples; at least `at_least` (rounded up to a multiple of 16) where there are as many samples, as far as the
    extra levels then cost no more than the main samples; but 32 whatever that costs.  Rough noise may ask for
    every sample to be a probe: ten times the work for intervals that are half as wide at best.

    Parameters
    ----------
    samples : number of parameter samples
    main_cost_per_sample : operations of one sample at the run's level, > 0
    extra_cost_per_probe : operations of one probe at all extra levels together, > 0
    at_least : what the recipe asks, see `least_number`

    Returns
    -------
    int
        1 <= n_p <= samples.
    """
    as_many = samples * main_cost_per_sample / extra_cost_per_probe

    def whole(number: float) -> int:
        """A multiple of the number of scramblings, so that each has its share."""
        return SCRAMBLINGS * int(min(number, samples) // SCRAMBLINGS)

    wanted = SCRAMBLINGS * -(-at_least // SCRAMBLINGS)
    wanted = max(whole(SHARE * as_many), min(wanted, whole(LARGEST_SHARE * as_many)))
    return min(samples, max(wanted, LEAST))


def share_of_probes(
    probes: int, samples: int, main_cost_per_sample: float, extra_cost_per_probe: float
) -> float:
    """Cost of the extra levels over that of the main samples; above 0.25 it is said."""
    return probes * extra_cost_per_probe / (samples * main_cost_per_sample)
