"""aleafield: uncertainty quantification for neural fields.

One study file (or a few lines of Python) in; an ensemble, statistics with a split error and a report out.
Names are loaded when they are first used, so that importing the package costs next to nothing.

>>> import aleafield
>>> aleafield.Uniform(0.8, 1.2).mean
1.0
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from aleafield.errors import AleafieldError, ArchiveError, InputError, Interrupted
    from aleafield.field.kernels import CosineKernel, ExponentialKernel, FormulaKernel, GaussianKernel
    from aleafield.field.noise import (
        CosineCorrelation,
        ExponentialCorrelation,
        GaussianCorrelation,
        Noise,
        WhiteCorrelation,
    )
    from aleafield.field.rates import (
        FormulaRate,
        LinearRate,
        LogisticRate,
        NormalOgiveRate,
        RampRate,
        StepRate,
    )
    from aleafield.geometry import Interval, Ring
    from aleafield.quantities import (
        ActiveWidth,
        At,
        Displacement,
        EffectiveDiffusion,
        FormulaQuantity,
        FrontPosition,
        FrontSpeed,
        FunctionQuantity,
        Integral,
        Maximum,
        Mean,
        Minimum,
        Norm,
        Over,
        PeakPosition,
        SpectralPower,
        TimeToLevel,
        Value,
    )
    from aleafield.randomness.laws import (
        Beta,
        Discrete,
        Exponential,
        Gamma,
        LogNormal,
        LogUniform,
        Normal,
        Sampled,
        Triangular,
        TruncatedNormal,
        Uniform,
    )
    from aleafield.runs.check import check
    from aleafield.runs.compare import compare
    from aleafield.runs.results import Result, extend, open_run, run
    from aleafield.study.building import Sensitivity, build_study, term
    from aleafield.study.reading import read_study

_HOMES: dict[str, tuple[str, ...]] = {
    "aleafield.errors": ("AleafieldError", "ArchiveError", "InputError", "Interrupted"),
    "aleafield.field.kernels": ("CosineKernel", "ExponentialKernel", "FormulaKernel", "GaussianKernel"),
    "aleafield.field.noise": (
        "CosineCorrelation",
        "ExponentialCorrelation",
        "GaussianCorrelation",
        "Noise",
        "WhiteCorrelation",
    ),
    "aleafield.field.rates": (
        "FormulaRate",
        "LinearRate",
        "LogisticRate",
        "NormalOgiveRate",
        "RampRate",
        "StepRate",
    ),
    "aleafield.geometry": ("Interval", "Ring"),
    "aleafield.quantities": (
        "ActiveWidth",
        "At",
        "Displacement",
        "EffectiveDiffusion",
        "FormulaQuantity",
        "FrontPosition",
        "FrontSpeed",
        "FunctionQuantity",
        "Integral",
        "Maximum",
        "Mean",
        "Minimum",
        "Norm",
        "Over",
        "PeakPosition",
        "SpectralPower",
        "TimeToLevel",
        "Value",
    ),
    "aleafield.randomness.laws": (
        "Beta",
        "Discrete",
        "Exponential",
        "Gamma",
        "LogNormal",
        "LogUniform",
        "Normal",
        "Sampled",
        "Triangular",
        "TruncatedNormal",
        "Uniform",
    ),
    "aleafield.study.building": ("Sensitivity", "build_study", "term"),
    "aleafield.runs.check": ("check",),
    "aleafield.runs.compare": ("compare",),
    "aleafield.study.reading": ("read_study",),
    "aleafield.runs.results": ("Result", "extend", "open_run", "run"),
}
_HOME = {name: module for module, names in _HOMES.items() for name in names}

__all__ = [
    "ActiveWidth",
    "AleafieldError",
    "ArchiveError",
    "At",
    "Beta",
    "CosineCorrelation",
    "CosineKernel",
    "Discrete",
    "Displacement",
    "EffectiveDiffusion",
    "Exponential",
    "ExponentialCorrelation",
    "ExponentialKernel",
    "FormulaKernel",
    "FormulaQuantity",
    "FormulaRate",
    "FrontPosition",
    "FrontSpeed",
    "FunctionQuantity",
    "Gamma",
    "GaussianCorrelation",
    "GaussianKernel",
    "InputError",
    "Integral",
    "Interrupted",
    "Interval",
    "LinearRate",
    "LogNormal",
    "LogUniform",
    "LogisticRate",
    "Maximum",
    "Mean",
    "Minimum",
    "Noise",
    "Norm",
    "Normal",
    "NormalOgiveRate",
    "Over",
    "PeakPosition",
    "RampRate",
    "Result",
    "Ring",
    "Sampled",
    "Sensitivity",
    "SpectralPower",
    "StepRate",
    "TimeToLevel",
    "Triangular",
    "TruncatedNormal",
    "Uniform",
    "Value",
    "WhiteCorrelation",
    "build_study",
    "check",
    "compare",
    "extend",
    "open_run",
    "read_study",
    "run",
    "term",
]


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module 'aleafield' has no attribute {name!r}")
    value = getattr(import_module(_HOME[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(__all__)
