"""Laws against scipy.stats, closed forms and adaptive quadrature."""

from __future__ import annotations

import math
import pickle
import subprocess
import sys
from pathlib import Path
from typing import Any, cast

import numpy as np
import pytest
from scipy import integrate, stats

from aleafield.errors import InputError
from aleafield.formula import LAW_NAMES
from aleafield.randomness.laws import (
    LAWS,
    Beta,
    Discrete,
    Exponential,
    Gamma,
    Law,
    LogNormal,
    LogUniform,
    Normal,
    Sampled,
    Triangular,
    TruncatedNormal,
    Uniform,
    parse_law,
)

KEY = "rate.gain"

CONTINUOUS: list[tuple[str, Law, Any]] = [
    ("uniform(0.8, 1.2)", Uniform(0.8, 1.2), stats.uniform(0.8, 1.2 - 0.8)),
    ("normal(0.3, 0.02)", Normal(0.3, 0.02), stats.norm(0.3, 0.02)),
    ("truncated_normal(1, 0.5, 0.2, 3)", TruncatedNormal(1, 0.5, 0.2, 3), stats.truncnorm(-1.6, 4, 1, 0.5)),
    ("truncated_normal(0, 1, 3, 9)", TruncatedNormal(0, 1, 3, 9), stats.truncnorm(3, 9)),
    ("truncated_normal(0, 1, -9, -3)", TruncatedNormal(0, 1, -9, -3), stats.truncnorm(-9, -3)),
    (
        "truncated_normal(1, 0.2, 0.1, 1e6)",
        TruncatedNormal(1, 0.2, 0.1, 1e6),
        stats.truncnorm(-4.5, 5e6, 1, 0.2),
    ),
    ("lognormal(log(10), 0.1)", LogNormal(math.log(10), 0.1), stats.lognorm(0.1, scale=10)),
    ("loguniform(0.01, 10)", LogUniform(0.01, 10), stats.loguniform(0.01, 10)),
    ("triangular(-1, 0.5, 1)", Triangular(-1, 0.5, 1), stats.triang(0.75, -1, 2)),
    ("triangular(-1, -1, 1)", Triangular(-1, -1, 1), stats.triang(0, -1, 2)),
    ("triangular(-1, 1, 1)", Triangular(-1, 1, 1), stats.triang(1, -1, 2)),
    ("beta(2, 3.5, -1, 4)", Beta(2, 3.5, -1, 4), stats.beta(2, 3.5, -1, 5)),
    ("beta(0.4, 0.6, 0, 1)", Beta(0.4, 0.6, 0, 1), stats.beta(0.4, 0.6)),
    ("gamma(2.5, 0.4)", Gamma(2.5, 0.4), stats.gamma(2.5, scale=0.4)),
    ("exponential(3)", Exponential(3), stats.expon(scale=3)),
]


@pytest.mark.parametrize(("text", "law", "known"), CONTINUOUS, ids=[row[0] for row in CONTINUOUS])
class TestContinuousLaws:
    """`scipy.stats` has the same laws from other code."""

    def test_distribution_function_and_its_inverse(self, text: str, law: Law, known: Any) -> None:
        p = np.concatenate([[1e-12, 1e-7], np.linspace(0.001, 0.999, 501), [1 - 1e-7]])
        np.testing.assert_allclose(law.ppf(p), known.ppf(p), rtol=1e-9, atol=1e-12)
        x = known.ppf(p)
        np.testing.assert_allclose(law.cdf(x), known.cdf(x), rtol=1e-9, atol=1e-15)
        # x is rounded to eps |x|, which moves its probability by the density times that; 16 such roundings.
        rounding = np.finfo(float).eps * (1 + np.abs(x) * known.pdf(x))
        assert (np.abs(law.cdf(law.ppf(p)) - p) <= 16 * rounding).all()
        assert law.probability_below(float(x[200])) == pytest.approx(float(known.cdf(x[200])), rel=1e-9)

    def test_moments_and_support(self, text: str, law: Law, known: Any) -> None:
        assert law.mean == pytest.approx(known.mean(), rel=1e-9)
        assert law.sd == pytest.approx(known.std(), rel=1e-9)
        assert law.support == pytest.approx(known.support())
        low, high = law.support
        if math.isfinite(low):
            assert law.cdf(low - 1) == 0 == law.cdf(low)
        if math.isfinite(high):
            assert law.cdf(high) == 1 == law.cdf(high + 1)
        extreme = law.ppf(np.array([2.0**-53, 1 - 2.0**-53]))
        assert low <= extreme[0] < extreme[1] <= high
        assert np.isfinite(extreme).all()

    def test_text_reads_back_as_an_equal_law(self, text: str, law: Law, known: Any) -> None:
        assert parse_law(text, KEY) == law
        assert parse_law(law.text, KEY) == law
        assert pickle.loads(pickle.dumps(law)) == law
        assert len({law, parse_law(law.text, KEY)}) == 1
        assert law.continuous


def test_every_law_is_tested_and_named_in_the_language() -> None:
    assert LAWS.keys() == LAW_NAMES
    assert {row[1].name for row in CONTINUOUS} | {"discrete", "sampled"} == LAW_NAMES


@pytest.mark.parametrize(
    ("low", "high"), [(-2.0, 3.0), (6.0, 7.0), (30.0, 31.0), (-40.0, -39.0), (5.0, 50.0)]
)
def test_truncated_normal_far_in_the_tail(low: float, high: float) -> None:
    """Moments and probabilities by adaptive quadrature of the density, scaled by its largest value."""
    peak = min(max(0.0, low), high)
    reach = peak + np.array([-1, 1]) * min(12.0, 60.0 / max(abs(peak), 1e-9))

    def integral(power: int, end: float) -> float:
        return float(
            integrate.quad(
                lambda z: (z - peak) ** power * math.exp((peak - z) * (peak + z) / 2),
                max(low, reach[0]),
                min(end, high, reach[1]),
                epsabs=0,
                epsrel=1e-12,
                limit=200,
            )[0]
        )

    mass = integral(0, high)
    offset = integral(1, high) / mass
    law = TruncatedNormal(0, 1, low, high)
    assert law.mean == pytest.approx(peak + offset, rel=1e-12)
    assert law.sd == pytest.approx(math.sqrt(integral(2, high) / mass - offset**2), rel=1e-8)
    for p in (0.1, 0.5, 0.9):
        median = float(law.ppf(np.array(p)))
        assert integral(0, median) / mass == pytest.approx(p, rel=1e-9)
        assert float(law.cdf(median)) == pytest.approx(p, rel=1e-9)


@pytest.mark.parametrize("ratio", [1 + 1e-7, 1.04, 1.06, 2.5, 1e30, 1e250])
def test_loguniform_moments_at_any_width(ratio: float) -> None:
    """Integrals of the value and of the squared deviation over the logarithm, by Gauss-Legendre on panels.

    The reference itself knows the logarithm of a ratio near 1 to eps / (ratio - 1) relative.
    """
    law = LogUniform(2.0, 2.0 * ratio)
    span = math.log1p(ratio - 1)
    nodes, weights = np.polynomial.legendre.leggauss(40)
    panels = np.linspace(0, 1, 200 if span > 1 else 2)
    share = (panels[:-1, None] + np.diff(panels)[:, None] * (nodes + 1) / 2).ravel()
    mass = (np.diff(panels)[:, None] * weights / 2).ravel()
    growth = np.expm1(span * share)
    mean = float(mass @ growth)
    sd = math.sqrt(float(mass @ (growth - mean) ** 2)) if ratio < 1e100 else None
    tolerance = max(1e-10, 4e-16 / (ratio - 1))
    assert law.mean == pytest.approx(2 * (1 + mean), rel=1e-10)
    if sd is not None:
        assert law.sd == pytest.approx(2 * sd, rel=tolerance)
    else:
        assert law.sd == pytest.approx(2 * ratio / math.sqrt(2 * span), rel=1e-2)


class TestDiscrete:
    LAW = Discrete([3, 1, 2, 1, 9], [2.0, 1.0, 4.0, 1.0, 0.0])

    def test_step_inverse(self) -> None:
        """Masses 1/4, 1/2, 1/4 at 1, 2, 3: the smallest value whose distribution function reaches p."""
        p = np.array([1e-12, 0.25, 0.25 + 1e-12, 0.75, 0.75 + 1e-12, 1 - 2.0**-53])
        np.testing.assert_array_equal(self.LAW.ppf(p), [1, 1, 2, 2, 3, 3])

    def test_probabilities(self) -> None:
        np.testing.assert_array_equal(
            self.LAW.cdf(np.array([0.5, 1, 1.5, 2, 3, 9])), [0, 0.25, 0.25, 0.75, 1, 1]
        )
        assert [self.LAW.probability_below(x) for x in (1, 1.5, 2, 3, 4)] == [0, 0.25, 0.25, 0.75, 1]

    def test_moments(self) -> None:
        assert self.LAW.mean == 2.0
        assert self.LAW.sd == pytest.approx(math.sqrt(0.5), rel=1e-15)
        assert self.LAW.support == (1.0, 3.0)
        assert not self.LAW.continuous

    def test_text(self) -> None:
        text = "discrete([3.0, 1.0, 2.0, 1.0, 9.0], [2.0, 1.0, 4.0, 1.0, 0.0])"
        assert self.LAW.text == text
        assert parse_law(text, KEY) == self.LAW
        assert parse_law("discrete([-1, 2*pi], [1/3, 2/3])", KEY) == Discrete(
            [-1, 2 * math.pi], [1 / 3, 2 / 3]
        )
        assert pickle.loads(pickle.dumps(self.LAW)) == self.LAW

    def test_weights_that_round_still_reach_the_last_value(self) -> None:
        law = Discrete(list(range(10)), [0.1] * 10)
        np.testing.assert_array_equal(law.ppf((np.arange(10) + 0.5) / 10), np.arange(10))
        assert law.ppf(np.array(1 - 2.0**-53)) == 9

    def test_a_long_list_is_read_quickly(self) -> None:
        values = [k + 0.5 for k in range(4000)]
        assert parse_law(f"discrete({values}, {[1.0] * 4000})", KEY) == Discrete(values, [1.0] * 4000)


class TestSampled:
    @pytest.fixture
    def folder(self, tmp_path: Path) -> Path:
        (tmp_path / "data").mkdir()
        text = '\ufeffgain, tau ,"the, width"\n2.5,10,1\n-1e1, 20 ,2\n\n4,30,3\n4,40,4\n'
        (tmp_path / "data" / "cells.csv").write_text(text, encoding="utf-8")
        return tmp_path

    def test_columns(self, folder: Path) -> None:
        law = parse_law('sampled("data/cells.csv", "gain")', KEY, folder)
        assert isinstance(law, Sampled)
        assert law.values == (2.5, -10.0, 4.0, 4.0)
        assert law.text == 'sampled("data/cells.csv", "gain")'
        tau = parse_law(" sampled( 'data/cells.csv' , 'tau' ) ", KEY, folder)
        assert isinstance(tau, Sampled)
        assert tau.values == (10.0, 20.0, 30.0, 40.0)
        width = parse_law("sampled('data/cells.csv', 'the, width')", KEY, folder)
        assert isinstance(width, Sampled)
        assert width.values == (1.0, 2.0, 3.0, 4.0)
        assert not law.continuous

    def test_step_inverse_and_moments(self, folder: Path) -> None:
        """numpy's "inverted_cdf" quantile is the same definition."""
        law = Sampled(str(folder / "data" / "cells.csv"), "gain")
        p = np.array([1e-9, 0.25, 0.2500001, 0.5, 0.7, 0.75, 0.76, 1 - 1e-9])
        np.testing.assert_array_equal(law.ppf(p), np.quantile(law.values, p, method="inverted_cdf"))
        assert law.mean == pytest.approx(np.mean(law.values), rel=1e-15)
        assert law.sd == pytest.approx(np.std(law.values), rel=1e-15)
        assert law.support == (-10.0, 4.0)
        np.testing.assert_array_equal(law.cdf(np.array([-11, -10, 3, 4])), [0, 0.25, 0.5, 1])
        assert [law.probability_below(x) for x in (-10, 2.5, 4, 5)] == [0, 0.25, 0.5, 1]

    def test_a_pickled_law_needs_its_file_no_more(self, folder: Path) -> None:
        law = Sampled(str(folder / "data" / "cells.csv"), "gain")
        stored = pickle.dumps(law)
        (folder / "data" / "cells.csv").unlink()
        assert pickle.loads(stored) == law

    @pytest.mark.parametrize(
        ("content", "column", "found"),
        [
            ("", "gain", "cells.csv is empty"),
            ("\n\n", "gain", "cells.csv is empty"),
            ("gain\n", "gain", "no rows below its header"),
            ("gain,tau\n1,2\n", "gian", "has no column 'gian'"),
            ("gain;tau\n1;2\n", "gain", "separated by commas"),
            ("gain,gain\n1,2\n", "gain", "has 2 columns named 'gain'"),
            ("gain\n1\nabc\n", "gain", "'abc' in column 'gain', line 3"),
            ("gain,tau\n1,2\n\n3\n", "tau", "'' in column 'tau', line 4"),
            ("gain\n1\nnan\n", "gain", "'nan' in column 'gain', line 3"),
            ("gain\ninf\n", "gain", "'inf' in column 'gain', line 2"),
            ("gain\n1_0\n", "gain", "'1_0' in column 'gain', line 2"),
            ('gain\n"1,5"\n', "gain", "'1,5' in column 'gain', line 2"),
            ('gain\n"1\n', "gain", "cannot be read"),
            ("gain\n1\0\n", "gain", "line 2|cannot be read"),
        ],
    )
    def test_unusable_files(self, tmp_path: Path, content: str, column: str, found: str) -> None:
        (tmp_path / "cells.csv").write_text(content)
        with pytest.raises(InputError, match=found) as caught:
            parse_law(f'sampled("cells.csv", "{column}")', KEY, tmp_path)
        assert caught.value.key == KEY

    def test_unusable_places(self, folder: Path) -> None:
        with pytest.raises(InputError, match="does not exist") as caught:
            parse_law('sampled("data/cell.csv", "gain")', KEY, folder)
        assert caught.value.nearest == "data/cells.csv"
        for path in ("data", "data/cells.csv/x", "a" * 5000, "a\\0b"):
            with pytest.raises(InputError, match=r"cannot be read|does not exist"):
                parse_law(f'sampled("{path}", "gain")', KEY, folder)
        (folder / "image.csv").write_bytes(bytes(range(256)))
        with pytest.raises(InputError, match="cannot be read"):
            parse_law('sampled("image.csv", "gain")', KEY, folder)

    def test_the_nearest_column_is_named(self, folder: Path) -> None:
        with pytest.raises(InputError, match="its columns are 'gain', 'tau', 'the, width'") as caught:
            parse_law('sampled("data/cells.csv", "gian")', KEY, folder)
        assert caught.value.nearest == "gain"


@pytest.mark.parametrize(
    "text",
    [
        "0.5",
        "h",
        "beta",
        "beta * 2",
        "uniform(0, 1) + 1",
        "exp(1)",
        "(uniform)(0, 1)",
        "uniform",
        "",
        "Uniform(0, 1)",
    ],
)
def test_what_is_not_one_call_of_a_law_is_no_law(text: str) -> None:
    assert parse_law(text, KEY) is None


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("uniform(1.2, 0.8)", "low must be below high"),
        ("uniform(1, 1)", "a certain number is written without a law"),
        ("uniform(-1e308, 1e308)", "both must be finite"),
        ("uniform(1)", "write uniform\\(low, high\\)"),
        ("uniform(0, 1, 2)", "3 given to uniform"),
        ("uniform()", "0 given to uniform"),
        ("uniform(0 1)", "write uniform\\(low, high\\)"),
        ("uniform(0, 1", "write uniform\\(low, high\\)"),
        ("uniform(low=0, high=1)", "in their order: uniform\\(low, high\\)"),
        ("uniform(*a)", "in their order"),
        ("uniform(0, h)", "the name h in 'h'"),
        ("uniform(0, [1, 2])", "lists stand only in discrete"),
        ("uniform(0, 'a')", "words stand only in sampled"),
        ("uniform(0, normal(0, 1))", "name it in \\[parameters\\]"),
        ("uniform(0, a.b)", "attribute"),
        ("uniform(0, 1e999)", "1.8e308"),
        ("uniform(0, True)", "write 1"),
        ("normal(0, 0)", "sd must be positive: normal\\(mean, sd\\)"),
        ("normal(0, -1)", "sd = -1.0"),
        ("normal(0/0, 1)", "a finite number is needed"),
        ("truncated_normal(0, 1, 2, 1)", "low must be below high"),
        ("truncated_normal(0, -1, 1, 2)", "sd must be positive"),
        ("truncated_normal(0, 1, 1e200, 1e201)", "low and high must lie near the mean"),
        ("lognormal(0, 0)", "sigma must be positive"),
        ("lognormal(800, 1)", "both must be finite"),
        ("loguniform(0, 1)", "low must be positive"),
        ("loguniform(-1, 1)", "low must be positive"),
        ("loguniform(2, 1)", "low must be below high"),
        ("triangular(0, 2, 1)", "the mode must lie between low and high"),
        ("triangular(1, 1, 1)", "low must be below high"),
        ("beta(0, 1, 0, 1)", "a must be positive"),
        ("beta(1, -1, 0, 1)", "b must be positive"),
        ("beta(1, 1)", "beta\\(a, b, low, high\\)"),
        ("gamma(0, 1)", "shape must be positive"),
        ("gamma(1, 0)", "scale must be positive"),
        ("exponential(0)", "mean must be positive"),
        ("exponential(-3)", "mean = -3.0"),
        ("discrete([1, 2], [1])", "2 values and 1 weights"),
        ("discrete([1, 2], [1, -1])", "weights are not negative"),
        ("discrete([1, 2], [0, 0])", "one weight at least is positive"),
        ("discrete([], [])", "values is a list of numbers"),
        ("discrete(1, 2)", "without its lists"),
        ("discrete([1, 2])", "1 given to discrete"),
        ("discrete([1, 'a'], [1, 1])", "words stand only in sampled"),
        ("discrete([1, h], [1, 1])", "the name h"),
        ("discrete([x for x in y], [1])", "without its lists"),
        ("sampled(a, b)", "without its quoted words"),
        ("sampled('', 'b')", "without its quoted words"),
        ("sampled('a.csv')", "1 given to sampled"),
        ("uniform(" * 300 + ")" * 300, "write uniform"),
        ("discrete([" + "1, " * 40000 + "], [1])", "put the values in a file"),
    ],
)
def test_unusable_laws_say_what_would_be_right(text: str, message: str) -> None:
    with pytest.raises(InputError, match=message) as caught:
        parse_law(text, KEY)
    assert caught.value.key == KEY
    assert len(str(caught.value)) < 400


@pytest.mark.parametrize(
    ("build", "message"),
    [
        (lambda: Uniform(1, 0), "low must be below high"),
        (lambda: Uniform(0, math.nan), "high is finite"),
        (lambda: Normal(0, math.inf), "sd is finite"),
        (lambda: Normal(cast(Any, "0"), 1), "mean is a number"),
        (lambda: Normal(True, 1), "mean is a number"),
        (lambda: Discrete(cast(Any, 1), cast(Any, 2)), "values is a list of numbers"),
        (lambda: Discrete([1, math.nan], [1, 1]), r"values\[1\] is finite"),
        (lambda: Sampled("cells.csv", "a", [1, math.inf]), r"values\[1\] is finite"),
        (lambda: Sampled("no such file.csv", "a"), "does not exist"),
    ],
)
def test_laws_built_from_python_are_checked_alike(build: Any, message: str) -> None:
    with pytest.raises(InputError, match=message):
        build()


def test_numbers_of_numpy_are_numbers() -> None:
    assert Uniform(np.float64(0), cast(Any, np.int64(1))) == Uniform(0.0, 1.0)
    assert Discrete(cast(Any, np.array([1, 2])), [0.5, 0.5]).text == "discrete([1.0, 2.0], [0.5, 0.5])"
    assert Uniform(np.float64(0.1), 1).text == "uniform(0.1, 1.0)"


def test_laws_load_no_heavy_library() -> None:
    """Start-up time: reading a study must not wait for scipy's statistics."""
    check = "import sys, aleafield.randomness.laws as l; l.Uniform(0, 1); print('scipy' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", check], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"
