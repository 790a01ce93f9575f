"""What a study's mesh, step and interval resolve: bounds from its first samples, without solving anything."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.field.equation import FieldEquation
from aleafield.field.kernels import CosineKernel, ExponentialKernel, FormulaKernel, GaussianKernel
from aleafield.projection.discretisation import Discretisation
from aleafield.stepping import euler_maruyama, runge_kutta

LOST = 1e-6
"""Share of a kernel beyond the end of an interval that counts as nothing."""
COARSE = 0.5
"""Mesh width over kernel width from which a mesh is called coarse."""


@dataclass(frozen=True)
class Stability:
    """Bound of the time step of the run's method, over some samples.

    Attributes
    ----------
    largest_step : float
        Units of time; below it no mode of the linearised field grows by the method's own doing.
    gain : float or None
        Largest slope of the rate times a sampled largest row sum of |kernel|; None where the slope is not known: then
        the bound is that of the decay -u / time_constant alone.
    time_constant : float
        The smallest one.
    """

    largest_step: float
    gain: float | None
    time_constant: float


def stability(discretisation: Discretisation, bound: FieldEquation) -> Stability:
    """The bound of the step for an equation that is bound to some samples.

    The modes of the linearised field decay at rates of at most (1 + gain) / time_constant.
    """
    time_constant = np.asarray(bound.dynamics.time_constant, dtype=np.float64)
    gain = discretisation.gain(bound)
    return Stability(
        largest_step=float(np.min(stable_step(bound, gain))),
        gain=None if gain is None else float(np.max(gain)),
        time_constant=float(np.min(time_constant)),
    )


def stable_step(bound: FieldEquation, gain: FloatArray | None) -> FloatArray:
    """Largest stable step for each sample of a bound equation, () or (S,), units of time.

    Of Euler-Maruyama where there is noise, else of Runge-Kutta.

    Parameters
    ----------
    bound : FieldEquation
    gain : size of the linearised integral term, () or (S,); None where it is not known: then the bound of the decay
    """
    limit = runge_kutta.stability_bound if bound.noise is None else euler_maruyama.stability_bound
    time_constant = np.asarray(bound.dynamics.time_constant, dtype=np.float64)
    return limit(time_constant, np.zeros(()) if gain is None else gain)


@dataclass(frozen=True)
class MeshWidth:
    """Mesh and quadrature spacing against the smallest width of a kernel, units of length.

    Attributes
    ----------
    nodes, points : float
        Largest gap between neighbouring nodes and between neighbouring quadrature points.
    kernel : float or None
        Smallest width over the samples and the parts; None where no part has a width.
    part : str
        Path of that part.
    """

    nodes: float
    points: float
    kernel: float | None
    part: str

    @property
    def ratio(self) -> float | None:
        """Larger gap over kernel width."""
        return None if self.kernel is None else max(self.nodes, self.points) / self.kernel


def mesh_width(discretisation: Discretisation, bound: FieldEquation) -> MeshWidth:
    """The widths for an equation that is bound to some samples."""
    smallest: float | None = None
    where = ""
    for name, part in bound.kernel.parts.items():
        footprint = part.footprint()
        if footprint is None:
            continue
        width = float(np.min(footprint))
        if smallest is None or width < smallest:
            smallest, where = width, bound.kernel.path(name)
    domain = discretisation.domain
    length = domain.length if domain.periodic else None
    return MeshWidth(
        _largest_gap(discretisation.space.nodes, length),
        _largest_gap(discretisation.rule.points, length),
        smallest,
        where,
    )


def _largest_gap(points: FloatArray, circumference: float | None) -> float:
    ordered = np.sort(points)
    gaps = np.diff(ordered)
    if circumference is not None:
        gaps = np.append(gaps, circumference - (ordered[-1] - ordered[0]))
    return float(gaps.max()) if len(gaps) else math.inf


def domain_notes(bound: FieldEquation, unit: str) -> list[str]:
    """What an interval cuts off the kernels of a line, and how kernels close on a ring.

    Parameters
    ----------
    bound : equation bound to some samples
    unit : label of lengths, with a leading space, or empty
    """
    notes = []
    for name, part in bound.kernel.parts.items():
        path, footprint = bound.kernel.path(name), part.footprint()
        if isinstance(part, GaussianKernel | ExponentialKernel) and footprint is not None:
            width = float(np.max(footprint))
            note = _ring_note if bound.domain.periodic else _interval_note
            notes.append(
                f"{path}: " + note(isinstance(part, GaussianKernel), width, bound.domain.length, unit)
            )
        elif isinstance(part, FormulaKernel) and bound.domain.periodic:
            notes.append(
                f"{path}: a formula is not periodised: r is the shortest distance, and unless the formula is "
                f"flat at r = {bound.domain.length / 2:.4g}{unit} it has a kink opposite every point"
            )
        elif isinstance(part, CosineKernel) and not bound.domain.periodic:
            notes.append(f"{path}: its waves have the length of the interval; nothing is cut off")
    return notes


def _tail(gaussian: bool, distance: float, width: float) -> float:
    """Share of a kernel's integral over the line that lies beyond a distance on one side."""
    if gaussian:
        return 0.5 * math.erfc(distance / (math.sqrt(2) * width))
    return 0.5 * math.exp(-distance / width)


def _reach(gaussian: bool, width: float) -> float:
    """Distance beyond which the share on one side is below `LOST`."""
    if gaussian:
        from scipy.special import erfcinv

        return float(math.sqrt(2) * width * erfcinv(2 * LOST))
    return width * math.log(0.5 / LOST)


def _interval_note(gaussian: bool, width: float, length: float, unit: str) -> str:
    middle = 2 * _tail(gaussian, length / 2, width)
    reach = _reach(gaussian, width)
    if 2 * reach >= length:
        where = f"everywhere more than {LOST:g} of it is lost"
    else:
        where = f"more than {LOST:g} of it is lost within {reach:.4g}{unit} of an end"
    return (
        f"there is no tissue beyond the ends: of the kernel's integral over the line {middle:.2g} is lost in "
        f"the middle and one half at an end (largest width {width:.4g}{unit}); {where}"
    )


def _ring_note(gaussian: bool, width: float, length: float, unit: str) -> str:
    beyond = 2 * _tail(gaussian, length / 2, width)
    return (
        f"summed over all images; {beyond:.2g} of its integral comes from beyond half the ring "
        f"(largest width {width:.4g}{unit})"
    )
