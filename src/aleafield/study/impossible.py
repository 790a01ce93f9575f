"""Values that cannot be: laws that give them, and samples at which an expression comes out at one."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

from aleafield.errors import InputError
from aleafield.field.parameter import Bindable
from aleafield.formula import Formula, order_of
from aleafield.randomness.laws import Law
from aleafield.study.positions import located
from aleafield.study.study import Study

if TYPE_CHECKING:
    from aleafield.randomness.design import Design
    from aleafield.randomness.families import Family


def _bindables(study: Study) -> Iterator[tuple[str, Bindable]]:
    yield from study.equation.bindables()
    for quantity in study.quantities:
        yield f"quantity.{quantity.name}", quantity


def certain_parameters(study: Study) -> dict[str, float]:
    """Values of the parameters that depend on no uncertain input, by name."""
    parameters = study.equation.parameters
    formulas = {name: value for name, value in parameters.items() if isinstance(value, Formula)}
    values = {n: float(v) for n, v in parameters.items() if not isinstance(v, Formula | Law)}
    for name in order_of(formulas, "parameters"):
        if formulas[name].names <= values.keys():
            values[name] = float(formulas[name].evaluate(values))
    return values


def refuse_impossible_laws(study: Study) -> None:
    """Refuse laws that give an impossible value with probability above 1e-12, and certain impossible values.

    Raises
    ------
    InputError
        Naming the number and, for a law, ``truncated_normal``; without file and line.
    """
    certain = certain_parameters(study)
    for path, bindable in _bindables(study):
        bindable.refuse_impossible_laws(path, certain)


def refuse_impossible_samples(
    study: Study, design: Design, count: int, block: int = 4096, family: Family = "main"
) -> None:
    """Draw the samples 0 .. count - 1 of a family and refuse them where a number of the model comes out impossible.

    What is not finite, and what has not the sign that it must have, is impossible.  Memory holds one block.

    Parameters
    ----------
    study : Study
    design : Design
    count : int
        Number of parameter samples.
    block : int
        Samples drawn at a time.
    family : Family
        Whose samples, numbered within it.

    Raises
    ------
    InputError
        Naming the number, the first such sample and its inputs, with file and line.
    """
    for start in range(0, count, block):
        indices = np.arange(start, min(start + block, count), dtype=np.int64)
        inputs = design.values_at(design.points(family, indices))
        binding = study.equation.binding(inputs)
        for path, bindable in _bindables(study):
            worst = min(
                bindable.bind(path, binding).impossible_samples(path), key=lambda w: w.position, default=None
            )
            if worst is None:
                continue
            drawn = ", ".join(f"{name} = {float(v[worst.position])!r}" for name, v in inputs.items())
            error = InputError(
                worst.path,
                f"{_words(family)} {int(indices[worst.position])} gives {worst.found} (inputs: {drawn or 'none'})",
                f"{worst.needed}: change the expression, or use truncated_normal for its inputs",
            )
            raise located(error, study.source.path, study.source.lines)


def _words(family: Family) -> str:
    """What the samples of a family are called."""
    return "sample" if family == "main" else f"{family} sample"
