"""Numbers of a model that may be certain, an expression of parameters, or a law; and how a batch binds them."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any, Self

import numpy as np

from aleafield.arrays import BoolArray, FloatArray
from aleafield.errors import InputError
from aleafield.formula import Formula, order_of
from aleafield.randomness.laws import Law
from aleafield.units import DIMENSIONLESS, Dimension

IMPROBABLE = 1e-12
"""Probability of an impossible value up to which a law is accepted."""

Parameter = float | Formula | Law
"""A number before binding."""
Bound = float | FloatArray
"""A number after binding: a float where it is certain, shape (S,) where it depends on the sample."""


@dataclass(frozen=True)
class Sign:
    """Which finite values a number may have.

    Attributes
    ----------
    word : what it must be, for messages
    fault : what a law gives that it must not
    zero, negative : whether such values are possible
    instead : laws that never give an impossible value
    """

    word: str
    fault: str
    zero: bool
    negative: bool
    instead: str = ""

    def impossible(self, values: FloatArray) -> BoolArray:
        """Which of the values (S,) cannot be, finite or not; shape (S,)."""
        wrong = ~np.isfinite(values)
        if not self.negative:
            wrong |= values < 0
        if not self.zero:
            wrong |= values == 0
        return np.asarray(wrong)

    def probability_of_impossible(self, law: Law) -> float:
        """Probability with which a law gives an impossible value."""
        if self.negative:
            return 0.0
        return law.probability_below(0.0) if self.zero else float(law.cdf(0.0))


ANY_SIGN = Sign("finite", "", zero=True, negative=True)
POSITIVE = Sign(
    "positive", "zero or negative", zero=False, negative=False,
    instead="use truncated_normal(mean, sd, low, high) with low > 0, or lognormal",
)  # fmt: skip
NOT_NEGATIVE = Sign(
    "zero or positive", "negative", zero=True, negative=False,
    instead="use truncated_normal(mean, sd, low, high) with low >= 0, or lognormal",
)  # fmt: skip


def number(
    dimension: Dimension,
    *,
    default: Any = dataclasses.MISSING,
    positive: bool = False,
    not_negative: bool = False,
) -> Any:
    """A dataclass field that holds a `Parameter` (or a tuple of them).

    Parameters
    ----------
    dimension : exponents of (activity, length, time)
    default : value where the study gives none
    positive : whether values at or below zero are impossible
    not_negative : whether values below zero are impossible
    """
    sign = POSITIVE if positive else NOT_NEGATIVE if not_negative else ANY_SIGN
    return field(default=default, metadata={"dimension": dimension, "sign": sign})


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


@dataclass(frozen=True)
class ImpossibleValue:
    """A value that cannot be: path of the number, position in the batch, what was found, what must be."""

    path: str
    position: int
    found: str
    needed: str


class Bindable:
    """A dataclass of model numbers: finds its laws, binds a batch, tells impossible values.

    Fields made with `number` hold a Parameter or a tuple of them; fields made with `beside` hold a mapping; a
    field that holds another Bindable (the term of a formula) is followed under the same path.
    """

    def _held(self) -> Iterator[Bindable]:
        """The objects in fields of this one, which have its path."""
        for spec in dataclasses.fields(self):  # type: ignore[arg-type]
            value = getattr(self, spec.name)
            if isinstance(value, Bindable):
                yield value

    def _numbers(self, prefix: str) -> Iterator[tuple[str, Any, Mapping[str, Any]]]:
        """(path, value, metadata) of the numbers of this object, not of the objects that it holds."""
        for spec in dataclasses.fields(self):  # type: ignore[arg-type]
            value = getattr(self, spec.name)
            path = f"{prefix}.{spec.name}" if prefix else spec.name
            if "dimension" in spec.metadata:
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
                        {"dimension": DIMENSIONLESS, "sign": ANY_SIGN, "beside": True},
                    )

    def uncertain(self, prefix: str) -> Iterator[Uncertain]:
        """The laws written in this object, with their paths."""
        for path, value, metadata in self._numbers(prefix):
            if isinstance(value, Law):
                yield Uncertain(path, value, metadata["dimension"])
        for held in self._held():
            yield from held.uncertain(prefix)

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
        """Refuse a law that gives a value that cannot be, by its sign, with probability above 1e-12.

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
            sign: Sign = metadata["sign"]
            if isinstance(value, Law):
                share = sign.probability_of_impossible(value)
                if share > IMPROBABLE:
                    raise InputError(
                        path,
                        f"{value.text} is {sign.fault} with probability {share:.3g}",
                        f"this number must be {sign.word}: {sign.instead}",
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
            if sign.impossible(np.array([value])).any():
                raise InputError(path, given, f"this number must be {sign.word}")
        for held in self._held():
            held.refuse_impossible_laws(prefix, certain)

    def impossible_samples(self, prefix: str) -> Iterator[ImpossibleValue]:
        """Of a bound object: the values of its samples that cannot be."""
        for path, value, metadata in self._numbers(prefix):
            if value is None or isinstance(value, Formula) or "beside" in metadata:
                continue  # what stands beside a formula may be of any sign
            values = np.atleast_1d(np.asarray(value, dtype=np.float64))
            sign: Sign = metadata["sign"]
            for position in np.flatnonzero(sign.impossible(values)):
                found = float(values[position])
                word = sign.word if np.isfinite(found) else "finite"
                yield ImpossibleValue(path, int(position), repr(found), f"this number must be {word}")
        for held in self._held():
            yield from held.impossible_samples(prefix)


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
