"""Faults in noise paths, covariances, steps, bridges and the parting of the variance that the tests must see."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

from aleafield.accounting.measured import MeasuredPart
from aleafield.archive.field_state import FieldState
from aleafield.arrays import FloatArray
from aleafield.estimates.variance_parts import VarianceParts, estimate_variance_parts
from aleafield.field.noise import CosineCorrelation, LengthCorrelation
from aleafield.quantities.bridge import Bridges
from aleafield.randomness import wiener
from aleafield.randomness.streams import Places
from aleafield.randomness.wiener import WienerPaths
from aleafield.stepping import euler_maruyama
from aleafield.stepping.failure import freeze
from aleafield.stepping.system import NoisySystem
from tests.exactness import test_euler_maruyama, test_noise, test_quantities_noisy
from tests.noise import test_open_intervals, test_strong_order, test_variance_parting
from tests.statistical import test_bridges, test_variance_parts, test_wiener
from tests.teeth.biting import Check, Tooth, assert_bites, everywhere, member, teeth
from tests.teeth.test_archive import fans_agree, in_a_folder

REAL_GO = Places.go
STRONG_ORDER: Check = lambda: test_strong_order.test_strong_order_one("ring", "fourier", "collocation")  # noqa: E731
PARTING = in_a_folder(test_variance_parting.test_both_parts_share_and_total, "monte carlo")


def step_after_step(self: Any, block: int) -> None:
    """A block's numbers for all modes of a step, then for those of the next: what a mode gets depends on m."""
    steps = min(self._steps, self._base_steps - block * self._steps)
    count = steps * self._per_step
    self._values = np.empty((count, *self._values.shape[1:]))
    for row, (sample, repeat) in enumerate(self._realizations):
        self._places.go(self._generation, block, repeat, sample)
        self._values[:, row] = self._places.generator.standard_normal((count, self._modes))
    self._block = block


def fresh_paths(number: int) -> Callable[..., None]:
    """The seed depends on an argument that must not change the paths: 3, the modes, or 5, the depth."""

    def constructed(self: WienerPaths, *arguments: Any, real: Any = WienerPaths.__init__) -> None:
        real(self, arguments[0] + arguments[number], *arguments[1:])

    return constructed


def without_the_half(self: WienerPaths, k: int) -> FloatArray:
    """Halves B/2 +- sqrt(L) Z: their sums are right, their variances are not."""
    length = self._lengths[k]
    increments = np.sqrt(length) * self._normals[0].base_step(k)
    for normals in self._normals[1:]:
        shift = np.sqrt(length) * normals.base_step(k)
        halves = np.stack([0.5 * increments + shift, 0.5 * increments - shift], axis=1)
        increments = halves.reshape(-1, *increments.shape[1:])
        length *= 0.5
    return np.asarray(increments)


def variances_of_sub_steps() -> None:
    """The suite's test on increments of its own."""
    lengths = np.linspace(0.05, 4.0, 96)
    found = test_wiener.whole(*test_wiener.realizations(6, 2), 5, lengths, 2)
    standardised = found / np.sqrt(lengths / 4)[:, None, None, None]
    test_wiener.test_variances_are_lengths_of_sub_steps(standardised.reshape(-1, 12, 5))


@teeth(
    Tooth(
        "draws that go from step to step and not from mode to mode",
        member(wiener._Normals, "_draw", step_after_step),
        lambda: test_wiener.test_the_first_modes_do_not_depend_on_the_number_of_modes(0),
    ),
    Tooth(
        "twice the modes with fresh paths",
        member(WienerPaths, "__init__", fresh_paths(3)),
        lambda: test_wiener.test_the_first_modes_do_not_depend_on_the_number_of_modes(2),
    ),
    Tooth(
        "half the step with fresh paths",
        member(WienerPaths, "__init__", fresh_paths(5)),
        test_wiener.test_long_increments_are_the_sums_of_short_ones,
    ),
    Tooth(
        "half the step with fresh paths, seen by the strong order",
        member(WienerPaths, "__init__", fresh_paths(5)),
        STRONG_ORDER,
    ),
    Tooth(
        "a repeat that is no part of the address",
        member(Places, "go", lambda self, lane, block, repeat, sample: REAL_GO(self, lane, block, 0, sample)),
        lambda: test_wiener.test_numbers_stand_where_the_counter_says(7, 3),
    ),
    Tooth(
        "a repeat that is no part of the address, seen by the parting",
        member(Places, "go", lambda self, lane, block, repeat, sample: REAL_GO(self, lane, block, 0, sample)),
        PARTING,
    ),
    Tooth(
        "halves of an increment that are shifted by twice as much",
        member(WienerPaths, "base_step", without_the_half),
        variances_of_sub_steps,
    ),
)
def test_paths(tooth: Tooth) -> None:
    assert_bites(tooth)


def not_scaled(self: LengthCorrelation, modes: int, length: float) -> FloatArray:
    """The Fourier transform over its value at 0: C(0) is whatever comes out."""
    return length * self._power(self._decay(length)[..., None] * ((np.arange(modes) + 1) // 2))


def not_divided(self: CosineCorrelation) -> FloatArray:
    """The coefficients as they were given."""
    return np.stack(np.broadcast_arrays(*(np.asarray(c, dtype=np.float64) for c in self.coefficients)), -1)


@teeth(
    Tooth(
        "a covariance that is not scaled to 1 at 0",
        member(LengthCorrelation, "spectrum", not_scaled),
        lambda: test_noise.test_the_gaussian_covariance_is_the_sum_over_images(1.0),
    ),
    Tooth(
        "coefficients that are not scaled to the sum 1",
        member(CosineCorrelation, "_shares", not_divided),
        test_noise.test_cosine_correlation,
    ),
)
def test_covariances(tooth: Tooth) -> None:
    assert_bites(tooth)


class SideOfTheStart:
    """A system that decides its switches at the start of a step."""

    def __init__(self, system: NoisySystem) -> None:
        self._system = system
        self.restarts, self.initial, self.noise = system.restarts, system.initial, system.noise

    def rate_of_change(self, t: float, u: FloatArray, inside: float | None = None) -> FloatArray:
        """Switches decided at t."""
        return self._system.rate_of_change(t, u, float(np.nextafter(t, -1.0)))


def on_the_wrong_side(system: Any, *arguments: Any, **more: Any) -> FloatArray:
    """Steps that begin at a switch see what was before it."""
    return REAL_INTEGRATE(SideOfTheStart(system), *arguments, **more)


REAL_INTEGRATE = euler_maruyama.integrate


@teeth(
    Tooth(
        "switches decided at the start of a step",
        everywhere(euler_maruyama.integrate, on_the_wrong_side),
        lambda: test_euler_maruyama.test_a_drive_that_switches_on_the_schedule_is_exact(0),
    ),
    Tooth(
        "failed samples that go on",
        everywhere(freeze, lambda failed_at, time, *arrays: None),
        test_euler_maruyama.test_a_sample_that_blows_up_is_frozen_and_disturbs_no_other,
    ),
)
def test_steps_under_noise(tooth: Tooth) -> None:
    assert_bites(tooth)


def half_the_exponent(self: Bridges, sign: float) -> FloatArray:
    """exp(-(c - a)(c - b) / v) is inverted: the factor 2 is forgotten."""
    return REAL_BEYOND(replace(self, variance=2.0 * self.variance), sign)


REAL_BEYOND = Bridges._beyond


def open_above(folder: Path) -> None:
    """The suite's test of an open interval on a run of its own."""
    found = test_open_intervals.wiener_process(folder)
    test_open_intervals.test_a_maximum_of_a_field_is_open_above_and_a_minimum_below(found, "highest", 1.0)


@teeth(
    Tooth(
        "a bridge without the factor 2 in its exponent",
        member(Bridges, "_beyond", half_the_exponent),
        test_quantities_noisy.test_the_extremes_of_a_bridge_invert_their_law,
    ),
    Tooth(
        "a bridge without the factor 2, seen by the law of extremes",
        member(Bridges, "_beyond", half_the_exponent),
        lambda: test_bridges.test_extremes_of_a_wiener_process_over_one_coarse_step(1),
    ),
    Tooth(
        "an open end that is shown closed",
        member(MeasuredPart, "open_sides", lambda self, statistic: frozenset()),
        in_a_folder(open_above),
    ),
)
def test_extremes(tooth: Tooth) -> None:
    assert_bites(tooth)


def with_noise_of_means(sample: Any, cluster: Any, repeats: int, confidence: float) -> VarianceParts:
    """The variance of cluster means in the place of the parameter part: V_W / R is not taken off."""
    found = estimate_variance_parts(sample, cluster, repeats, confidence)
    if found.parameters.value is None or found.noise.value is None:
        return found
    value = found.parameters.value + found.noise.value / repeats
    return replace(found, parameters=replace(found.parameters, value=value))


@teeth(
    Tooth(
        "a parameter part that holds a share of the noise",
        everywhere(estimate_variance_parts, with_noise_of_means),
        test_variance_parts.test_balanced_analysis_of_variance,
    ),
    Tooth(
        "a parameter part that holds a share of the noise, seen by a run",
        everywhere(estimate_variance_parts, with_noise_of_means),
        PARTING,
    ),
    Tooth(
        "fans at other quantiles than they say",
        member(FieldState, "fan", lambda self, name, real=FieldState.fan: real(self, name)[[1, 1, 2, 3, 3]]),
        in_a_folder(fans_agree),
    ),
)
def test_what_is_said_of_noise(tooth: Tooth) -> None:
    assert_bites(tooth)
