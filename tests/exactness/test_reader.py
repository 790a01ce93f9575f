"""What a study file says is what the study holds: defaults, inputs, warnings, digest, impossible values."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest

import aleafield
from aleafield.errors import InputError
from aleafield.field.equation import FieldEquation
from aleafield.field.kernels import CosineKernel, FormulaKernel, GaussianKernel
from aleafield.field.noise import (
    CosineCorrelation,
    ExponentialCorrelation,
    GaussianCorrelation,
    Noise,
    WhiteCorrelation,
)
from aleafield.field.rates import LinearRate, LogisticRate, StepRate
from aleafield.formula import Formula
from aleafield.geometry import Interval, Ring
from aleafield.quantities import At, FormulaQuantity, FunctionQuantity, Over, Value
from aleafield.randomness.design import Design
from aleafield.randomness.laws import Normal, Uniform
from aleafield.sampling.request import SamplingRequest
from aleafield.study.impossible import refuse_impossible_samples
from aleafield.study.minimal import MINIMAL_STUDY
from aleafield.study.reading import read_study, read_text
from aleafield.study.study import Aim, Keep, ReportRequest, SensitivityRequest, Study
from aleafield.units import Units

ROOT = Path(__file__).resolve().parents[2]

FULL = """
title = "Everything at once"
about = "free text"
seed = 20261201
units = { length = "mm", time = "ms", activity = "mV" }

[parameters]
h = "normal(0.30, 0.02)"
g = "2*k + h"
k = 1

[domain]
shape = "interval"
from = -10
to = "2*5"

[kernel.excitation]
form = "gaussian"
strength = 1.4
width = "uniform(0.8, 1.2)"
[kernel.inhibition]
form = "formula"
formula = "-s * exp(-r / b)"
s = "uniform(0.8, 1.0)"
b = 2.0

[rate]
form = "logistic"
gain = "lognormal(2.3, 0.1)"
threshold = "h"

[drive]
formula = "a * exp(-x**2 / (2 * s**2)) * (t < 20)"
a = "0.8 * g"
s = "1 + 0*x"

[initial]
formula = 0

[dynamics]
time_constant = 10
duration = "6*10"

[scheme]
nodes = 256
time_step = 0.5

[[quantity]]
name = "width"
measure = "active width"
level = "uniform(0.2, 0.4)"
[[quantity]]
name = "mean square"
measure = "formula"
formula = "c * u**2"
in_space = "mean"
c = "uniform(1, 2)"
over = [10, "2*pi*5"]
reduce = "maximum"

[sampling]
method = "monte carlo"
samples = 100

[aim]
tolerance = "1 %"
confidence = 0.9

[report]
quantiles = [0.1, 0.9]
exceed = { width = [3, 4.0] }

[keep]
fields = "all"
times = [30, 10]
"""


def test_the_minimal_study_has_the_defaults() -> None:
    study = read_text(MINIMAL_STUDY)
    assert study.equation.domain == Interval(-10.0, 10.0)
    assert study.seed == 1
    assert study.units == Units("1", "1", "1")
    assert study.equation.drive.formula == Formula("0.8 * exp(-x**2 / 2)")
    assert study.equation.initial.formula.evaluate({}) == 0.0
    rate = study.equation.rate
    assert isinstance(rate, LogisticRate)
    assert (rate.gain, rate.threshold, rate.maximum) == (10.0, 0.3, 1.0)
    scheme = study.scheme
    assert (scheme.projector, scheme.method, scheme.nodes) == ("piecewise linear", "collocation", 257)
    assert (scheme.quadrature, scheme.quadrature_points, scheme.time_step) == ("matched", None, None)
    assert (study.sampling.method, study.sampling.samples) == ("auto", 1024)
    assert (study.aim, study.confidence) == (None, 0.95)
    assert study.sensitivity is None
    assert study.report == ReportRequest((0.05, 0.5, 0.95), {})
    assert study.keep == Keep("final", ())
    assert [entry.path for entry in study.inputs] == ["kernel.width"]
    assert study.warnings == ()


def test_a_study_with_every_section() -> None:
    study = read_text(FULL)
    assert study.title == "Everything at once"
    assert study.about == "free text"
    assert [entry.path for entry in study.inputs] == [
        "h",
        "kernel.excitation.width",
        "kernel.inhibition.s",
        "rate.gain",
        "quantity.width.level",
        "quantity.mean square.c",
    ]
    units = {entry.path: entry.units for entry in study.inputs}
    assert units["kernel.excitation.width"] == "mm"
    assert units["rate.gain"] == "mV-1"
    assert units["quantity.width.level"] == "mV"
    assert units["h"] == "1"
    assert study.equation.domain == Interval(-10.0, 10.0)
    assert study.equation.dynamics.duration == 60.0
    parts = study.equation.kernel.parts
    assert list(parts) == ["excitation", "inhibition"]
    assert isinstance(parts["excitation"], GaussianKernel)
    assert isinstance(parts["inhibition"], FormulaKernel)
    assert study.scheme.nodes == 257
    assert any("even" in warning and "257" in warning for warning in study.warnings)
    squares = study.quantities[1]
    assert isinstance(squares, FormulaQuantity)
    assert squares.when == Over(10.0, 10 * math.pi, "maximum")
    assert study.aim == Aim(0.01, True, "width", "1 %")
    assert study.confidence == 0.9
    assert study.report == ReportRequest((0.1, 0.9), {"width": (3.0, 4.0)})
    assert study.keep == Keep("all", (10.0, 30.0))
    assert (study.sampling.method, study.sampling.samples) == ("monte carlo", 100)
    assert study.source.text == FULL


def test_binding_follows_the_expressions() -> None:
    """h = 0.3, k = 1: g = 2.3 and the drive's a = 0.8 g; by hand at x = 1, t = 10."""
    study = read_text(FULL)
    values = {"h": 0.3, "kernel.excitation.width": 1.0, "kernel.inhibition.s": 0.9, "rate.gain": 10.0}
    values |= {"quantity.width.level": 0.3, "quantity.mean square.c": 1.5}
    inputs = {path: np.array([value]) for path, value in values.items()}
    bound: FieldEquation = study.equation.bind(study.equation.binding(inputs))
    drive = bound.drive.evaluate({"x": np.array([1.0]), "t": 10.0}, axes=1)
    assert drive.item() == pytest.approx(0.8 * 2.3 * math.exp(-0.5), rel=1e-14)


SCHEMES = {
    ("interval", ""): ("piecewise linear", "collocation", 257),
    ("interval", 'method = "galerkin"'): ("piecewise linear", "galerkin", 257),
    ("interval", 'projector = "chebyshev"'): ("chebyshev", "collocation", 33),
    ("interval", 'projector = "legendre"'): ("legendre", "galerkin", 32),
    ("ring", ""): ("fourier", "collocation", 256),
    ("ring", 'method = "galerkin"'): ("fourier", "galerkin", 256),
    ("ring", 'projector = "piecewise linear"'): ("piecewise linear", "collocation", 256),
}


def _minimal_on(shape: str) -> str:
    interval = 'shape = "interval"\nfrom = -10.0\nto = 10.0'
    return (
        MINIMAL_STUDY.replace(interval, 'shape = "ring"\nlength = 20.0') if shape == "ring" else MINIMAL_STUDY
    )


@pytest.mark.parametrize(("given", "expected"), SCHEMES.items(), ids=str)
def test_the_defaults_of_every_projector(given: tuple[str, str], expected: tuple[str, str, int]) -> None:
    scheme = read_text(_minimal_on(given[0]) + "\n[scheme]\n" + given[1]).scheme
    assert (scheme.projector, scheme.method, scheme.nodes) == expected


def _with(old: str, new: str, extra: str = "") -> Study:
    assert old in MINIMAL_STUDY
    return read_text(MINIMAL_STUDY.replace(old, new) + extra)


GAUSSIAN = 'form = "gaussian"\nstrength = 0.25\nwidth = "uniform(0.8, 1.2)"'
LOGISTIC = 'form = "logistic"\ngain = 10.0\nthreshold = 0.3'


def test_coefficients_mix_numbers_and_laws() -> None:
    study = _with(GAUSSIAN, 'form = "cosine"\ncoefficients = [0.5, "uniform(1, 2)", "log(10)"]')
    kernel = study.equation.kernel.parts[""]
    assert isinstance(kernel, CosineKernel)
    assert kernel.coefficients == (0.5, Uniform(1.0, 2.0), math.log(10))
    assert [entry.path for entry in study.inputs] == ["kernel.coefficients.1"]


def test_rates_with_defaults() -> None:
    assert _with(LOGISTIC, 'form = "step"').equation.rate == StepRate(0.0, 1.0)
    assert _with(LOGISTIC, 'form = "linear"').equation.rate == LinearRate(1.0, 0.0)


def test_a_law_may_be_named_like_a_parameter() -> None:
    """Names of laws are not reserved: beta is a parameter, beta( a law."""
    text = MINIMAL_STUDY.replace("threshold = 0.3", 'threshold = "beta"')
    study = read_text(text + '\n[parameters]\nbeta = "beta(2, 2, 0, 1)"\n')
    assert [entry.path for entry in study.inputs] == ["beta", "kernel.width"]


def test_a_key_beside_a_formula_hides_a_parameter_with_a_warning() -> None:
    text = MINIMAL_STUDY.replace("0.8 * exp", "a * exp").replace("[dynamics]", "a = 0.7\n\n[dynamics]")
    study = read_text(text + "\n[parameters]\na = 2.0\n")
    assert study.warnings == ("drive.a hides the parameter a in this formula",)
    bound = study.equation.bind(study.equation.binding({"kernel.width": np.ones(1)}))
    assert bound.drive.evaluate({"x": np.zeros(1), "t": 0.0}, axes=1).item() == 0.7


def test_the_two_ends_of_a_ring_are_one_point() -> None:
    text = _minimal_on("ring").replace(
        'measure = "active width"\nlevel = 0.3', 'measure = "value"\nat = 10.0'
    )
    study = read_text(text)
    assert study.equation.domain == Ring(20.0)
    assert study.quantities == (Value("width", -10.0, At()),)


def _mean(u: np.ndarray, x: np.ndarray) -> np.ndarray:
    return u.mean(axis=1)


def test_functions_come_after_the_quantities_of_the_text() -> None:
    function = FunctionQuantity("of mine", _mean)
    study = read_text(MINIMAL_STUDY, extra_quantities=(function,))
    assert [quantity.name for quantity in study.quantities] == ["width", "of mine"]
    alone = MINIMAL_STUDY[: MINIMAL_STUDY.index("[[quantity]]")]
    assert read_text(alone, extra_quantities=(function,)).quantities == (function,)
    with pytest.raises(InputError, match="a second quantity"):
        read_text(MINIMAL_STUDY, extra_quantities=(FunctionQuantity("width", _mean),))


NOISE = '\n[noise]\nstrength = "s"\ncorrelation = "gaussian"\ncorrelation_length = "uniform(0.2, 0.4)"\n'
NOISE += '[parameters]\ns = "uniform(0.01, 0.02)"\n'


def test_noise_and_its_inputs() -> None:
    """Inputs of the noise come after those of the rest of the equation, and have its units."""
    study = read_text(MINIMAL_STUDY + NOISE + '\n[units]\nlength = "mm"\ntime = "ms"\nactivity = "mV"\n')
    assert study.equation.noise == Noise(Formula("s"), GaussianCorrelation(Uniform(0.2, 0.4)))
    paths = {entry.path: entry.units for entry in study.inputs}
    assert list(paths) == ["s", "kernel.width", "noise.correlation_length"]
    assert paths["noise.correlation_length"] == "mm"
    assert study.sampling.noise_repeats == 1
    assert read_text(MINIMAL_STUDY).equation.noise is None


@pytest.mark.parametrize(
    ("shape", "entries", "correlation"),
    [
        ("interval", 'correlation = "exponential"\ncorrelation_length = 2', ExponentialCorrelation(2.0)),
        ("ring", 'correlation = "cosine"\ncoefficients = [1, 0.5]', CosineCorrelation((1.0, 0.5))),
        ("interval", 'correlation = "white"', WhiteCorrelation()),
    ],
)
def test_correlations(shape: str, entries: str, correlation: object) -> None:
    text = _minimal_on(shape).replace(LOGISTIC, 'form = "linear"').replace(WIDTH, 'measure = "mean"')
    study = read_text(f"{text}\n[noise]\nstrength = 0.1\n{entries}\n[sampling]\nnoise_repeats = 4\n")
    assert study.equation.noise == Noise(0.1, correlation)  # type: ignore[arg-type]
    assert study.sampling.noise_repeats == 4


WHITE = '\n[noise]\nstrength = 0.1\ncorrelation = "white"\n'
WIDTH = 'measure = "active width"\nlevel = 0.3'
ALLOWED_FOR_WHITE = {
    'measure = "mean"': True,
    'measure = "integral"\nover = [0, 60]\nreduce = "maximum"': True,
    'measure = "spectral power"\nwavenumber = 2': True,
    'measure = "formula"\nformula = "2*u*x - 1"\nin_space = "integral"': True,
    'measure = "formula"\nformula = "u*u"\nin_space = "integral"': False,
    'measure = "formula"\nformula = "abs(u)"\nin_space = "mean"': False,
    'measure = "formula"\nformula = "u"\nin_space = "maximum"': False,
    'measure = "formula"\nformula = "u"\nin_space = "value"\nat = 0': False,
    'measure = "norm"': False,
    'measure = "maximum"': False,
    'measure = "value"\nat = 0': False,
    'measure = "peak position"': False,
    'measure = "time to level"\nlevel = 0.1\nat = 0': False,
    WIDTH: False,
}


@pytest.mark.parametrize(("measure", "allowed"), ALLOWED_FOR_WHITE.items(), ids=str)
def test_what_can_be_asked_of_white_noise(measure: str, allowed: bool) -> None:
    text = _minimal_on("ring").replace(LOGISTIC, 'form = "linear"').replace(WIDTH, measure) + WHITE
    if allowed:
        assert read_text(text).quantities
        return
    with pytest.raises(InputError, match="not a function") as caught:
        read_text(text)
    assert caught.value.key == "quantity.width.measure"


def test_noise_from_python_is_the_noise_of_the_text() -> None:
    text = _minimal_on("ring").replace(WIDTH, 'measure = "mean"') + "\n[sampling]\nnoise_repeats = 2\n"
    for noise, entries in (
        (aleafield.Noise("s / 2", aleafield.GaussianCorrelation(Uniform(0.2, 0.4))),
         'strength = "s / 2"\ncorrelation = "gaussian"\ncorrelation_length = "uniform(0.2, 0.4)"'),
        (aleafield.Noise("s", aleafield.CosineCorrelation((0.0, 1.0))),
         'strength = "s"\ncorrelation = "cosine"\ncoefficients = [0, 1]'),
    ):  # fmt: skip
        written = read_text(f'{text}[parameters]\ns = "uniform(0.1, 0.2)"\n[noise]\n{entries}\n')
        built = aleafield.build_study(
            "Another title",
            domain=Ring(20.0),
            kernel=GaussianKernel(0.25, Uniform(0.8, 1.2)),
            rate=LogisticRate(10.0, 0.3),
            time_constant=10.0,
            duration=60.0,
            quantities=[aleafield.Mean("width")],
            parameters={"s": Uniform(0.1, 0.2)},
            drive="0.8 * exp(-x**2 / 2)",
            noise=noise,
            sampling={"noise_repeats": 2},
        )
        assert built.equation.noise == written.equation.noise
        assert built.digest == written.digest


SENSITIVITY = """
[sensitivity]
indices = ["second", "total", "first"]
wanted_sd = { width = 1, "mean square" = 0.1 }
"""


def test_what_is_asked_about_the_inputs() -> None:
    """Indices in one order, spreads in that of the quantities, however a study writes them."""
    study = read_text(FULL + SENSITIVITY.replace("{ width = 1, ", "{ ").replace("0.1 }", "0.1, width = 1 }"))
    asked = SensitivityRequest(("first", "total", "second"), {"width": 1.0, "mean square": 0.1})
    assert study.sensitivity == asked
    assert list(study.sensitivity.wanted_sd) == ["width", "mean square"]
    assert study.digest == read_text(FULL + SENSITIVITY).digest
    alone = read_text(MINIMAL_STUDY + "\n[sensitivity]\nfix_below = 0.02\n")
    assert alone.sensitivity == SensitivityRequest((), {}, 0.02)


JOINED = """
[dependence]
rank_correlation = [["h", "rate.gain", {correlation}]]
[sensitivity]
indices = ["{index}"]
"""


def test_dependent_inputs_have_shapley_effects() -> None:
    read = read_text(FULL + JOINED.format(correlation=0.4, index="shapley"))
    assert read.sensitivity == SensitivityRequest(("shapley",))
    with pytest.raises(InputError, match="between independent inputs"):
        read_text(FULL + JOINED.format(correlation=0.4, index="first"))


def test_a_correlation_of_nothing_joins_nothing() -> None:
    assert read_text(FULL + JOINED.format(correlation=0, index="first")).sensitivity is not None


def test_sensitivity_from_python_is_that_of_the_text() -> None:
    text = MINIMAL_STUDY.replace("threshold = 0.3", 'threshold = "normal(0.3, 0.02)"')
    chaos = '\n[sampling]\nmethod = "polynomial chaos"\nsamples = 64\n'
    for asked, entries in (
        (aleafield.Sensitivity(["shapley"]), 'indices = ["shapley"]'),
        (aleafield.Sensitivity(["total", "first"], {"width": 0.1}, fix_below=0.02),
         'indices = ["first", "total"]\nwanted_sd = { width = 0.1 }\nfix_below = 0.02'),
    ):  # fmt: skip
        written = read_text(f"{text}{chaos}\n[sensitivity]\n{entries}\n")
        built = aleafield.build_study(
            "Another title",
            domain=Interval(-10.0, 10.0),
            kernel=GaussianKernel(0.25, Uniform(0.8, 1.2)),
            rate=LogisticRate(10.0, Normal(0.3, 0.02)),
            time_constant=10.0,
            duration=60.0,
            quantities=[aleafield.ActiveWidth("width", 0.3)],
            drive="0.8 * exp(-x**2 / 2)",
            sampling={"method": "polynomial chaos", "samples": 64},
            sensitivity=asked,
        )
        assert built.sensitivity == written.sensitivity
        assert built.digest == written.digest
        assert built.sampling == SamplingRequest("polynomial chaos", 64, 1)


SAME_DIGEST = [
    ("title = ", "# a comment\ntitle = "),
    ('"How wide does an evoked bump grow?"', '"Another title"'),
    ("gain = 10.0", "gain    =  1e1   # as before"),
    ("[domain]", 'about = "a remark"\n\n[domain]'),
    ("[dynamics]", '[initial]\nformula = "0"\n\n[dynamics]'),
    ("[dynamics]", "[scheme]\nnodes = 257\n\n[dynamics]"),
    ("[dynamics]", "[report]\nquantiles = [0.5]\nexceed = { width = [1.0] }\n\n[dynamics]"),
]
OTHER_DIGEST = [
    ("gain = 10.0", "gain = 10.5"),
    ("[domain]", "seed = 2\n\n[domain]"),
    ("uniform(0.8, 1.2)", "uniform(0.8, 1.3)"),
    ("exp(-x**2 / 2)", "exp(-x**2 / 3)"),
    ("[dynamics]", "[scheme]\nnodes = 259\n\n[dynamics]"),
    ("[dynamics]", "[sampling]\nsamples = 2048\n\n[dynamics]"),
    ("level = 0.3", "level = 0.31"),
    ("level = 0.3", "level = 0.3\ntime = 30.0"),
    ("level = 0.3", "level = 0.3\n" + NOISE),
    ("[dynamics]", '[sampling]\nmethod = "polynomial chaos"\n\n[dynamics]'),
    ("[dynamics]", '[sensitivity]\nindices = ["first"]\n\n[dynamics]'),
]


@pytest.mark.parametrize(("old", "new"), SAME_DIGEST)
def test_what_does_not_change_the_digest(old: str, new: str) -> None:
    assert _with(old, new).digest == read_text(MINIMAL_STUDY).digest


@pytest.mark.parametrize(("old", "new"), OTHER_DIGEST)
def test_what_changes_the_digest(old: str, new: str) -> None:
    assert _with(old, new).digest != read_text(MINIMAL_STUDY).digest


def test_a_measured_file_is_part_of_the_digest(tmp_path: Path) -> None:
    study = tmp_path / "study.toml"
    law = 'width = \'sampled("widths.csv", "width")\''
    study.write_text(MINIMAL_STUDY.replace('width = "uniform(0.8, 1.2)"', law))
    (tmp_path / "widths.csv").write_text("width\n0.9\n1.1\n")
    first = read_study(study)
    assert first.source.data_files == {"widths.csv": b"width\n0.9\n1.1\n"}
    (tmp_path / "widths.csv").write_text("width\n0.9\n1.2\n")
    assert read_study(study).digest != first.digest


def test_a_byte_order_mark_and_foreign_line_ends_do_no_harm(tmp_path: Path) -> None:
    study = tmp_path / "study.toml"
    text = "\ufeff" + MINIMAL_STUDY.replace("\n", "\r\n")
    study.write_bytes(text.encode("utf-8"))
    read = read_study(study)
    assert read.source.text == text
    assert read.digest == read_text(MINIMAL_STUDY).digest
    assert read.source.lines["domain.shape"] == 4


def test_shipped_studies_are_read_without_warnings() -> None:
    for path in sorted((ROOT / "studies").glob("*.toml")):
        assert read_study(path).title


IMPOSSIBLE = MINIMAL_STUDY.replace('width = "uniform(0.8, 1.2)"', 'width = "1 - 2*h"').replace(
    "[domain]", '[parameters]\nh = "uniform(0.2, 0.501)"\n\n[domain]'
)


def test_impossible_samples_are_named_with_their_inputs() -> None:
    """The first sample with h >= 0.5, found here from the design itself."""
    study = read_text(IMPOSSIBLE)
    design = Design(study.inputs, study.dependence, "quasi-monte carlo", study.seed)
    count = 16 * 1024
    drawn = design.values(np.arange(count, dtype=np.int64))["h"]
    first = int(np.flatnonzero(drawn >= 0.5)[0])
    for block in (64, 4096):
        with pytest.raises(InputError) as caught:
            refuse_impossible_samples(study, design, count, block)
        assert f"sample {first} gives {float(1 - 2 * drawn[first])!r}" in str(caught.value)
        assert f"h = {float(drawn[first])!r}" in str(caught.value)
        assert caught.value.key == "kernel.width"
    refuse_impossible_samples(study, design, first)


def test_possible_samples_pass() -> None:
    study = read_text(FULL)
    design = Design(study.inputs, study.dependence, "monte carlo", study.seed)
    refuse_impossible_samples(study, design, 1000, block=128)
