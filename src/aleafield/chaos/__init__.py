"""Polynomial chaos: surrogates of outputs as functions of the inputs, fitted to the runs of a study.

Everything takes plain arrays: points of the unit cube, values, laws.  Laws' polynomials and nodes come from
chaospy where it has them; fits and statistics are this folder's own and serve all outputs at once.
"""

from aleafield.chaos.acceptance import Verdict, judge
from aleafield.chaos.expansion import Expansion
from aleafield.chaos.germs import dependent_groups
from aleafield.chaos.indices import Shares, share_intervals
from aleafield.chaos.projection import nodes, project
from aleafield.chaos.search import search
from aleafield.chaos.surrogate import Surrogate, SurrogateStatistic

__all__ = [
    "Expansion",
    "Shares",
    "Surrogate",
    "SurrogateStatistic",
    "Verdict",
    "dependent_groups",
    "judge",
    "nodes",
    "project",
    "search",
    "share_intervals",
]
