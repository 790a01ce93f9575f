"""The mean with its t interval."""

from __future__ import annotations

from aleafield.estimates.estimate import Estimate, exact, nothing_given, undetermined
from aleafield.estimates.sample import Sample


def estimate_mean(sample: Sample, confidence: float) -> Estimate:
    """Mean of the quantity, given that it occurs, and Student's t interval (Student 1908).

    Plain Monte Carlo: t over the samples.  Blocks: the pooled ratio with the jackknife over blocks and t over
    them; for scramblings or clusters of equal length that is t over their means.  Normal quantiles and the percentile
    bootstrap are too short for few samples and are not used.
    Samples that are all equal give an interval of width zero.

    Parameters
    ----------
    sample : Sample
    confidence : float in (0, 1)

    Returns
    -------
    Estimate
        In the units of the quantity; not determined by fewer than two independent values.
    """
    values = sample.given
    if len(values) == 0:
        return nothing_given(sample.n_valid)
    if sample.certain:
        return exact(float(values[0]))
    mean = sample.mean_over(values, sample.given_block)
    half_width = mean.half_width(confidence)
    if half_width == float("inf"):
        return undetermined(sample.independent)
    return Estimate(mean.value, mean.value - half_width, mean.value + half_width)
