"""A neural field with uncertain inputs as a forward model."""

from __future__ import annotations

import sys
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.ensemble.level import Level, PathPart
from aleafield.ensemble.records import FIELD_NOT_FINITE, FINITE, QUANTITY_NOT_FINITE, Records
from aleafield.field.equation import FieldEquation
from aleafield.field.noise_modes import NoiseModes
from aleafield.field.switching import switch_times, switching
from aleafield.forward.noise import BatchNoise
from aleafield.forward.recorder import FieldRecorder
from aleafield.projection.discretisation import Discretisation
from aleafield.projection.pairing import Pairing, resolve
from aleafield.projection.path import split_path
from aleafield.projection.scheme import Scheme
from aleafield.projection.semidiscrete import SemiDiscreteField
from aleafield.quantities import FormulaQuantity, History, Observer, PeakPosition, Quantity
from aleafield.randomness.design import Design
from aleafield.randomness.families import Family
from aleafield.randomness.inputs import Input
from aleafield.randomness.wiener import path_bytes
from aleafield.spaces import Space, make_space
from aleafield.stepping import euler_maruyama, runge_kutta
from aleafield.stepping.schedule import Schedule

NOISE_BYTES = 1 << 27
"""Memory that the noise of a batch may take: 128 MiB, more only where 8 realizations need more."""
FINEST_HALVINGS = 1
"""Halvings of the finest level of the error split: bridges inside steps are the same at all its levels."""


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
    noise : NoiseModes, optional
        The modes that are kept; needed where the equation has noise.
    repeats : int
        Noise paths of each parameter sample.
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
        noise: NoiseModes | None = None,
        repeats: int = 1,
    ) -> None:
        references = peak_references or {}
        self.equation = equation
        self.scheme = scheme
        self.design = design
        self.time_step = time_step
        self.noise = noise
        self._repeats = repeats
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
    def repeats(self) -> int:
        """Noise paths of each parameter sample."""
        return self._repeats

    @property
    def level(self) -> Level:
        """The run's level."""
        modes = 0 if self.noise is None else self.noise.modes
        return Level(self.pairing.nodes, self.pairing.quadrature_points, modes=modes)

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
        """Floating-point operations of one realization: four evaluations a step, or one and the noise."""
        prepared = self._prepared(level)
        discretisation, steps = prepared.discretisation, len(prepared.schedule)
        if self.noise is None:
            return 4.0 * steps * discretisation.operations
        draws = 1 << (self._depth(level) - level.halvings - 1)
        return steps * (discretisation.operations + draws * discretisation.noise_operations)

    def path(self, level: Level) -> tuple[PathPart, ...]:
        """Space, quadrature, time and noise part of a level's error."""
        parts = split_path(self.pairing, level, self.noise)
        peaks = frozenset(q.name for q in self.quantities if q.is_peak_position(self.equation.domain))
        completed = []
        for part in parts:
            if part.name == "space":
                spaces = tuple(
                    make_space(self.scheme.projector, self.equation.domain, one.nodes)
                    for one in sorted(part.levels)
                )
                off = {q.name: 2.0 for q in self.quantities if q.off_the_nodes(spaces)}
                part = replace(part, least_factor=off, peaks=peaks)
            if self.noise is not None:
                part = replace(part, passages=frozenset(q.name for q in self.quantities if q.is_passage))
            if part.name == "time" and self.noise is not None:
                sides = {q.name: q.open_side for q in self.quantities if q.open_side is not None}
                occurrence = {
                    q.name: q.open_occurrence for q in self.quantities if q.open_occurrence is not None
                }
                part = replace(part, open_side=sides, open_occurrence=occurrence)
            completed.append(part)
        return tuple(completed)

    def evaluate(
        self, level: Level, realizations: IntArray, times: Sequence[float] = (), family: Family = "main"
    ) -> Records:
        """Quantities, and fields and histories at `times`, at a level (see `ForwardModel.evaluate`)."""
        if self.noise is not None and family != "main":
            raise ValueError(f"{family!r} given: under noise there is only the main family")
        most = self._largest_batch(level)
        if len(realizations) > most:
            pieces = (realizations[first : first + most] for first in range(0, len(realizations), most))
            return Records.joined([self._evaluate(level, piece, times, family) for piece in pieces])
        return self._evaluate(level, realizations, times, family)

    def _largest_batch(self, level: Level) -> int:
        """Realizations whose noise is in memory at a time, a multiple of 8; rows do not depend on one another."""
        if self.noise is None:
            return sys.maxsize
        return max(8, NOISE_BYTES // path_bytes(level.modes, self._depth(level)) // 8 * 8)

    def _depth(self, level: Level) -> int:
        """How often the noise paths of a level halve their base steps."""
        bridged = any(q.bridged for q in self.quantities)
        return 1 + (max(level.halvings, FINEST_HALVINGS) if bridged else level.halvings)

    def _evaluate(
        self, level: Level, realizations: IntArray, times: Sequence[float], family: Family
    ) -> Records:
        prepared = self._prepared(level)
        space = prepared.discretisation.space
        inputs = self.design.values_at(self.design.points(family, realizations // self._repeats))
        binding = self.equation.binding(inputs)
        system = prepared.discretisation.system(self.equation.bind(binding), len(realizations))
        quantities = [q.bind(f"quantity.{q.name}", binding) for q in self.quantities]
        recorder = FieldRecorder(space, times, len(realizations)) if len(times) else None
        recorders = [] if recorder is None else [recorder]
        with np.errstate(all="ignore"):
            if self.noise is None:
                observers = [q.observer(space, self.duration) for q in quantities]
                failed_at = runge_kutta.integrate(system, prepared.schedule, [*observers, *recorders])
                return self._records(realizations, inputs, observers, failed_at, recorder, {})
            noise = self._noise(system, level, realizations)
            observers = [q.observer(space, self.duration, noise) for q in quantities]
            histories = self._histories(quantities, space, times)
            failed_at = euler_maruyama.integrate(
                system,
                prepared.schedule,
                noise.paths,
                [*observers, *recorders, *histories.values()],
                steps_per_base=noise.steps_per_base,
            )
            return self._records(realizations, inputs, observers, failed_at, recorder, histories)

    def _noise(self, system: SemiDiscreteField, level: Level, realizations: IntArray) -> BatchNoise:
        assert system.forcing is not None
        return BatchNoise(
            system.forcing,
            self.design.seed,
            realizations // self._repeats,
            realizations % self._repeats,
            level.modes,
            self.schedule(),
            level.halvings,
            self._depth(level),
        )

    @staticmethod
    def _histories(
        quantities: Sequence[Quantity], space: Space, times: Sequence[float]
    ) -> dict[str, History]:
        if not len(times):
            return {}
        found = {q.name: q.history(space, times) for q in quantities}
        return {name: history for name, history in found.items() if history is not None}

    def _records(
        self,
        realizations: IntArray,
        inputs: dict[str, FloatArray],
        observers: Sequence[Observer],
        failed_at: FloatArray,
        recorder: FieldRecorder | None,
        histories: Mapping[str, History],
    ) -> Records:
        failed = np.where(np.isfinite(failed_at), FIELD_NOT_FINITE, FINITE).astype(np.int64)
        values: dict[str, FloatArray] = {}
        margins: dict[str, FloatArray] = {}
        for quantity, observer in zip(self.quantities, observers, strict=True):
            value, margin = observer.result()
            value = np.broadcast_to(value, realizations.shape).astype(np.float64)
            occurs = np.ones(len(realizations), dtype=bool)
            if margin is not None:
                margins[quantity.name] = np.array(margin)
                occurs = ~(margin < 0)
            wrong = occurs & ~np.isfinite(value) & (failed == FINITE)
            failed[wrong] = QUANTITY_NOT_FINITE
            values[quantity.name] = np.where(occurs, value, np.nan)
        followed = {name: finite_or_nan(history.values) for name, history in histories.items()}
        for array in (*values.values(), *margins.values(), *followed.values()):
            array[failed != FINITE] = np.nan
        return Records(
            realizations=np.array(realizations),
            inputs={path: np.array(column) for path, column in inputs.items()},
            values=values,
            margins=margins,
            failed=failed,
            failed_at=failed_at,
            fields=None if recorder is None else recorder.fields,
            histories=followed,
        )

    def _prepared(self, level: Level) -> _Prepared:
        if level not in self._levels:
            self._levels[level] = _Prepared(
                Discretisation(self.equation, level, self.pairing, self.noise),
                self.schedule(level.halvings),
            )
        return self._levels[level]


def finite_or_nan(values: FloatArray) -> FloatArray:
    """A copy with NaN in place of what is infinite: there is no value to draw or to order."""
    return np.where(np.isfinite(values), values, np.nan)
