"""An invented report with everything in it: three quantities, one that may not occur, fields, failures."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np

from aleafield.report.data import FieldRecord, HistoryRecord, ModelText, Provenance, ReportData
from aleafield.units import Units

STUDY_TEXT = """title = "How wide does an evoked bump grow?"
seed  = 20261201
units = { length = "mm", time = "ms", activity = "mV" }

[parameters]
h = "normal(0.30, 0.02)"

[domain]
shape = "interval"
from = -10.0
to = 10.0

[drive]
formula = "a * exp(-x**2 / (2 * s**2)) * (t < 20)"
a = 0.8
s = 1.0

[[quantity]]
name = "width"
measure = "active width"
level = 0.3
"""

PARTS = ("space", "quadrature", "time", "noise_modes", "bias_noise", "sampling", "surrogate")


def stated(
    value: float, left: float | None = None, low: float = -math.inf, high: float = math.inf, **parts: float
) -> dict[str, Any]:
    """A statistic as design section 6 has it: biases add, what is random in quadrature.

    `parts` are those that apply; `left` is the lower sampling half-width where it differs from `sampling`.
    """
    bias = sum(parts.get(name, 0.0) for name in ("space", "quadrature", "time", "noise_modes", "surrogate"))
    noise, right = parts.get("bias_noise", 0.0), parts.get("sampling", 0.0)
    left = right if left is None else left
    below, above = bias + math.hypot(left, noise), bias + math.hypot(right, noise)
    error: dict[str, float | None] = {name: parts.get(name) for name in PARTS}
    error["total"] = max(below, above)
    return {"value": value, "error": error, "interval": [max(value - below, low), min(value + above, high)]}


def undetermined(reason: str) -> dict[str, Any]:
    """A statistic that the samples cannot give."""
    return {"value": None, "error": dict.fromkeys((*PARTS, "total")), "interval": None, "reason": reason}


def probability(value: float, sampling: float, space: float) -> dict[str, Any]:
    """A probability with a few parts, its interval cut to [0, 1]."""
    return stated(
        value,
        left=0.9 * sampling,
        low=0.0,
        high=1.0,
        space=space,
        quadrature=space / 5,
        time=space / 30,
        bias_noise=space / 3,
        sampling=sampling,
    )


def sample_summary() -> dict[str, Any]:
    """A summary of three quantities of a field without noise in the shape of summary.json."""
    mean = stated(
        3.14159265, space=0.0093, quadrature=0.0031, time=0.00021, bias_noise=0.0011, sampling=0.0147
    )
    mean["corrected"] = stated(
        3.1342, space=0.0023, quadrature=0.0008, time=0.00005, bias_noise=0.0011, sampling=0.0147
    )
    mean["orders"] = {
        "space": {"observed": 1.97, "expected": 2.0, "factor": 1.4167},
        "quadrature": {"observed": 2.02, "expected": 2.0, "factor": 1.4167},
        "time": {"observed": 3.98, "expected": 4.0, "factor": 1.0833},
    }
    mean["notes"] = ["below the resolution of the split: time"]
    width = {
        "units": "mm",
        "mean": mean,
        "sd": stated(
            0.41326, space=0.0041, quadrature=0.0012, time=0.0001, bias_noise=0.0021, sampling=0.0098
        ),
        "quantiles": {
            "0.05": stated(2.4412, left=0.021, space=0.0102, quadrature=0.0029, time=0.0002, sampling=0.017),
            "0.5": stated(3.1502, space=0.0091, quadrature=0.0031, time=0.0002, sampling=0.016),
            "0.95": stated(3.8127, space=0.0089, quadrature=0.0033, time=0.0003, sampling=0.027),
        },
        "exceed": {"3.5": probability(0.2041, 0.011, 0.0061), "4.0": probability(0.0181, 0.0052, 0.0018)},
        "occurs": stated(
            0.99414, left=0.004, low=0.0, high=1.0, space=0.0004, bias_noise=0.0003, sampling=0.003
        ),
        "sensitivity": {},
        "variance": None,
    }
    peak = {
        "units": "mV",
        "mean": stated(
            0.8213, space=0.0071, quadrature=0.0012, time=0.0004, bias_noise=0.0003, sampling=0.0021
        ),
        "sd": stated(
            0.0514, space=0.0012, quadrature=0.0002, time=0.0001, bias_noise=0.0004, sampling=0.0012
        ),
        "quantiles": {
            "0.05": stated(0.7371, space=0.0069, quadrature=0.0011, time=0.0004, sampling=0.0034),
            "0.5": stated(0.8217, space=0.0071, quadrature=0.0012, time=0.0004, sampling=0.0031),
            "0.95": undetermined("not determined by 64 samples: at least 72 are needed"),
        },
        "exceed": {"0.9": probability(0.0631, 0.008, 0.0091)},
        "occurs": None,
        "sensitivity": {},
        "variance": None,
    }
    crossing = {
        "units": "ms",
        "mean": stated(1.2345e-7, space=1.1e-9, time=2.0e-10, sampling=4.0e-10),
        "sd": stated(2.1e-8, space=1.0e-10, time=1.0e-11, sampling=6.0e-10),
        "quantiles": {},
        "exceed": {},
        "occurs": probability(0.874, 0.012, 0.003),
        "sensitivity": {},
        "variance": None,
    }
    return {
        "schema": 1,
        "field": None,
        "quantities": {"width": width, "peak height": peak, "crossing <time>": crossing},
        "inputs": {
            "h": {"law": "normal(0.30, 0.02)", "units": "1", "mean": 0.3, "sd": 0.02},
            "kernel.excitation.width": {
                "law": "uniform(0.8, 1.2)",
                "units": "mm",
                "mean": 1.0,
                "sd": 0.11547,
            },
            "kernel.inhibition.strength": {
                "law": "uniform(-1.0, -0.8)",
                "units": "mV",
                "mean": -0.9,
                "sd": 0.057735,
            },
            "rate.gain": {"law": "lognormal(2.3, 0.1)", "units": "mV-1", "mean": 10.0241, "sd": 1.00492},
        },
        "scheme": {
            "projector": "piecewise linear",
            "method": "collocation",
            "nodes": 257,
            "quadrature": "matched",
            "quadrature_points": 257,
            "time_step": 0.5,
            "probes": 128,
            "noise": None,
            "parts": {
                name: {"expected_order": order, "proven": True, "note": f"an invented reason for {name}"}
                for name, order in (("space", 2.0), ("quadrature", 2.0), ("time", 4.0))
            },
            "operators": [
                {
                    "part": "excitation + inhibition",
                    "operator": "Toeplitz by fast Fourier transform",
                    "error": 1.0e-15,
                    "reason": "uniform mesh, kernel of a difference",
                }
            ],
        },
        "sampling": {
            "method": "quasi-monte carlo",
            "samples": 2048,
            "replicates": 16,
            "points_per_replicate": 128,
            "noise_repeats": 1,
        },
        "cost": {"predicted_s": None, "measured_s": 48.2, "samples": 2048, "split_share": 0.19},
        "aim": {
            "tolerance": "1 %",
            "quantity": "width",
            "half_width": 0.0277,
            "allowed": 0.0314,
            "met": True,
            "reason": "the mean of width is known to 0.0277, 1 % demands 0.0314",
        },
        "failed": {
            "count": 2,
            "reasons": {"not_finite": 2},
            "listed": 2,
            "list": [
                {"sample": 411, "time": 3.5, "inputs": {"h": 0.2513, "rate.gain": 13.91}},
                {"sample": 1902, "time": None, "inputs": {"h": 0.2498, "rate.gain": 14.02}},
            ],
        },
        "confidence": 0.95,
        "warnings": ["2000 samples asked, 2048 used: quasi-Monte Carlo takes 16 scramblings of 128 points"],
    }


def sample_fields(samples: int = 128, times: int = 41, points: int = 129) -> FieldRecord:
    """A bump that grows and settles: closed form in x and t with random height, width and pace."""
    random = np.random.default_rng(20261201)
    height = random.normal(0.82, 0.05, samples)[:, None, None]
    width = random.uniform(0.8, 1.2, samples)[:, None, None]
    pace = random.uniform(8.0, 14.0, samples)[:, None, None]
    t = np.linspace(0.0, 60.0, times)[:, None]
    x = np.linspace(-10.0, 10.0, points)
    hat = (1 - 0.4 * (x / (2 * width)) ** 2) * np.exp(-(x**2) / (2 * (1.6 * width) ** 2))
    kept = height * hat * (1 - np.exp(-t / pace)) * (1 + 0.35 * np.exp(-(((t - 20) / pace) ** 2)))
    band = np.quantile(kept, [0.05, 0.25, 0.75, 0.95], axis=0)
    return FieldRecord(t[:, 0], x, kept.mean(axis=0), kept.std(axis=0, ddof=1), band, samples)


def sample_report() -> ReportData:
    """The whole report; its values are normal with the means and spreads of the summary."""
    random = np.random.default_rng(7)
    width = random.normal(3.14159265, 0.41326, 2048)
    width[::171] = np.nan
    return ReportData(
        title="How wide does an evoked bump grow?",
        about="An invented scenario: a patch of tissue is driven for 20 ms and then left to itself.",
        units=Units("mm", "ms", "mV"),
        study_text=STUDY_TEXT,
        summary=sample_summary(),
        measures={
            "width": "active width",
            "peak height": "maximum",
            "crossing <time>": "time to level",
        },
        model=ModelText(
            domain="the interval from -10 to 10 mm",
            kernel={
                "excitation": "gaussian (strength 1.4 mV, width uniform(0.8, 1.2) mm)",
                "inhibition": "gaussian (strength uniform(-1.0, -0.8) mV, width 2.0 mm)",
            },
            rate="logistic (gain lognormal(2.3, 0.1) mV-1, threshold h mV, maximum 1.0)",
            drive="a * exp(-x**2 / (2 * s**2)) * (t < 20), with a = 0.8, s = 1.0",
            initial="0",
            time_constant="10.0 ms",
            duration="60.0 ms",
            integrals="integrals were taken by the trapezoid rule with 257 points",
            steps=120,
        ),
        provenance=Provenance(
            20261201,
            "9f2b6c0a5d1e4f37" * 4,
            {"aleafield": "0.1.0", "Python": "3.11.9", "numpy": "2.4.6", "scipy": "1.17.1"},
        ),
        values={
            "width": width,
            "peak height": random.normal(0.8213, 0.0514, 2048),
            "crossing <time>": 1e-7 + random.exponential(2.3e-8, 2048),
        },
        fields=sample_fields(),
    )


def noisy_summary() -> dict[str, Any]:
    """A summary of a field with noise: two quantities that drift, one of which is bounded on one side only."""
    summary = sample_summary()
    drift: dict[str, Any] = {
        "units": "mm",
        "mean": stated(
            0.1421, space=0.0021, quadrature=0.0004, time=0.0061, noise_modes=0.0083, sampling=0.0152
        ),
        "sd": stated(
            0.5621, space=0.0013, quadrature=0.0002, time=0.0052, noise_modes=0.0031, sampling=0.0112
        ),
        "quantiles": {},
        "exceed": {},
        "occurs": None,
        "sensitivity": {},
        "variance": {
            "parameters": stated(0.19421, sampling=0.0312),
            "noise": stated(0.12175, sampling=0.0049),
            "share": stated(0.6147, left=0.0982, low=0.0, high=1.0, sampling=0.0911),
            "total": stated(0.31596, sampling=0.0251),
        },
    }
    drift["mean"]["orders"] = {
        "time": {"observed": 0.93, "expected": 1.0, "factor": 2.25},
        "noise_modes": {"observed": None, "expected": None, "factor": 1.2612},
    }
    highest = {
        "units": "mV",
        "mean": one_sided(
            0.8213, note="the path between the ends of the steps is not seen", space=0.012, sampling=0.009
        ),
        "sd": one_sided(0.0514, above=False, note="the path is not seen", space=0.0012, sampling=0.0031),
        "quantiles": {"0.95": one_sided(0.9102, note="the path is not seen", space=0.0014, sampling=0.0052)},
        "exceed": {},
        "occurs": None,
        "sensitivity": {},
        "variance": {
            "parameters": stated(0.0, low=0.0, sampling=0.00012),
            "noise": stated(0.00264, sampling=0.00016),
            "share": stated(0.0, low=0.0, high=1.0, sampling=0.0447),
            "total": stated(0.00264, sampling=0.00018),
        },
    }
    summary["quantities"] = {"drift": drift, "highest": highest}
    summary["scheme"]["noise"] = {
        "correlation": "gaussian",
        "modes": 65,
        "ring_length": 40.0,
        "dropped_share": 6.3e-5,
        "image_error": 4.1e-7,
        "note": "",
    }
    summary["scheme"]["parts"]["noise_modes"] = {
        "expected_order": None,
        "proven": True,
        "note": "the dropped variance is known",
    }
    summary["sampling"] = {
        "method": "monte carlo",
        "samples": 512,
        "replicates": 1,
        "points_per_replicate": 512,
        "noise_repeats": 4,
    }
    summary["field"] = [
        {
            "time": time,
            "variance": stated(variance, sampling=0.02 * variance),
            "correlation_length": stated(length, sampling=0.013),
        }
        for time, variance, length in ((30.0, 0.00121, 0.712), (60.0, 0.00264, 0.731))
    ]
    summary["failed"] |= {
        "list": [{"sample": 411, "repeat": 2, "time": 3.5, "inputs": {"h": 0.2513, "rate.gain": 13.91}}],
        "listed": 1,
        "count": 1,
        "reasons": {"not_finite": 1},
    }
    summary["aim"] = None
    summary["warnings"] = []
    return summary


def one_sided(value: float, note: str, above: bool = True, **parts: float) -> dict[str, Any]:
    """A statistic with an open end above (or below), where the time part bounds nothing."""
    found = stated(value, **parts)
    found["interval"][1 if above else 0] = None
    found["error"]["total"] = None
    return {**found, "notes": [f"time: no bound {'above' if above else 'below'}: {note}"]}


def sample_history(scale: float, start: float, units: str, followed: str = "") -> HistoryRecord:
    """A fan of Brownian paths with a random drift, 41 times over 60 ms."""
    random = np.random.default_rng(20261202)
    t = np.linspace(0.0, 60.0, 41)
    steps = random.normal(0.0, np.sqrt(60 / 40), (1024, 40)) + random.normal(0.02, 0.05, (1024, 1))
    walks = start + scale * np.concatenate([np.zeros((1024, 1)), np.cumsum(steps, axis=1)], axis=1)
    fan = np.quantile(walks, [0.05, 0.25, 0.5, 0.75, 0.95], axis=0)
    return HistoryRecord(followed, units, t, fan, walks[:6], 1024)


def noisy_report() -> ReportData:
    """The report of a field with noise, its quantities followed in time."""
    plain, random = sample_report(), np.random.default_rng(11)
    return replace(
        plain,
        summary=noisy_summary(),
        measures={"drift": "displacement", "highest": "maximum"},
        model=replace(
            plain.model,
            noise="gaussian (strength 0.02 mV, correlation length 0.5 mm), 65 modes of a ring of 40 mm",
        ),
        values={"drift": random.normal(0.1421, 0.5621, 2048), "highest": random.normal(0.8213, 0.0514, 2048)},
        histories={
            "drift": sample_history(0.07, 0.0, "mm", "displacement since t = 0"),
            "highest": sample_history(0.006, 0.8, "mV"),
        },
    )
