"""Invented reports of studies that ask which input causes the spread: with a surrogate, dependent, noisy."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations
from typing import Any

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.report.data import ReportData
from tests.report.sample_report import (
    noisy_report,
    noisy_summary,
    sample_report,
    sample_summary,
    stated,
    undetermined,
)

H, WIDTH, STRENGTH, GAIN = "h", "kernel.excitation.width", "kernel.inhibition.strength", "rate.gain"

WIDTH_FIRST = {H: 0.412, WIDTH: 0.223, STRENGTH: 0.001, GAIN: 0.118}
WIDTH_TOTAL = {H: 0.614, WIDTH: 0.419, STRENGTH: 0.003, GAIN: 0.131}
"""Indices of width: h and the kernel's width share 0.19, and h and the gain 0.01."""

NO_EXCHANGE = "not determined: 64 samples are too few for runs that exchange inputs"


def index(value: float, surrogate: float | None = 0.012, sampling: float = 0.009) -> dict[str, Any]:
    """An index with the parts of its error."""
    parts = {"space": 0.002, "time": 0.0004, "bias_noise": 0.0011, "sampling": sampling}
    return stated(value, **parts, **({} if surrogate is None else {"surrogate": surrogate}))


def causes_of_width() -> dict[str, Any]:
    """What is said of width: all Sobol' indices, two inputs to pin down for an sd of 0.2 mm."""
    pairs = dict.fromkeys(combinations(WIDTH_FIRST, 2), 0.0004)
    pairs |= {(H, WIDTH): 0.192, (H, GAIN): 0.0131}
    second: dict[str, dict[str, Any]] = {path: {} for path in WIDTH_FIRST}
    for (one, other), value in pairs.items():
        second[one][other] = second[other][one] = index(value, 0.003, 0.002)
    left = {H: 0.3169, WIDTH: 0.3643, STRENGTH: 0.4131, GAIN: 0.3881}
    halved = {H: 0.3436, WIDTH: 0.3772, STRENGTH: 0.4132, GAIN: 0.3946}
    return {
        "sensitivity": {
            path: {
                "first": index(WIDTH_FIRST[path]),
                "total": index(WIDTH_TOTAL[path]),
                "second": second[path],
            }
            for path in WIDTH_FIRST
        },
        "measure_next": {
            path: {
                "remaining_sd_known": stated(left[path], space=0.001, surrogate=0.002, sampling=0.005),
                "remaining_sd_halved": stated(halved[path], space=0.001, surrogate=0.002, sampling=0.006),
                "may_be_fixed": path == STRENGTH,
            }
            for path in WIDTH_FIRST
        },
        "pin_down": [{"inputs": [H, WIDTH], "remaining_sd": 0.1532, "wanted_sd": 0.2, "exhaustive": True}],
        "ranking": {
            "by": "total",
            "order": [H, WIDTH, GAIN, STRENGTH],
            "above_next": [0.9987, 1.0, 0.91],
            "first_is_largest": 0.9981,
        },
        "notes": [],
    }


def causes_of_peak() -> dict[str, Any]:
    """What is said of peak height: first order from the sample, totals not determined, no sure order."""
    first = {H: 0.481, WIDTH: 0.466, STRENGTH: -0.002, GAIN: 0.043}
    nothing = undetermined(NO_EXCHANGE)
    return {
        "sensitivity": {
            path: {"first": index(value, None, 0.021), "total": nothing} for path, value in first.items()
        },
        "measure_next": {
            path: {
                "remaining_sd_known": stated(0.0514 * (1 - max(value, 0.0)) ** 0.5, sampling=0.0011),
                "remaining_sd_halved": stated(0.0514 * (1 - 0.7 * max(value, 0.0)) ** 0.5, sampling=0.0012),
                "may_be_fixed": None,
            }
            for path, value in first.items()
        },
        "pin_down": [],
        "ranking": None,
        "notes": ["no surrogate was used: rough: held-out runs miss 12 % of the variance"],
    }


def influence_summary() -> dict[str, Any]:
    """The summary of a study that asks for everything: width by an accepted surrogate, peak height without."""
    summary = sample_summary()
    quantities = summary["quantities"]
    quantities["width"] |= causes_of_width()
    for name in ("mean", "sd"):
        found = quantities["width"][name]
        quantities["width"][name] = stated(
            found["value"], space=0.0093, time=0.00021, surrogate=0.0061, sampling=0.001
        )
    quantities["peak height"] |= causes_of_peak()
    summary["sampling"] |= {"asked": "polynomial chaos", "further_runs": {"held out": 64}}
    return summary


def sample_inputs(samples: int = 2048) -> dict[str, FloatArray]:
    """Draws of the four inputs of the sample report."""
    random = np.random.default_rng(20261203)
    return {
        H: random.normal(0.30, 0.02, samples),
        WIDTH: random.uniform(0.8, 1.2, samples),
        STRENGTH: random.uniform(-1.0, -0.8, samples),
        GAIN: random.lognormal(2.3, 0.1, samples),
    }


def influence_report() -> ReportData:
    """The whole report; values follow the inputs by a formula, some do not occur."""
    plain, inputs = sample_report(), sample_inputs()
    h, wide = (inputs[H] - 0.30) / 0.02, (inputs[WIDTH] - 1.0) / 0.1155
    width = 3.14 - 0.26 * h + 0.19 * wide + 0.18 * h * wide + 0.14 * (inputs[GAIN] - 10.02)
    width[::171] = np.nan
    peak = 0.82 + 0.036 * h + 0.035 * wide + 0.01 * (inputs[GAIN] - 10.02)
    values = {**plain.values, "width": width, "peak height": peak}
    return replace(plain, summary=influence_summary(), values=values, inputs=inputs)


def dependent_report() -> ReportData:
    """Two inputs that depend on one another: Shapley effects alone, and nothing to pin down."""
    plain = influence_report()
    summary = influence_summary()
    width, peak = summary["quantities"]["width"], summary["quantities"]["peak height"]
    effects = {H: 0.512, WIDTH: 0.333, STRENGTH: 0.004, GAIN: 0.151}
    nothing = undetermined("not determined: the inputs depend on one another")
    width["sensitivity"] = {path: {"shapley": index(value)} for path, value in effects.items()}
    width["measure_next"] = {
        path: {"remaining_sd_known": nothing, "remaining_sd_halved": nothing, "may_be_fixed": None}
        for path in effects
    }
    width |= {"pin_down": [], "ranking": None}
    peak |= {"sensitivity": {}, "measure_next": {}, "pin_down": [], "notes": []}
    model = replace(plain.model, dependence=f"rank correlation 0.6 of {H} and {GAIN}")
    return replace(plain, summary=summary, model=model)


def noisy_influence_report() -> ReportData:
    """Noise beside the parameters: first order and the share of the noise."""
    plain, summary = noisy_report(), noisy_summary()
    nothing = undetermined("not determined under noise: it depends on how paths are coupled")
    first = {H: 0.41, WIDTH: 0.16, STRENGTH: 0.02, GAIN: 0.01}
    summary["quantities"]["drift"] |= {
        "sensitivity": {
            path: {"first": index(value, None), "total": nothing} for path, value in first.items()
        }
        | {"noise": {"total": index(0.3853, None, 0.0911)}},
        "measure_next": {},
        "pin_down": [],
    }
    return replace(plain, summary=summary, inputs=sample_inputs())
