"""Brownian bridges: a linear functional of a noisy field inside the steps, exact in law.

Between two times a functional of a field with additive noise is, for a drift frozen over the step, a Brownian
path with known ends.  Its maximum has a law in closed form, and so has the time at which it first reaches a level.
Looking at the ends of steps only misses excursions; the error of a first passage then falls like the root of
the step alone (Gobet 2000, "Weak approximation of killed diffusion using Euler schemes", Stochastic Processes
and their Applications 87; from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtri

from aleafield.arrays import FloatArray, IntArray
from aleafield.quantities.functional import LinearFunctional
from aleafield.quantities.noisy import NoisyPaths
from aleafield.stepping.view import AnyStep, NoisyStep


@dataclass(frozen=True)
class Bridges:
    """Brownian bridges over the P equal sub-steps of one step.

    Attributes
    ----------
    ends : float array (P + 1, S)
        Values at the ends of the sub-steps, in time order.
    variance : float array () or (S,)
        Of an increment over one sub-step.
    uniforms : float array (P, S)
        In (0, 1), one for each sub-step: they decide its extremes.
    draws : float array (2, S)
        In (0, 1): they decide the time of a first passage.
    """

    ends: FloatArray
    variance: FloatArray
    uniforms: FloatArray
    draws: FloatArray

    def of(self, which: IntArray) -> Bridges:
        """Those of a choice of samples."""
        variance = self.variance[which] if self.variance.ndim else self.variance
        return Bridges(self.ends[:, which], variance, self.uniforms[:, which], self.draws[:, which])

    def maximum(self) -> FloatArray:
        """Largest value in the step, (S,)."""
        return np.asarray(self._maxima().max(axis=0))

    def minimum(self) -> FloatArray:
        """Smallest value in the step, (S,)."""
        return np.asarray(self._beyond(-1.0).min(axis=0))

    def _maxima(self) -> FloatArray:
        return self._beyond(1.0)

    def _beyond(self, sign: float) -> FloatArray:
        """Maximum (sign 1) or minimum (sign -1) in each sub-step, (P, S).

        The maximum of a bridge from a to b with variance v lies above c, not below both ends, with probability
        exp(-2 (c - a)(c - b) / v); this is inverted.  It is never below the ends, rounding or not.
        """
        left, right = self.ends[:-1], self.ends[1:]
        spread = np.hypot(right - left, np.sqrt(-2.0 * self.variance * np.log(self.uniforms)))
        outer = np.maximum if sign > 0 else np.minimum
        return np.asarray(outer(outer(left, right), 0.5 * (left + right + sign * spread)))

    def first_reach(self, level: FloatArray) -> FloatArray:
        """Share of the step at which the level (S,) is first reached, for paths that start below and reach it.

        In the first sub-step that reaches it, of length d with ends at distances A and B from the level, the
        time t is such that t / (d - t) is inverse Gaussian, with mean A / B and shape A^2 / v.  The two roots
        of its transformation, A / rest and A rest / B^2, are written so that B = 0 and v = 0 (then the path is
        straight) need no care.

        References
        ----------
        Michael, Schucany and Haas 1976, "Generating random variates using transformations with multiple
        roots", The American Statistician 30 (from memory).
        """
        part = (self._maxima() >= level).argmax(axis=0)
        samples = np.arange(len(level))
        below = level - self.ends[part, samples]
        beyond = np.abs(level - self.ends[part + 1, samples])
        normal, choice = ndtri(self.draws[0]), self.draws[1]
        scale = np.maximum(below, beyond)  # squares of what is left neither overflow nor vanish
        variance = self.variance / scale / scale
        below, beyond = below / scale, beyond / scale
        g = 0.5 * normal**2 * variance / below
        rest = beyond + g + np.sqrt(g * (g + 2.0 * beyond))
        with np.errstate(invalid="ignore"):  # 0 / 0 of a straight path that ends at the level, not chosen
            far = below * rest / (beyond**2 + below * rest)
        inside = np.where(choice * (rest + beyond) <= rest, below / (below + rest), far)
        return np.asarray((part + inside) / len(self.uniforms))


class BridgedFunctional:
    """A linear functional of a noisy field, followed through steps by bridges inside the finest sub-steps.

    Between the ends of a step of this level the drift is linear in time and the noise is that of the sub-steps, so
    that the last sub-step ends where the step does.  Levels that share paths and uniform numbers see the same
    bridges, up to the difference of their drifts.

    Parameters
    ----------
    functional : LinearFunctional
    noise : NoisyPaths
    name : str
        Of the functional and the kind of extreme, never of the quantity: all that is asked of one bridge sees the
        same uniform numbers, so that a higher level is not reached without the lower one.
    """

    def __init__(self, functional: LinearFunctional, noise: NoisyPaths, name: str) -> None:
        self.functional = functional
        self._along = noise.along(functional.weights)
        self._rate = (self._along**2).sum(axis=-1)
        self._uniforms = noise.uniforms(name)
        self._draws = self._uniforms.once(2)
        self._sub_steps, self._steps_per_base = noise.sub_steps, noise.steps_per_base
        self._base = -1
        self._block = np.empty((0, 0))

    def __call__(self, step: AnyStep) -> Bridges:
        """The bridges of a step of a noisy path."""
        assert isinstance(step, NoisyStep)
        parts = len(step.increments)
        start, end = self.functional(step.u0), self.functional(step.u1)
        # the product in one memory order, so that each row is summed alike whatever the layout of the increments
        noise = np.multiply(step.increments, self._along, order="C").sum(axis=-1).cumsum(axis=0)
        share = (np.arange(1, parts) / parts)[:, None]
        inner = start + noise[:-1] + share * (end - start - noise[-1])
        ends = np.concatenate((start[None], inner, end[None]))
        variance = np.asarray(self._rate * (step.length / parts))
        return Bridges(ends, variance, self._of_step(step.index, parts), self._draws)

    def _of_step(self, index: int, parts: int) -> FloatArray:
        """The uniform numbers of a step: a block of those of its base step, which are drawn once."""
        base, place = divmod(index, self._steps_per_base)
        if base != self._base:
            self._base, self._block = base, self._uniforms.base_step(base, self._sub_steps)
        return self._block[place * parts : (place + 1) * parts]
