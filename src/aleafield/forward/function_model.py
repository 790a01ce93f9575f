"""A Python function of the inputs as a forward model: no field, no mesh, no step."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.ensemble.level import Level, PathPart
from aleafield.ensemble.records import FINITE, QUANTITY_NOT_FINITE, Records
from aleafield.errors import InputError
from aleafield.randomness.design import Design
from aleafield.randomness.families import Family
from aleafield.randomness.inputs import Input

InputsToQuantities = Callable[[Mapping[str, FloatArray]], Mapping[str, FloatArray]]
"""From inputs, path -> (S,), to quantities, name -> (S,)."""


class FunctionModel:
    """Quantities that a function gives, exact but for rounding.

    It has one level and no discretisation error, and its plan has no moment times, since there is no field.  A run
    in which a quantity is not finite has failed.

    Parameters
    ----------
    function : callable
        From inputs, path -> (S,), to quantities, name -> (S,).  Row by row; one that is defined in a module, where
        workers are to evaluate it.
    design : Design
        Index to inputs.

    Attributes
    ----------
    function, design
        As given.
    level : Level
        The only one.
    """

    def __init__(self, function: InputsToQuantities, design: Design) -> None:
        self.function = function
        self.design = design
        self.level = Level(1, 1)

    @property
    def inputs(self) -> Sequence[Input]:
        """The uncertain inputs, in the order of the sampling dimensions."""
        return self.design.inputs

    @property
    def repeats(self) -> int:
        """1: there is no noise."""
        return 1

    def path(self, level: Level) -> tuple[PathPart, ...]:
        """No part of a discretisation error."""
        return ()

    def operations(self, level: Level) -> float:
        """1: so few that no worker process is worth its start."""
        return 1.0

    def points(self, level: Level) -> FloatArray:
        """No point, shape (0,)."""
        return np.zeros(0)

    def evaluate(
        self, level: Level, realizations: IntArray, times: Sequence[float] = (), family: Family = "main"
    ) -> Records:
        """The function at the inputs of the realizations (see `ForwardModel.evaluate`).

        Raises
        ------
        InputError
            Where a quantity is not one number for each row.
        """
        inputs = self.design.values_at(self.design.points(family, realizations))
        with np.errstate(all="ignore"):
            values = {name: np.array(v, dtype=np.float64) for name, v in self.function(inputs).items()}
        failed = np.full(len(realizations), FINITE, dtype=np.int64)
        for name, column in values.items():
            if column.shape != failed.shape:
                raise InputError(
                    name,
                    f"the function gives shape {column.shape} for {len(failed)} rows",
                    f"one number for each row is needed, shape {failed.shape}",
                )
            failed[~np.isfinite(column)] = QUANTITY_NOT_FINITE
        for column in values.values():
            column[failed != FINITE] = np.nan
        return Records(
            realizations=np.array(realizations),
            inputs=inputs,
            values=values,
            failed=failed,
            failed_at=np.full(len(realizations), np.nan),
        )
