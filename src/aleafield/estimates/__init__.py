"""Statistics of a sample, each with its sampling interval.

Everything here takes plain arrays and knows nothing of fields, meshes or steps.  The intervals are those of
the sampling error alone; what the discretisation adds is in `aleafield.accounting`.
"""

from aleafield.estimates.estimate import Estimate
from aleafield.estimates.mean import estimate_mean
from aleafield.estimates.probability import estimate_exceedance, estimate_occurrence
from aleafield.estimates.quantile import estimate_quantile
from aleafield.estimates.sample import Sample
from aleafield.estimates.sd import estimate_sd
from aleafield.estimates.variance_parts import VarianceParts, estimate_variance_parts

__all__ = [
    "Estimate",
    "Sample",
    "VarianceParts",
    "estimate_exceedance",
    "estimate_mean",
    "estimate_occurrence",
    "estimate_quantile",
    "estimate_sd",
    "estimate_variance_parts",
]
