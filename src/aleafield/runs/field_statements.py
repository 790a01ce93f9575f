"""The entry "field" of the summary: variance and correlation length of a noisy field, at the stored times."""

from __future__ import annotations

import math

import numpy as np

from aleafield.accounting.statement import ERROR_KEYS, Statement, no_statement
from aleafield.archive.ensemble_reader import EnsembleReader
from aleafield.arrays import FloatArray, IntArray
from aleafield.estimates import Estimate
from aleafield.estimates.field_statistics import GROUPS, FieldSums
from aleafield.geometry import Domain, Interval
from aleafield.runs.plan_file import Plan
from aleafield.spaces import Space, make_space
from aleafield.spaces.space import agree
from aleafield.study.study import Study

MOST_TIMES = 16
"""Times at which a field is described, the last one among them."""
ROWS = 64
"""Realizations whose fields are in memory at a time."""
POINTS_PER_NODE = 4
"""Equally spaced points of a field whose nodes are not."""

SAMPLING_ONLY = (
    "the interval holds the sampling error alone: fields are stored at the run's level only; ask for `value` or "
    "`spectral power` to see what mesh, step and modes do"
)
ONE_OVER_E = (
    "the distance at which the correlation of the fluctuations falls to 1/e: the correlation_length of an "
    "exponential correlation, sqrt(2) times that of a gaussian one"
)


def field_entries(reader: EnsembleReader, study: Study, plan: Plan) -> list[dict[str, object]] | None:
    """Variance over realizations and correlation length at the kept times; None without noise.

    Only the sampling error is known, from at most the realizations whose fields are stored.
    """
    if plan.noise is None:
        return None
    times = _few(plan.kept_times or (study.equation.dynamics.duration,))
    reason = ""
    if not plan.kept_times:
        reason = 'no field is stored: leave out fields = "none", or give times, in [keep]'
    elif plan.noise.white:
        reason = "white noise has no variance at a point: it grows with the number of modes"
    if reason:
        nothing = no_statement(f"not determined: {reason}").as_json()
        return [{"time": time, "variance": nothing, "correlation_length": nothing} for time in times]
    sums = _sums(reader, study, plan, times)
    entries: list[dict[str, object]] = []
    for index, time in enumerate(times):
        found = sums.statistics(index, study.confidence)
        entries.append(
            {
                "time": time,
                "variance": _stated(found.variance, SAMPLING_ONLY).as_json(),
                "correlation_length": _stated(found.correlation_length, ONE_OVER_E, SAMPLING_ONLY).as_json(),
            }
        )
    return entries


def _few(times: tuple[float, ...]) -> tuple[float, ...]:
    """At most MOST_TIMES of the times, spread over them, the last one among them."""
    every = -(-len(times) // MOST_TIMES)
    return times[::-1][::every][::-1]


def _stated(estimate: Estimate, *notes: str) -> Statement:
    """A statement of which nothing but the sampling error is known: no total, and it says so."""
    if estimate.value is None or estimate.low is None or estimate.high is None:
        return no_statement(estimate.reason or "not determined")
    half = max(estimate.value - estimate.low, estimate.high - estimate.value)
    if not math.isfinite(half):
        return no_statement("its error is beyond the range of double precision")
    error = {**dict.fromkeys(ERROR_KEYS), "sampling": half}
    return Statement(estimate.value, error, (estimate.low, estimate.high), notes=notes)


def _groups(reader: EnsembleReader, plan: Plan) -> tuple[IntArray, int]:
    """Group of each realization whose field is stored, whole samples alone, and their number.

    Under quasi-Monte Carlo a group is a scrambling, and every one has as many points as the others.
    """
    samples = max(reader.kept // plan.repeats, 1)
    replicates = plan.allocation.replicates
    if replicates > 1:
        samples = max(samples // replicates, 1) * replicates
    count = min(samples * plan.repeats, reader.kept)
    if replicates > 1:
        return reader.numbers("replicate", 0, count).astype(np.int64), replicates
    cluster = np.arange(count, dtype=np.int64)
    if reader.inputs:
        cluster //= plan.repeats
    clusters = int(cluster[-1]) + 1
    groups = min(GROUPS, clusters)
    return cluster * groups // clusters, groups


def _sums(reader: EnsembleReader, study: Study, plan: Plan, times: tuple[float, ...]) -> FieldSums:
    domain = study.equation.domain
    grid = _EqualPoints(make_space(study.scheme.projector, domain, plan.level.nodes))
    group, groups = _groups(reader, plan)
    valid = reader.valid()[: len(group)]
    at = np.searchsorted(plan.kept_times, times)
    first = int(valid.argmax())
    sums = FieldSums(
        grid.at(_stored(reader, first, first + 1)[:, at])[0], groups, grid.spacing, domain.periodic
    )
    for start in range(0, len(group), ROWS):
        rows = slice(start, min(start + ROWS, len(group)))
        fields = _stored(reader, rows.start, rows.stop)[valid[rows]][:, at]
        sums.add(grid.at(fields), group[rows][valid[rows]])
    return sums


def _stored(reader: EnsembleReader, first: int, last: int) -> FloatArray:
    fields = reader.fields(first, last)
    assert fields is not None
    return fields


class _EqualPoints:
    """Stored fields at equally spaced points; the nodes themselves where they are equally spaced."""

    def __init__(self, space: Space) -> None:
        self._space = space
        nodes = np.sort(space.nodes)
        self._points = _equal_points(space.domain, float(nodes[0]), space.n)
        self._nodes_will_do = agree(self._points, nodes, space.domain.length)
        if not self._nodes_will_do:
            self._points = _equal_points(space.domain, float(nodes[0]), POINTS_PER_NODE * space.n + 1)
        self.spacing = float(self._points[1] - self._points[0])

    def at(self, fields: FloatArray) -> FloatArray:
        """From values (S, K, n) at the nodes in increasing order to values (S, K, P)."""
        if self._nodes_will_do:
            return fields
        rows = fields.reshape(-1, fields.shape[-1])
        nodal = np.empty_like(rows)
        nodal[:, self._space.display_order] = rows
        values = self._space.evaluate(self._space.coefficients(nodal), self._points)
        return values.reshape(*fields.shape[:2], -1)


def _equal_points(domain: Domain, first: float, n: int) -> FloatArray:
    """So many equally spaced points: around a ring from the first node on, or from end to end."""
    if isinstance(domain, Interval):
        return np.linspace(domain.low, domain.high, n, dtype=np.float64)
    return first + domain.length / n * np.arange(n, dtype=np.float64)
