"""All statements of one quantity."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from aleafield.accounting.expanded import FROM_SAMPLES, Expanded, expanded_statement
from aleafield.accounting.measured import MeasuredPart
from aleafield.accounting.records import PartDifferences
from aleafield.accounting.split import combine
from aleafield.accounting.statement import Statement
from aleafield.accounting.statistic import MEAN, OCCURS, SD, Statistic, exceed, quantile
from aleafield.accounting.variance import Clusters, VarianceStatements, variance_statements
from aleafield.estimates import Sample


@dataclass(frozen=True)
class QuantityStatements:
    """The statistics of one quantity.

    Attributes
    ----------
    mean, sd : Statement
        Given that the quantity occurs.
    quantiles : mapping of probability to Statement
        Given that it occurs.
    exceed : mapping of level to Statement
        Probability that it occurs and lies above the level.
    occurs : Statement or None
        Probability that it occurs; None for a quantity that always does.
    variance : VarianceStatements or None
        Its variance parted into parameters and noise; None without noise.
    """

    mean: Statement
    sd: Statement
    quantiles: Mapping[float, Statement]
    exceed: Mapping[float, Statement]
    occurs: Statement | None
    variance: VarianceStatements | None = None

    def as_json(self, units: str) -> dict[str, object]:
        """The quantity in the shape of summary.json; keys of quantiles and exceed as Python prints them."""
        return {
            "units": units,
            "mean": self.mean.as_json(),
            "sd": self.sd.as_json(),
            "quantiles": {repr(float(p)): statement.as_json() for p, statement in self.quantiles.items()},
            "exceed": {repr(float(c)): statement.as_json() for c, statement in self.exceed.items()},
            "occurs": None if self.occurs is None else self.occurs.as_json(),
            "sensitivity": {},
            "variance": None if self.variance is None else self.variance.as_json(),
        }


def quantity_statements(
    sample: Sample,
    parts: Sequence[PartDifferences],
    quantiles: Sequence[float],
    exceed_levels: Sequence[float],
    confidence: float,
    clusters: Clusters | None = None,
    expanded: Expanded | None = None,
) -> QuantityStatements:
    """All statements of one quantity; the parts are measured once.

    Parameters
    ----------
    sample : Sample
    parts : sequence of PartDifferences
    quantiles : probabilities in (0, 1)
    exceed_levels : levels in the units of the quantity
    confidence : float in (0, 1)
    clusters : Clusters or None
        Which realizations share their parameter sample; None without noise.
    expanded : Expanded or None
        The surrogate that gives mean, sd and, where it is accurate enough, quantiles and probabilities.

    Raises
    ------
    InputError
        When a quantile's probability is not between 0 and 1.
    """
    measured = [MeasuredPart(sample, part) for part in parts]

    def stated(statistic: Statistic) -> Statement:
        if expanded is None:
            return combine(sample, measured, statistic, confidence)
        if statistic.has_influence or expanded.for_quantiles:
            return expanded_statement(expanded, sample, measured, statistic, confidence)
        found = combine(sample, measured, statistic, confidence)
        return replace(found, notes=(FROM_SAMPLES, *found.notes))

    return QuantityStatements(
        mean=stated(MEAN),
        sd=stated(SD),
        quantiles={p: stated(quantile(p)) for p in quantiles},
        exceed={c: stated(exceed(c)) for c in exceed_levels},
        occurs=None if sample.margin is None else combine(sample, measured, OCCURS, confidence),
        variance=None if clusters is None else variance_statements(sample, measured, clusters, confidence),
    )
