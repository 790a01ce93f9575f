"""Which inputs cause what: from the columns of an ensemble to the questions of [sensitivity], and to surrogates."""

from __future__ import annotations

from dataclasses import replace
from functools import cached_property
from typing import Any

import numpy as np
from threadpoolctl import threadpool_limits

from aleafield.accounting import Expanded, VarianceStatements
from aleafield.accounting.causes import (
    CausesData,
    CausesRequest,
    Fitted,
    causes,
    needs_exchange,
    surrogate_of,
)
from aleafield.accounting.index_changes import LevelPair
from aleafield.accounting.index_statements import complement
from aleafield.accounting.measured import MeasuredPart
from aleafield.accounting.records import MESH
from aleafield.archive.ensemble_reader import EnsembleReader
from aleafield.archive.names import netcdf_name
from aleafield.arrays import FloatArray
from aleafield.chaos import Surrogate
from aleafield.randomness.copula import Copula
from aleafield.randomness.families import Family, exchange_runs
from aleafield.randomness.points import SCRAMBLINGS
from aleafield.runs.model import design_of
from aleafield.runs.plan_file import Plan
from aleafield.runs.stages import asks_for_totals
from aleafield.runs.statements import QuantityColumns
from aleafield.sensitivity.ratios import MOST_MISSING
from aleafield.study.study import Study

WHOLE_ROWS = "columns of a file are drawn together, and no independent scores stand behind them one by one"


class Inquiry:
    """The inputs of all runs of an ensemble, and what single quantities say of them.

    Parameters
    ----------
    reader : EnsembleReader
        Of an ensemble that holds all runs of the plan.
    study : Study
        With uncertain inputs.
    plan : Plan
    """

    def __init__(self, reader: EnsembleReader, study: Study, plan: Plan) -> None:
        self._reader, self._study, self._plan = reader, study, plan
        self._design = design_of(study, plan.allocation)
        self._laws = tuple(entry.law for entry in study.inputs)
        self._paths = tuple(entry.path for entry in study.inputs)

    def fitted(self, columns: QuantityColumns) -> Fitted | None:
        """The surrogate of a quantity with its verdict; None where none can be."""
        with threadpool_limits(1):  # so that what is decided on it hangs on nothing but the values
            return surrogate_of(self._data(columns))

    def needs_exchange(self, columns: QuantityColumns) -> bool:
        """Whether what is asked of a quantity needs runs with inputs exchanged, and these can give it.

        Where too many samples have no value, exchanged runs would not either.
        """
        data = self._data(columns)
        if not asks_for_totals(self._study) or np.isnan(data.y).mean() > MOST_MISSING:
            return False
        return needs_exchange(self.fitted(columns), self._request(columns.name), data)

    def expanded(self, columns: QuantityColumns, fitted: Fitted | None) -> tuple[Expanded | None, str]:
        """What the statements of a quantity are taken from where polynomial chaos was asked; else why not.

        Only a surrogate of runs that all gave a value: where some gave none it would be continued into inputs for
        which the quantity has no value.
        """
        sample = columns.sample
        if fitted is None:
            return None, "too few runs gave a value"
        if not fitted.verdict.accepted:
            return None, fitted.verdict.reason
        held = self._values(columns.name, "held out")
        assert held is not None
        missing = int((~sample.occurs).sum() + np.isnan(held).sum())
        if missing:
            return None, f"{missing} of {len(sample.values) + len(held)} runs gave no value"
        surrogate = Surrogate(fitted.expansion, 0, self._held_points, held, self._study.seed)
        return Expanded(surrogate, fitted.verdict.accepted_for_quantiles), ""

    def entries(
        self, columns: QuantityColumns, fitted: Fitted | None, variance: VarianceStatements | None
    ) -> dict[str, Any]:
        """The members of the summary that [sensitivity] asks of a quantity, whose variance is parted under noise."""
        share = None if variance is None or variance.share is None else complement(variance.share)
        data = replace(self._data(columns), parts=self._parts(columns), noise_share=share)
        if fitted is not None and self._study.dependence.sampled_together:
            fitted = replace(fitted, verdict=replace(fitted.verdict, accepted=False, reason=WHOLE_ROWS))
        with threadpool_limits(1):
            return causes(data, fitted, self._request(columns.name)).as_json()

    def _request(self, name: str) -> CausesRequest:
        asked = self._study.sensitivity
        assert asked is not None
        return CausesRequest(
            indices=tuple(asked.indices),
            wanted_sd=asked.wanted_sd.get(name),
            fix_below=asked.fix_below,
            confidence=self._study.confidence,
        )

    def _data(self, columns: QuantityColumns) -> CausesData:
        held, exchanged = self._values(columns.name, "held out"), self._values(columns.name, "exchange")
        rows = None
        if exchanged is not None:
            by_row = exchanged.reshape(-1, exchange_runs(len(self._paths)))
            rows = np.column_stack((self._given(columns)[: len(by_row)], by_row))
        return CausesData(
            paths=self._paths,
            laws=self._laws,
            correlation=self._correlation,
            u=self._points,
            block=np.arange(self._plan.samples) % SCRAMBLINGS,
            n_blocks=SCRAMBLINGS,
            y=self._given(columns),
            held_u=None if held is None else self._held_points,
            held_y=held,
            unit=None if rows is None else self._design.unit_points(np.arange(len(rows))),
            row_values=rows,
            parts=(),
            noisy=self._plan.noise is not None,
            repeats=self._plan.repeats,
        )

    def _given(self, columns: QuantityColumns) -> FloatArray:
        """Means over the noise paths of each parameter sample, (S,); NaN where one of them has no value."""
        return self._over_paths(np.where(columns.sample.occurs, columns.sample.values, np.nan))

    def _over_paths(self, values: FloatArray) -> FloatArray:
        means: FloatArray = values.reshape(-1, self._plan.repeats).mean(axis=1)
        return means

    def _parts(self, columns: QuantityColumns) -> tuple[LevelPair, ...]:
        """By discretisation part: its factor, and the quantity on the probes at the run's level and a finer one.

        A pair of levels need not hold the run's: its difference is then taken off the values of the run.
        """
        found = []
        for part in columns.parts:
            measured = MeasuredPart(columns.sample, part)
            if part.name == MESH or not measured.usable.any():
                continue
            difference = self._over_paths(part.fine.coarser.values - part.fine.finer.values)
            run = self._given(columns)[: len(difference)]
            found.append(LevelPair(part.name, measured.conditional_order.factor, run, run - difference))
        return tuple(found)

    def _values(self, name: str, family: Family) -> FloatArray | None:
        if family not in self._reader.families:
            return None
        return self._reader.values(name, netcdf_name(family))

    @cached_property
    def _points(self) -> FloatArray:
        return self._design.points("main", np.arange(self._plan.samples))

    @cached_property
    def _held_points(self) -> FloatArray:
        return self._design.points("held out", np.arange(self._reader.families["held out"]))

    @cached_property
    def _correlation(self) -> FloatArray | None:
        """Of the normal scores behind the inputs; None where these are independent."""
        dependence = self._study.dependence
        if dependence.independent:
            return None
        return Copula(self._paths, dependence.rank_correlation).latent
