"""Designs: one contract for both methods, the error of scrambled nets, and dependent inputs.

Tolerances of random comparisons are stated in standard deviations of the compared number; 4.9 of them are
passed once in a million runs. Seeds are fixed.
"""

from __future__ import annotations

import math
import pickle

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import stats

from aleafield.errors import InputError
from aleafield.randomness.copula import Copula
from aleafield.randomness.design import Design, Method
from aleafield.randomness.inputs import Dependence, Input
from aleafield.randomness.laws import Exponential, Law, Normal, Sampled, Triangular, Uniform
from aleafield.randomness.streams import generator

FALSE_ALARM = 4.9

INDEPENDENT = Dependence()


def cube(method: Method, seed: int, dimension: int = 4, dependence: Dependence = INDEPENDENT) -> Design:
    """A design of uniform inputs on (0, 1), so that its values are points of the cube."""
    inputs = [Input(f"p{k}", Uniform(0, 1)) for k in range(dimension)]
    return Design(inputs, dependence, method, seed)


def product_of_factors(points: NDArray[np.float64]) -> NDArray[np.float64]:
    """prod(1 + (x_i - 1/2)): mean 1, variance (13/12)^d - 1."""
    product: NDArray[np.float64] = np.prod(0.5 + points, axis=1)
    return product


PRODUCT_VARIANCE = (13 / 12) ** 4 - 1


class SamplerContract:
    """What every method of sampling promises; derived classes say which method."""

    method: Method

    def test_the_seed_decides_and_nothing_else(self) -> None:
        indices = np.arange(100)
        first = cube(self.method, 7).unit_points(indices)
        np.testing.assert_array_equal(first, cube(self.method, 7).unit_points(indices))
        assert not np.any(first == cube(self.method, 8).unit_points(indices))

    def test_any_part_in_any_order_is_the_same_to_the_bit(self) -> None:
        whole = cube(self.method, 3).unit_points(np.arange(4096))
        design = cube(self.method, 3)
        shuffled = generator(1, "test").permutation(4096)
        np.testing.assert_array_equal(design.unit_points(shuffled), whole[shuffled])
        for start, stop in ((4000, 4096), (0, 8), (8, 24), (1, 2), (2048, 3500), (0, 4096)):
            np.testing.assert_array_equal(design.unit_points(np.arange(start, stop)), whole[start:stop])
        scattered = np.array([4095, 0, 17, 17, 2048])
        np.testing.assert_array_equal(
            pickle.loads(pickle.dumps(design)).unit_points(scattered), whole[scattered]
        )

    def test_samples_far_down_the_sequence_are_the_same_to_the_bit(self) -> None:
        design = cube(self.method, 3)
        far = 16 * 70_000 + np.arange(-40, 40)
        apart = np.concatenate([far, [5]])
        np.testing.assert_array_equal(design.unit_points(apart)[:-1], cube(self.method, 3).unit_points(far))

    def test_values_are_the_same_to_the_bit_for_every_chunk_width(self) -> None:
        dependence = Dependence((("p0", "p1", 0.4), ("p1", "p3", -0.3)))
        whole = cube(self.method, 3, dependence=dependence).values(np.arange(512))
        design = cube(self.method, 3, dependence=dependence)
        for width in (8, 64, 248):
            parts = [
                design.values(np.arange(start, min(start + width, 512))) for start in range(0, 512, width)
            ]
            for path, expected in whole.items():
                np.testing.assert_array_equal(np.concatenate([part[path] for part in parts]), expected)

    @pytest.mark.parametrize("dimension", [0, 1, 3, 6])
    def test_shapes(self, dimension: int) -> None:
        design = cube(self.method, 2, dimension)
        points = design.unit_points(np.arange(40))
        assert points.shape == (40, 2 * dimension)
        assert ((points > 0) & (points < 1)).all()
        assert design.unit_points(np.arange(0)).shape == (0, 2 * dimension)
        values = design.values(np.arange(40))
        assert list(values) == [f"p{k}" for k in range(dimension)]
        for k, value in enumerate(values.values()):
            np.testing.assert_array_equal(value, points[:, k])

    def test_unbiased_on_a_known_integral(self) -> None:
        """The first points of all parts under many seeds: independent points, whatever the method."""
        parts = np.arange(16)
        points = np.concatenate([cube(self.method, seed).unit_points(parts) for seed in range(256)])
        for half in (points[:, :4], points[:, 4:]):
            deviation = math.sqrt(PRODUCT_VARIANCE / len(half))
            assert abs(product_of_factors(half).mean() - 1) < FALSE_ALARM * deviation
        for column in points.T:
            assert stats.kstest(column, "uniform").pvalue > 1e-6
        correlation = np.corrcoef(points.T) - np.eye(8)
        assert np.abs(correlation).max() < 5.5 / math.sqrt(len(points))  # the largest of 28 pairs

    @pytest.mark.parametrize("indices", [[-1], [[1, 2]]])
    def test_other_indices_are_refused(self, indices: list[int]) -> None:
        with pytest.raises(ValueError, match="not negative"):
            cube(self.method, 2).unit_points(np.array(indices))


class TestMonteCarlo(SamplerContract):
    method: Method = "monte carlo"

    def test_mean_square_error(self) -> None:
        """Means of N points have variance V / N; over 1,000 blocks it is known to sqrt(2 / 1000) relative."""
        size, blocks = 64, 1000
        points = cube(self.method, 11).unit_points(np.arange(size * blocks))[:, :4]
        means = product_of_factors(points).reshape(blocks, size).mean(axis=1)
        expected = PRODUCT_VARIANCE / size
        assert np.mean((means - 1) ** 2) == pytest.approx(expected, rel=FALSE_ALARM * math.sqrt(2 / blocks))


class TestQuasiMonteCarlo(SamplerContract):
    method: Method = "quasi-monte carlo"

    @pytest.mark.parametrize("exponent", [2, 4, 8, 11])
    def test_each_scrambling_is_a_net(self, exponent: int) -> None:
        """Sobol' 1967: of the first 2^m points every interval of length 2^-m holds one, in every coordinate,
        and for the first two coordinates every elementary rectangle of area 2^-m holds one."""
        count = 2**exponent
        points = cube(self.method, 5, 3).unit_points(np.arange(16 * count))
        for scrambling in range(16):
            net = points[scrambling::16]
            np.testing.assert_array_equal(
                np.sort(np.floor(net * count), axis=0), np.tile(np.arange(count)[:, None], 6)
            )
            for first in range(exponent + 1):
                cells = np.floor(net[:, 0] * 2**first) * 2 ** (exponent - first) + np.floor(
                    net[:, 1] * 2 ** (exponent - first)
                )
                assert len(np.unique(cells)) == count

    def test_scramblings_are_independent(self) -> None:
        """The first points under many seeds; the largest of 120 correlations of two scramblings."""
        first = np.array([cube(self.method, seed, 1).unit_points(np.arange(16))[:, 0] for seed in range(400)])
        correlation = np.corrcoef(first.T) - np.eye(16)
        assert np.abs(correlation).max() < 5.5 / math.sqrt(400)

    def test_mean_square_error_of_a_linear_function(self) -> None:
        """Owen 1997, "Scrambled net variance for integrals of smooth functions" (from memory): f(x) = x in
        one dimension has 1 / (12 N^3). Random matrices have the same mean square but a heavy tail, so the
        check is at N = 4, where the spread of the squares themselves gives a tolerance."""
        count = 4
        indices = np.arange(16 * count)
        points = [cube(self.method, seed, 1).unit_points(indices)[:, 0] for seed in range(256)]
        errors = np.concatenate([part.reshape(count, 16).mean(axis=0) - 0.5 for part in points])
        squares = errors**2 * 12 * count**3
        assert squares.mean() == pytest.approx(1, abs=FALSE_ALARM * squares.std() / math.sqrt(len(squares)))
        assert squares.std() / math.sqrt(len(squares)) < 0.05
        assert np.abs(errors).max() <= 0.5 / count

    def test_error_falls_faster_than_plain_sampling(self) -> None:
        """Product of four factors: root-mean-square errors 4.3e-3, 1.2e-3, 1.1e-4, 2.3e-5 at N = 2^6 .. 2^12
        were measured with nested scrambling; heavy tails leave a factor 2.5 over 64 scramblings."""
        exponents = [6, 8, 10, 12]
        values = [
            product_of_factors(cube(self.method, seed).unit_points(np.arange(16 * 2**12))[:, :4]).reshape(
                -1, 16
            )
            for seed in range(4)
        ]
        errors = [
            math.sqrt(np.mean([(value[: 2**m].mean(axis=0) - 1) ** 2 for value in values])) for m in exponents
        ]
        for error, known in zip(errors, [4.3e-3, 1.2e-3, 1.1e-4, 2.3e-5], strict=True):
            assert known / 2.5 < error < 2.5 * known
        slope = np.polyfit(np.array(exponents) * math.log(2), np.log(errors), 1)[0]
        assert -1.6 < slope < -1.0

    def test_t_intervals_over_scramblings_cover(self) -> None:
        """95 % intervals of Student's t hold the mean in at least 95 % of 300 seeds, less 3.3 deviations."""
        held = []
        for seed in range(300):
            means = product_of_factors(cube(self.method, seed).unit_points(np.arange(16 * 32))[:, :4])
            means = means.reshape(32, 16).mean(axis=0)
            half = stats.t.ppf(0.975, 15) * means.std(ddof=1) / 4
            held.append(abs(means.mean() - 1) <= half)
        assert np.mean(held) >= 0.95 - 3.3 * math.sqrt(0.95 * 0.05 / 300)


LAWS: list[Law] = [Normal(1, 0.2), Exponential(3), Triangular(0, 1, 5)]
SPEARMAN = (("p0", "p1", 0.6), ("p1", "p2", -0.35), ("p0", "p2", 0.1))


class TestDependence:
    @pytest.mark.parametrize("method", ["monte carlo", "quasi-monte carlo"])
    def test_rank_correlations_are_reached_and_laws_kept(self, method: Method) -> None:
        """Spearman's correlation of N samples has a deviation below 1.1 / sqrt(N)."""
        count = 16 * 2048
        inputs = [Input(f"p{k}", law) for k, law in enumerate(LAWS)]
        values = Design(inputs, Dependence(SPEARMAN), method, 4).values(np.arange(count))
        for first, second, wanted in SPEARMAN:
            reached = stats.spearmanr(values[first], values[second]).statistic
            assert reached == pytest.approx(wanted, abs=FALSE_ALARM * 1.1 / math.sqrt(count))
        for k, law in enumerate(LAWS):
            assert stats.kstest(law.cdf(values[f"p{k}"]), "uniform").pvalue > 1e-6

    def test_latent_correlation(self) -> None:
        """Spearman's of Gaussian numbers of correlation c, (6/pi) arcsin(c/2), to ten digits."""
        pairs = (("a", "b", 0.4825837395), ("c", "b", 0.5819201042))
        latent = Copula(["a", "b", "c"], pairs).latent
        np.testing.assert_allclose(latent, [[1, 0.5, 0], [0.5, 1, 0.6], [0, 0.6, 1]], atol=1e-10)

    def test_inputs_that_are_not_named_stay_as_they_are(self) -> None:
        free = cube("monte carlo", 1).values(np.arange(64))
        tied = cube("monte carlo", 1, dependence=Dependence((("p1", "p3", 0.5),))).values(np.arange(64))
        for path in ("p0", "p1", "p2"):
            np.testing.assert_array_equal(free[path], tied[path])
        assert not np.any(free["p3"] == tied["p3"])

    @pytest.mark.parametrize(
        ("pairs", "message"),
        [
            ((("p0", "pp1", 0.5),), "'pp1' is no uncertain input; the inputs are p0, p1, p2, p3 .*'p1'"),
            ((("p0", "p0", 0.5),), "'p0' paired with itself"),
            ((("p0", "p1", 0.5), ("p1", "p0", 0.4)), "'p1' and 'p0' paired twice"),
            ((("p0", "p1", 1.0),), "strictly between -1 and 1"),
            ((("p0", "p1", -1.5),), "strictly between -1 and 1"),
            ((("p0", "p1", math.nan),), "strictly between -1 and 1"),
            (
                (("p0", "p1", 0.9), ("p1", "p2", 0.9), ("p0", "p2", -0.9)),
                "p0 and p1: 0.9, .*positive definite",
            ),
            # Spearman's matrix has the eigenvalue 0.02 here, the latent one -0.015.
            ((("p0", "p1", -0.49), ("p1", "p2", -0.49), ("p0", "p2", -0.49)), r"the eigenvalue -0\.015"),
        ],
    )
    def test_impossible_correlations(self, pairs: tuple[tuple[str, str, float], ...], message: str) -> None:
        with pytest.raises(InputError, match=message) as caught:
            cube("monte carlo", 1, dependence=Dependence(pairs))
        assert caught.value.key == "dependence.rank_correlation"


class TestColumnsOfOneFile:
    ROWS = generator(5, "test rows").normal(size=(50, 3)).round(3)

    def design(self, together: bool, pairs: tuple[tuple[str, str, float], ...] = ()) -> Design:
        columns = [Sampled("cells.csv", f"c{k}", tuple(self.ROWS[:, k])) for k in range(3)]
        other = Sampled("other.csv", "c0", tuple(self.ROWS[::-1, 0]))
        inputs = [Input(f"p{k}", law) for k, law in enumerate([columns[0], other, *columns[1:]])]
        return Design(inputs, Dependence(pairs, together), "quasi-monte carlo", 6)

    def test_whole_rows_are_drawn(self) -> None:
        values = self.design(True).values(np.arange(16 * 64))
        drawn = np.column_stack([values["p0"], values["p2"], values["p3"]])
        rows = {tuple(row) for row in self.ROWS}
        assert {tuple(row) for row in drawn} == rows
        free = self.design(False).values(np.arange(16 * 64))
        np.testing.assert_array_equal(values["p0"], free["p0"])
        np.testing.assert_array_equal(values["p1"], free["p1"])
        assert not {tuple(row) for row in np.column_stack([free["p0"], free["p2"], free["p3"]])} <= rows

    def test_rows_follow_the_correlation_of_the_first_column(self) -> None:
        values = self.design(True, (("p0", "p1", 0.8),)).values(np.arange(16 * 64))
        assert {*zip(values["p0"], values["p2"], strict=True)} <= {tuple(row) for row in self.ROWS[:, :2]}
        assert stats.spearmanr(values["p0"], values["p1"]).statistic == pytest.approx(0.8, abs=0.1)

    def test_a_following_column_has_no_correlation_of_its_own(self) -> None:
        with pytest.raises(InputError, match="'p2' follows the rows that 'p0' chooses; correlate with 'p0'"):
            self.design(True, (("p1", "p2", 0.3),))

    def test_rows_must_match(self) -> None:
        inputs = [Input("a", Sampled("f.csv", "a", (1, 2))), Input("b", Sampled("./f.csv", "b", (1, 2, 3)))]
        with pytest.raises(InputError, match="a has 2 rows and b 3"):
            Design(inputs, Dependence(sampled_together=True), "monte carlo", 1)

    def test_there_must_be_rows(self) -> None:
        with pytest.raises(InputError, match="no two inputs are columns of one file") as caught:
            cube("monte carlo", 1, dependence=Dependence(sampled_together=True))
        assert caught.value.key == "dependence.sampled_together"


def test_streams_are_told_apart_by_everything_that_names_them() -> None:
    names = [(1, "a", 12), (11, "a", 2), (1, "a", 1, 2), (1, "a"), (1, "a1", 2), (1, "b", 12), (-1, "a", 12)]
    draws = {float(generator(*name).random()) for name in names}  # type: ignore[arg-type]
    assert len(draws) == len(names)
    assert generator(1, "a", 12).random() == generator(np.int64(1), "a", np.int64(12)).random()
