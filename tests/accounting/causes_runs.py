"""Runs of known functions as `accounting.causes` reads them."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from aleafield.accounting.causes import CausesData, CausesRequest
from aleafield.accounting.statement import Statement
from aleafield.arrays import FloatArray
from aleafield.randomness.law import Law
from aleafield.randomness.laws import Uniform
from aleafield.randomness.points import PlainPoints, SobolPoints
from aleafield.sensitivity.exchange import Exchange

Function = Callable[[FloatArray], FloatArray]


def runs(
    function: Function,
    d: int,
    samples: int,
    *,
    laws: Sequence[Law] | None = None,
    held: int = 64,
    rows: int = 0,
    seed: int = 1,
    parts: Sequence[tuple[str, float, Function, int]] = (),
    **more: object,
) -> CausesData:
    """A sample of 16 scramblings with held-out points, rows of an exchange, and parts (name, F, finer, probes)."""
    unit = SobolPoints(2 * d, seed).at(np.arange(samples))
    u = unit[:, :d]
    y = function(u)
    held_u = PlainPoints(d, seed, "held out").at(np.arange(held))
    row_values = None
    if rows:
        points = Exchange(d).points(unit[:rows])
        row_values = function(points.reshape(-1, d)).reshape(rows, -1)
    return CausesData(
        paths=[f"x{i + 1}" for i in range(d)],
        laws=[Uniform(0.0, 1.0)] * d if laws is None else laws,
        u=u,
        block=np.arange(samples) % 16,
        n_blocks=16,
        y=y,
        held_u=held_u if held else None,
        held_y=function(held_u) if held else None,
        unit=unit[:rows] if rows else None,
        row_values=row_values,
        parts=[(name, factor, y[:n], finer(u[:n])) for name, factor, finer, n in parts],
        **{"correlation": None, **more},  # type: ignore[arg-type]
    )


def request(
    *indices: str, wanted_sd: float | None = None, fix_below: float | None = None, confidence: float = 0.95
) -> CausesRequest:
    """What is asked."""
    return CausesRequest(indices, wanted_sd, fix_below, confidence)


def holds(statement: Statement | None, truth: float) -> bool:
    """Whether a stated interval holds the truth."""
    assert statement is not None
    assert statement.interval is not None, statement.reason
    low, high = statement.interval
    assert low is not None
    assert high is not None
    return low <= truth <= high
