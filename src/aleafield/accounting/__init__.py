"""The error split: discretisation error from paired levels, put together with the sampling error.

Input are the values of a sample and, on its probes (the first parameter samples), the values at
neighbouring levels.  Output are statements: a value, the parts of its error, an interval.
`docs/error_split.md` states the mathematics.
"""

from aleafield.accounting.expanded import Expanded
from aleafield.accounting.order import RELATIVE_ROUND_OFF, anticipated_factor
from aleafield.accounting.probes import (
    LARGEST_SHARE,
    SHARE,
    PilotDifferences,
    demand,
    least_number,
    number_of_probes,
    share_of_probes,
)
from aleafield.accounting.quantity import QuantityStatements, quantity_statements
from aleafield.accounting.records import MESH, LevelValues, Pair, PartDifferences
from aleafield.accounting.split import split_error
from aleafield.accounting.statement import Statement
from aleafield.accounting.statistic import MEAN, OCCURS, SD, Statistic, exceed, quantile
from aleafield.accounting.variance import Clusters, VarianceStatements

__all__ = [
    "LARGEST_SHARE",
    "MEAN",
    "MESH",
    "OCCURS",
    "RELATIVE_ROUND_OFF",
    "SD",
    "SHARE",
    "Clusters",
    "Expanded",
    "LevelValues",
    "Pair",
    "PartDifferences",
    "PilotDifferences",
    "QuantityStatements",
    "Statement",
    "Statistic",
    "VarianceStatements",
    "anticipated_factor",
    "demand",
    "exceed",
    "least_number",
    "number_of_probes",
    "quantile",
    "quantity_statements",
    "share_of_probes",
    "split_error",
]
