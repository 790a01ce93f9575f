"""A neural field with uncertain inputs as a forward model."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.ensemble.level import Level, PathPart
from aleafield.ensemble.records import FIELD_NOT_FINITE, FINITE, QUANTITY_NOT_FINITE, Records
from aleafield.field.equation import FieldEquation
from aleafield.field.switching import switch_times, switching
from aleafield.forward.recorder import FieldRecorder
from aleafield.projection.discretisation import Discretisation
from aleafield.projection.pairing import Pairing, resolve
from aleafield.projection.path import split_path
from aleafield.projection.scheme import Scheme
from aleafield.quantities import FormulaQuantity, PeakPosition, Quantity
from aleafield.randomness.design import Design
from aleafield.randomness.inputs import Input
from aleafield.spaces import make_space
from aleafield.stepping.runge_kutta import integrate
from aleafield.stepping.schedule import Schedule


@dataclass(frozen=True)
class _Prepared:
    """What a level needs and no sample changes."""

    discretisation: Discretisation
    schedule: Schedule


class FieldModel:
    """The whole lower half behind one call.

    Parameters
    ----------
    equation : FieldEquation
        Unbound.
    scheme : Scheme
    quantities : sequence of Quantity
        Unbound.
    design : Design
        Sample index to inputs.
    inputs : sequence of Input
    time_step : float
        Largest step of the run's schedule, units of time.
    peak_references : mapping, optional
        On a ring, by quantity: the position about which peak positions are unwrapped.
    """

    def __init__(
        self,
        equation: FieldEquation,
        scheme: Scheme,
        quantities: Sequence[Quantity],
        design: Design,
        inputs: Sequence[Input],
        time_step: float,
        peak_references: Mapping[str, float] | None = None,
    ) -> None:
        references = peak_references or {}
        self.equation = equation
        self.scheme = scheme
        self.design = design
        self.time_step = time_step
        self.quantities = tuple(
            replace(q, reference=references[q.name])
            if isinstance(q, PeakPosition) and q.name in references
            else q
            for q in quantities
        )
        self._inputs = tuple(inputs)
        self.switching = switching(equation)
        self.pairing: Pairing = resolve(scheme, equation)
        self._levels: dict[Level, _Prepared] = {}

    def __getstate__(self) -> dict[str, Any]:
        """Workers prepare their levels themselves."""
        return {**self.__dict__, "_levels": {}}

    @property
    def inputs(self) -> Sequence[Input]:
        """The uncertain inputs, in the order of the sampling dimensions."""
        return self._inputs

    @property
    def level(self) -> Level:
        """The run's level."""
        return Level(self.pairing.nodes, self.pairing.quadrature_points)

    @property
    def duration(self) -> float:
        """Model time of a run, units of time."""
        return self.equation.dynamics.duration

    @property
    def schedule_times(self) -> tuple[float, ...]:
        """Times that every schedule holds: those of the quantities, and of certain switches of the drive and of
        quantities given by a formula."""
        times = {t for q in self.quantities for t in q.times(self.duration)}
        switches = set(self.switching.times)
        for quantity in self.quantities:
            if isinstance(quantity, FormulaQuantity):
                switches.update(switch_times(quantity.term, self.equation.parameters).times)
        times.update(t for t in switches if 0 < t < self.duration)
        return tuple(sorted(times))

    def schedule(self, halvings: int = 0) -> Schedule:
        """The steps of a level."""
        return Schedule.through(self.schedule_times, self.time_step, self.duration).refined(halvings)

    def discretisation(self, level: Level) -> Discretisation:
        """Space, rule, projection and operator of a level."""
        return self._prepared(level).discretisation

    def points(self, level: Level) -> FloatArray:
        """Nodes in increasing x, shape (n,)."""
        space = self.discretisation(level).space
        return np.asarray(space.nodes[space.display_order])

    def operations(self, level: Level) -> float:
        """Floating-point operations of one sample: four evaluations a step."""
        prepared = self._prepared(level)
        return 4.0 * len(prepared.schedule) * prepared.discretisation.operations

    def path(self, level: Level) -> tuple[PathPart, ...]:
        """Space, quadrature and time part of a level's error."""
        parts = split_path(self.pairing, level)
        peaks = frozenset(q.name for q in self.quantities if q.is_peak_position)
        completed = []
        for part in parts:
            if part.name == "space":
                spaces = tuple(
                    make_space(self.scheme.projector, self.equation.domain, one.nodes)
                    for one in sorted(part.levels)
                )
                off = {q.name: 2.0 for q in self.quantities if q.off_the_nodes(spaces)}
                part = replace(part, least_factor=off, peaks=peaks)
            completed.append(part)
        return tuple(completed)

    def evaluate(self, level: Level, samples: IntArray, times: Sequence[float] = ()) -> Records:
        """Quantities, and fields at `times`, of the samples at a level (see `ForwardModel.evaluate`)."""
        prepared = self._prepared(level)
        space = prepared.discretisation.space
        inputs = self.design.values(samples)
        binding = self.equation.binding(inputs)
        system = prepared.discretisation.system(self.equation.bind(binding), len(samples))
        observers = [
            q.bind(f"quantity.{q.name}", binding).observer(space, self.duration) for q in self.quantities
        ]
        recorder = FieldRecorder(space, times, len(samples)) if len(times) else None
        with np.errstate(all="ignore"):
            failed_at = integrate(
                system, prepared.schedule, observers if recorder is None else [*observers, recorder]
            )
            return self._records(samples, inputs, observers, failed_at, recorder)

    def _records(
        self,
        samples: IntArray,
        inputs: dict[str, FloatArray],
        observers: Sequence[Any],
        failed_at: FloatArray,
        recorder: FieldRecorder | None,
    ) -> Records:
        failed = np.where(np.isfinite(failed_at), FIELD_NOT_FINITE, FINITE).astype(np.int64)
        values: dict[str, FloatArray] = {}
        margins: dict[str, FloatArray] = {}
        for quantity, observer in zip(self.quantities, observers, strict=True):
            value, margin = observer.result()
            value = np.broadcast_to(value, samples.shape).astype(np.float64)
            occurs = np.ones(len(samples), dtype=bool)
            if margin is not None:
                margins[quantity.name] = np.array(margin)
                occurs = ~(margin < 0)
            wrong = occurs & ~np.isfinite(value) & (failed == FINITE)
            failed[wrong] = QUANTITY_NOT_FINITE
            values[quantity.name] = np.where(occurs, value, np.nan)
        for array in (*values.values(), *margins.values()):
            array[failed != FINITE] = np.nan
        return Records(
            samples=np.array(samples),
            inputs={path: np.array(column) for path, column in inputs.items()},
            values=values,
            margins=margins,
            failed=failed,
            failed_at=failed_at,
            fields=None if recorder is None else recorder.fields,
        )

    def _prepared(self, level: Level) -> _Prepared:
        if level not in self._levels:
            self._levels[level] = _Prepared(
                Discretisation(self.equation, level, self.pairing), self.schedule(level.halvings)
            )
        return self._levels[level]
