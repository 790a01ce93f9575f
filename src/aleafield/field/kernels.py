"""Connectivity kernels w(x, y) and their sum.

A kernel of a distance carries its integral over the unbounded line as `strength`.  On a ring it is periodised:
the sum over all images, so that its Fourier symbol is exact.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray, IntArray
from aleafield.field.formula_term import FormulaTerm
from aleafield.field.parameter import (
    Bindable,
    Binding,
    Bound,
    Parameter,
    Uncertain,
    bound,
    is_certain,
    number,
    per_sample,
)
from aleafield.geometry import Domain
from aleafield.units import ACTIVITY, ACTIVITY_PER_LENGTH, LENGTH


class Kernel(Bindable, ABC):
    """One named part of the connectivity.

    To add a kernel: a frozen dataclass with `number` fields, the four members below, an entry in the study
    reader's table of forms, and a row in the convergence table of the tests.
    """

    @property
    @abstractmethod
    def certain(self) -> bool:
        """Of a bound kernel: whether it is the same for all samples."""

    @property
    @abstractmethod
    def shift_invariant(self) -> bool:
        """Whether w(x, y) depends on x - y alone."""

    @property
    @abstractmethod
    def smooth(self) -> bool | None:
        """Whether w is smooth everywhere, the diagonal included; None where only its values can tell."""

    @abstractmethod
    def matrix(self, x: FloatArray, y: FloatArray, domain: Domain) -> FloatArray:
        """Values w(x, y) for broadcastable x and y.

        Returns
        -------
        array, broadcast shape of x and y for a certain kernel, else (S, ...)
        """

    def symbol(self, k: IntArray, length: float) -> FloatArray | None:
        """Exact Fourier symbol of the periodised kernel on a ring: integral of w(z) cos(2 pi k z / length).

        Returns
        -------
        array (K,) or (S, K), or None where no closed form is known
        """
        return None

    def footprint(self) -> Bound | None:
        """The width that a mesh must resolve, in units of length; None where the kernel has none."""
        return None


@dataclass(frozen=True)
class DistanceKernel(Kernel):
    """A kernel of the distance alone, with its integral over the line and its width."""

    strength: Parameter = number(ACTIVITY)
    width: Parameter = number(LENGTH, positive=True)

    @property
    def certain(self) -> bool:
        return is_certain(self.strength, self.width)

    @property
    def shift_invariant(self) -> bool:
        return True

    def footprint(self) -> Bound | None:
        return bound(self.width)


@dataclass(frozen=True)
class GaussianKernel(DistanceKernel):
    """strength exp(-r^2 / (2 width^2)) / (sqrt(2 pi) width)."""

    @property
    def smooth(self) -> bool:
        return True

    def matrix(self, x: FloatArray, y: FloatArray, domain: Domain) -> FloatArray:
        z = domain.distance(x, y)
        width = per_sample(self.width, z.ndim)
        strength = per_sample(self.strength, z.ndim)
        scale = strength / (np.sqrt(2 * np.pi) * width)
        total = np.exp(-0.5 * (z / width) ** 2)
        if not domain.periodic:
            return np.asarray(scale * total)
        # narrow: an image counts within 9 widths of the farthest point, and the count is the sample's own
        wide = np.asarray(width) > 0.5 * domain.length
        reach = np.where(wide, 0.0, np.ceil(9.0 * np.asarray(width) / domain.length + 0.5))
        for image in range(1, int(reach.max()) + 1):
            shift = image * domain.length
            both = np.exp(-0.5 * ((z - shift) / width) ** 2) + np.exp(-0.5 * ((z + shift) / width) ** 2)
            total = total + np.where(image <= reach, both, 0.0)
        summed = np.asarray(scale * total)
        if not wide.any():
            return summed
        # wide: three terms of the Fourier series, the fourth is below 1e-33 of the first
        phase = 2 * np.pi / domain.length
        series = 0.5 + sum(np.exp(-0.5 * (k * phase * width) ** 2) * np.cos(k * phase * z) for k in (1, 2, 3))
        return np.where(wide, strength * 2 / domain.length * series, summed)

    def symbol(self, k: IntArray, length: float) -> FloatArray | None:
        frequency = 2 * np.pi * k / length
        width = per_sample(self.width, 1)
        return np.asarray(per_sample(self.strength, 1) * np.exp(-0.5 * (width * frequency) ** 2))


@dataclass(frozen=True)
class ExponentialKernel(DistanceKernel):
    """strength exp(-r / width) / (2 width): a kink on the diagonal."""

    @property
    def smooth(self) -> bool:
        return False

    def matrix(self, x: FloatArray, y: FloatArray, domain: Domain) -> FloatArray:
        z = domain.distance(x, y)
        width = per_sample(self.width, z.ndim)
        scale = per_sample(self.strength, z.ndim) / (2 * width)
        if domain.periodic:  # geometric series of the images
            total = (np.exp(-z / width) + np.exp(-(domain.length - z) / width)) / -np.expm1(
                -domain.length / width
            )
        else:
            total = np.exp(-z / width)
        return np.asarray(scale * total)

    def symbol(self, k: IntArray, length: float) -> FloatArray | None:
        frequency = 2 * np.pi * k / length
        width = per_sample(self.width, 1)
        return np.asarray(per_sample(self.strength, 1) / (1 + (width * frequency) ** 2))


@dataclass(frozen=True)
class CosineKernel(Kernel):
    """sum_k a_k cos(2 pi k (x - y) / length), with the length of the domain."""

    coefficients: tuple[Parameter, ...] = number(ACTIVITY_PER_LENGTH)

    @property
    def certain(self) -> bool:
        return is_certain(*self.coefficients)

    @property
    def shift_invariant(self) -> bool:
        return True

    @property
    def smooth(self) -> bool:
        return True

    def matrix(self, x: FloatArray, y: FloatArray, domain: Domain) -> FloatArray:
        phase = 2 * np.pi * (x - y) / domain.length
        waves = [per_sample(a, phase.ndim) * np.cos(k * phase) for k, a in enumerate(self.coefficients)]
        return np.asarray(sum(waves))

    def symbol(self, k: IntArray, length: float) -> FloatArray | None:
        shapes = [np.shape(bound(a)) for a in self.coefficients]
        total = np.zeros((*np.broadcast_shapes(*shapes), len(k)))
        for order, a in enumerate(self.coefficients):
            factor = length if order == 0 else length / 2
            total = total + per_sample(a, 1) * factor * (np.abs(k) == order)
        return total

    def footprint(self) -> Bound | None:
        return None


@dataclass(frozen=True)
class FormulaKernel(Kernel):
    """w(x, y) by a formula of x (target), y (source) and r (distance; on the ring the shortest); not periodised."""

    term: FormulaTerm

    @property
    def certain(self) -> bool:
        used = self.term.used()
        return all(not isinstance(v, np.ndarray) for k, v in self.term.names.items() if k in used)

    @property
    def shift_invariant(self) -> bool:
        return not (self.term.depends_on("x") or self.term.depends_on("y"))

    @property
    def smooth(self) -> bool | None:
        return None

    def matrix(self, x: FloatArray, y: FloatArray, domain: Domain) -> FloatArray:
        r = domain.distance(x, y)
        value = self.term.evaluate({"x": x, "y": y, "r": r}, axes=r.ndim)
        lead = value.shape[: max(0, value.ndim - r.ndim)]
        return np.array(np.broadcast_to(value, lead + r.shape))


@dataclass(frozen=True)
class Connectivity:
    """The kernel of the field: the sum of named parts; a lone part has the empty name."""

    parts: Mapping[str, Kernel]

    def path(self, name: str) -> str:
        """Path of a part in the study file."""
        return f"kernel.{name}" if name else "kernel"

    def uncertain(self) -> Iterator[Uncertain]:
        """Laws of all parts."""
        for name, part in self.parts.items():
            yield from part.uncertain(self.path(name))

    def bind(self, binding: Binding) -> Connectivity:
        """The sum with bound numbers."""
        return Connectivity({name: p.bind(self.path(name), binding) for name, p in self.parts.items()})

    @property
    def certain(self) -> bool:
        """Whether the sum is the same for all samples."""
        return all(p.certain for p in self.parts.values())

    @property
    def shift_invariant(self) -> bool:
        """Whether it depends on x - y alone."""
        return all(p.shift_invariant for p in self.parts.values())

    def matrix(self, x: FloatArray, y: FloatArray, domain: Domain) -> FloatArray:
        """w(x, y), shape of x and y broadcast, or (S, ...)."""
        total: FloatArray | None = None
        for part in self.parts.values():
            values = part.matrix(x, y, domain)
            total = values if total is None else total + values
        assert total is not None
        return total

    def symbol(self, k: IntArray, length: float) -> FloatArray | None:
        """Sum of the exact symbols, or None where a part has none."""
        total: FloatArray | None = None
        for part in self.parts.values():
            values = part.symbol(k, length)
            if values is None:
                return None
            total = values if total is None else total + values
        return total
