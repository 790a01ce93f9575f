"""Numbers of a model that may be certain, an expression of parameters, or a law; and how a batch binds them."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any, Self

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.errors import InputError
from aleafield.formula import Formula, order_of
from aleafield.randomness.laws import Law
from aleafield.units import DIMENSIONLESS, Dimension

Parameter = float | Formula | Law
"""A number before binding."""
Bound = float | FloatArray
"""A number after binding: a float where it is certain, shape (S,) where it depends on the sample."""


def number(dimension: Dimension, *, default: Any = dataclasses.MISSING, positive: bool = False) -> Any:
    """A dataclass field that holds a `Parameter` (or a tuple of them).

    Parameters
    ----------
    dimension : exponents of (activity, length, time)
    default : value where the study gives none
    positive : whether values at or below zero are impossible
    """
    return field(default=default, metadata={"dimension": dimension, "positive": positive})


def beside() -> Any:
    """A dataclass field with the names that stand beside a formula: name -> Parameter or formula of its variables."""
    return field(default_factory=dict, metadata={"beside": True})


@dataclass(frozen=True)
class Binding:
    """The values of one batch: inputs by path, each (S,), and the study's parameters by name."""

    inputs: Mapping[str, FloatArray]
    parameters: Mapping[str, Bound]

    def resolve(self, path: str, value: Parameter) -> Bound:
        """The bound value of the number at `path`."""
        if isinstance(value, Law):
            return self.inputs[path]
        if isinstance(value, Formula):
            return as_bound(value.evaluate(self.parameters))
        return float(value)


def as_bound(value: float | FloatArray) -> Bound:
    """A float for zero-dimensional results, otherwise the array."""
    array = np.asarray(value, dtype=np.float64)
    return float(array) if array.ndim == 0 else array


def bind_parameters(parameters: Mapping[str, Parameter], inputs: Mapping[str, FloatArray]) -> Binding:
    """Evaluate the study's parameters, which may use one another in any order, for a batch of inputs.

    Raises
    ------
    InputError
        Where parameters use one another in a cycle.
    """
    formulas = {name: value for name, value in parameters.items() if isinstance(value, Formula)}
    bound: dict[str, Bound] = {}
    for name, value in parameters.items():
        if isinstance(value, Law):
            bound[name] = inputs[name]
        elif not isinstance(value, Formula):
            bound[name] = float(value)
    for name in order_of(formulas, "parameters"):
        bound[name] = as_bound(formulas[name].evaluate(bound))
    return Binding(inputs, bound)


@dataclass(frozen=True)
class Uncertain:
    """A law found in a model: its path, the law, the dimension of the number."""

    path: str
    law: Law
    dimension: Dimension


class Bindable:
    """A dataclass of model numbers: finds its laws, binds a batch, tells impossible values.

    Fields made with `number` hold a Parameter or a tuple of them; fields made with `beside` hold a mapping; a
    field that holds another Bindable (the term of a formula) is followed under the same path.
    """

    def _numbers(self, prefix: str) -> Iterator[tuple[str, Any, Mapping[str, Any]]]:
        for spec in dataclasses.fields(self):  # type: ignore[arg-type]
            value = getattr(self, spec.name)
            path = f"{prefix}.{spec.name}" if prefix else spec.name
            if isinstance(value, Bindable):
                yield from value._numbers(prefix)
            elif "dimension" in spec.metadata:
                if isinstance(value, tuple):
                    for index, entry in enumerate(value):
                        yield f"{path}.{index}", entry, spec.metadata
                else:
                    yield path, value, spec.metadata
            elif "beside" in spec.metadata:
                for name, entry in value.items():
                    yield (
                        f"{prefix}.{name}",
                        entry,
                        {"dimension": DIMENSIONLESS, "positive": False, "beside": True},
                    )

    def uncertain(self, prefix: str) -> Iterator[Uncertain]:
        """The laws written in this object, with their paths."""
        for path, value, metadata in self._numbers(prefix):
            if isinstance(value, Law):
                yield Uncertain(path, value, metadata["dimension"])

    def bind(self, prefix: str, binding: Binding) -> Self:
        """The same object with floats and (S,) arrays in place of expressions and laws."""
        changes: dict[str, Any] = {}
        for spec in dataclasses.fields(self):  # type: ignore[arg-type]
            value = getattr(self, spec.name)
            path = f"{prefix}.{spec.name}" if prefix else spec.name
            if isinstance(value, Bindable):
                changes[spec.name] = value.bind(prefix, binding)
            elif "dimension" in spec.metadata and value is not None:
                if isinstance(value, tuple):
                    changes[spec.name] = tuple(
                        binding.resolve(f"{path}.{index}", entry) for index, entry in enumerate(value)
                    )
                else:
                    changes[spec.name] = binding.resolve(path, value)
            elif "beside" in spec.metadata:
                changes[spec.name] = self._bind_names(prefix, value, binding)
        return dataclasses.replace(self, **changes)  # type: ignore[type-var]

    @staticmethod
    def _bind_names(prefix: str, names: Mapping[str, Any], binding: Binding) -> dict[str, Any]:
        """Laws become arrays, formulas stay (they may use the variables); hidden parameters are left out."""
        bound: dict[str, Any] = {k: v for k, v in binding.parameters.items() if k not in names}
        for name, value in names.items():
            bound[name] = value if isinstance(value, Formula) else binding.resolve(f"{prefix}.{name}", value)
        return bound

    def refuse_impossible_laws(self, prefix: str, certain: Mapping[str, float]) -> None:
        """Refuse a law that gives a value at or below zero, where none can be, with probability above 1e-12.

        Parameters
        ----------
        prefix : path of this object
        certain : values of the parameters that depend on no input, so that expressions of them are looked at too

        Raises
        ------
        InputError
            Naming the number and ``truncated_normal``; also for certain values that are impossible.
        """
        for path, value, metadata in self._numbers(prefix):
            if value is None or metadata.get("beside"):
                continue
            if isinstance(value, Law):
                share = float(value.cdf(0.0)) if metadata["positive"] else 0.0
                if share > 1e-12:
                    raise InputError(
                        path,
                        f"{value.text} is zero or negative with probability {share:.3g}",
                        "this number must be positive: use truncated_normal(mean, sd, low, high) with low > 0, "
                        "or lognormal",
                    )
                continue
            given = f"{value!r} given"
            if isinstance(value, Formula):
                if not value.names <= certain.keys():
                    continue
                text, value = value.text, float(value.evaluate(certain))
                given = f"{text} is {value!r}"
            if not np.isfinite(value):
                raise InputError(path, given, "this number must be finite")
            if metadata["positive"] and not value > 0:
                raise InputError(path, given, "this number must be positive")

    def impossible_samples(self, prefix: str) -> Iterator[tuple[str, int, float]]:
        """Of a bound object: (path, position in the batch, value) of values that cannot be."""
        for path, value, metadata in self._numbers(prefix):
            if value is None or isinstance(value, Formula) or "beside" in metadata:
                continue  # what stands beside a formula may be of any sign
            values = np.atleast_1d(np.asarray(value, dtype=np.float64))
            wrong = ~np.isfinite(values) | ((values <= 0) if metadata["positive"] else False)
            for position in np.flatnonzero(wrong):
                yield path, int(position), float(values[position])


def bound(value: Parameter | FloatArray) -> Bound:
    """A number of an object that was bound, known to be a float or an (S,) array.

    Raises
    ------
    TypeError
        When the object was not bound: an expression or a law still stands there.
    """
    if isinstance(value, Formula | Law):
        raise TypeError(f"{value.text} is not bound to a batch")
    return value


def per_sample(value: Parameter | FloatArray, extra_axes: int) -> Bound:
    """A bound number shaped so that it broadcasts against (S, ...) arrays with `extra_axes` further axes."""
    number_or_array = bound(value)
    if isinstance(number_or_array, np.ndarray):
        return number_or_array.reshape(number_or_array.shape + (1,) * extra_axes)
    return number_or_array


def is_certain(*values: Parameter | FloatArray) -> bool:
    """Whether none of the bound numbers depends on the sample."""
    return not any(isinstance(bound(value), np.ndarray) for value in values)
