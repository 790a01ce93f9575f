"""Which input causes it, from an accepted surrogate."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from functools import cached_property

import numpy as np
from scipy.special import ndtri

from aleafield.accounting.index_changes import Coefficients, LevelChanges, halving_forms, shapley_weights
from aleafield.accounting.index_statements import Changes, Numbers
from aleafield.arrays import BoolArray, FloatArray
from aleafield.chaos.acceptance import Verdict
from aleafield.chaos.expansion import Expansion
from aleafield.chaos.indices import Shares, share_intervals
from aleafield.chaos.regression import fit
from aleafield.chaos.surrogate import Surrogate
from aleafield.estimates.blocks import BlockArray
from aleafield.randomness.law import Law
from aleafield.randomness.points import SCRAMBLINGS, SobolPoints
from aleafield.sensitivity.next_measurement import FIX_CONFIDENCE, PinDown, Ranking, pin_down
from aleafield.sensitivity.ratios import Indices
from aleafield.sensitivity.shapley import in_latent_normals, shapley_effects

FOLDS = 5
"""Refits that each leave out a fifth of the blocks, for Shapley effects."""
POINTS, FEWER_POINTS, FEW_PLAYERS = 4096, 2048, 6
"""Points of the surrogate for Shapley effects, fewer with more players: all subsets of them are visited."""
_SEED = 0
"""Of those points: they belong to the surrogate, not to the study."""


class SurrogateCauses:
    """Indices and what remains of a spread from one output's expansion.

    Parameters
    ----------
    expansion : Expansion, o = 1
    verdict : Verdict
        Accepted.
    laws : of the inputs
    u, y, block : float arrays (S, d), (S,), int array (S,)
        What it was fitted to.
    held_u, held_y : float arrays (H, d), (H,)
    confidence : float in (0, 1)
    """

    def __init__(
        self,
        expansion: Expansion,
        verdict: Verdict,
        laws: Sequence[Law],
        u: FloatArray,
        y: FloatArray,
        block: BlockArray,
        held_u: FloatArray,
        held_y: FloatArray,
        confidence: float,
    ) -> None:
        self._expansion = expansion
        self._error = np.array([verdict.error])
        self._laws = laws
        self._u, self._y, self._block = u, y, block
        self._surrogate = Surrogate(expansion, 0, held_u, held_y, _SEED)
        self._confidence = confidence

    @property
    def coefficients(self) -> Coefficients:
        """The expansion as indices are taken from it."""
        basis = self._expansion.basis
        return Coefficients(basis.germs, basis.indices, self._expansion.coefficients)

    @property
    def variance(self) -> float:
        """Sum of the squared coefficients, in the square of the units of the quantity."""
        return float(self._expansion.variance[0])

    def first(self) -> Numbers:
        """First-order indices, (d,)."""
        return self._shares(self._expansion.first_terms())

    def total(self) -> Numbers:
        """Total indices, (d,)."""
        return self._shares(self._expansion.total_terms())

    def second(self) -> Numbers:
        """Second-order indices of all pairs."""
        return self._shares(self._expansion.second_terms())

    def total_at_most(self) -> FloatArray:
        """Upper ends of one-sided intervals of the total indices at FIX_CONFIDENCE, (d,)."""
        two_sided = 2.0 * FIX_CONFIDENCE - 1.0
        found = share_intervals(self._expansion, self._expansion.total_terms(), self._error, two_sided)
        return found.high[:, 0]

    def known(self) -> Numbers:
        """Expected sd once each input is known exactly, (d,)."""
        found = self._of(self._expansion.first_terms(), self._confidence)
        return self._remaining(found.value[:, 0], found.low[:, 0], found.high[:, 0])

    def halved(self) -> Numbers:
        """Expected sd once the spread of each input is halved, (d,).

        The interval of the share that goes is made as in `share_intervals`.
        """
        c = self._expansion.coefficients[:, 0]
        forms = halving_forms(self._expansion.basis.germs, self._expansion.basis.indices, self._laws)
        slopes = np.array([form.T @ (form @ c) for form in forms])
        return self._remaining(*self._intervals(slopes))

    def shapley_of_independent(self) -> Numbers:
        """Shapley effects of independent inputs, (d,)."""
        slopes = shapley_weights(self._expansion.basis.indices) * self._expansion.coefficients[:, 0]
        return Numbers.from_surrogate(*self._intervals(slopes))

    def _intervals(self, slopes: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Shares that are quadratic forms c'Mc / V of the coefficients, and the ends of their intervals, each (k,).

        As `share_intervals`, of which the forms are those that M only takes or leaves terms.

        Parameters
        ----------
        slopes : float array (k, terms)
            M c, half of the gradient.
        """
        expansion, variance = self._expansion, self.variance
        assert expansion.residuals is not None
        assert expansion.influence is not None
        if variance == 0.0:
            none = np.full(len(slopes), np.nan)
            return none, none, none
        c = np.where(np.arange(slopes.shape[1]) > 0, expansion.coefficients[:, 0], 0.0)
        share = slopes @ c / variance
        pulls = expansion.residuals * (
            expansion.influence @ (2.0 * (slopes - share[:, None] * c).T / variance)
        )
        deviation = float(ndtri(0.5 + 0.5 * self._confidence)) * np.sqrt(np.square(pulls).sum(axis=0))
        e = self._error
        return share, (1.0 - e) * share - deviation, (1.0 - e) * share + e + deviation

    def pin_down(self, wanted_sd: float) -> PinDown:
        """The fewest inputs that surely bring the expected sd below a wanted one."""
        members = self._expansion.basis.indices > 0
        variances = self._expansion.partial_variance[:, 0]
        two_sided = 2.0 * self._confidence - 1.0

        def lower(chosen: BoolArray) -> float:
            terms = self._expansion.closed_terms(np.flatnonzero(chosen).tolist())
            found = share_intervals(self._expansion, terms[None], self._error, two_sided)
            return max(float(found.low[0, 0]), 0.0) * self.variance

        sd = self._surrogate.sd(self._confidence)
        most = math.sqrt(self.variance) + sd.surrogate
        return pin_down(members, variances, most**2, wanted_sd, lower=lower)

    def ranking(self) -> Ranking:
        """How sure the order of the total indices is.

        As `next_measurement.ranking`, from expansions less the pull of each block; of a difference the relative
        error of the surrogate is taken off first.
        """
        from scipy.special import stdtr

        expansion = self._expansion
        assert expansion.residuals is not None
        assert expansion.influence is not None
        kept = np.isfinite(self._y)
        blocks = np.unique(self._block[kept])
        member = (blocks[:, None] == self._block[kept]).astype(np.float64)
        pull = member @ (expansion.influence * expansion.residuals)
        terms = expansion.total_terms()
        squares = np.square(np.concatenate((expansion.coefficients, expansion.coefficients - pull.T), axis=1))
        squares[0] = 0.0
        shares = terms @ squares / squares.sum(axis=0)
        order = np.argsort(-shares[:, 0], kind="stable")
        ordered = shares[order]
        gap = ordered[:, None] - ordered[None, :]
        n = len(blocks)
        spread = gap[..., 1:] - gap[..., 1:].mean(axis=-1, keepdims=True)
        error = np.sqrt((n - 1) / n * np.square(spread).sum(axis=-1))
        clear = np.maximum(gap[..., 0] - self._error, 0.0)
        with np.errstate(invalid="ignore", divide="ignore"):
            sure = stdtr(n - 1, np.where(clear > 0.0, clear / error, 0.0))
        d = len(order)
        return Ranking(
            tuple(order.tolist()),
            tuple(float(sure[i, i + 1]) for i in range(d - 1)),
            max(0.0, 1.0 - float((1.0 - sure[0, 1:]).sum())),
        )

    def shapley(
        self, correlation: FloatArray, players: Sequence[Sequence[int]], levels: LevelChanges
    ) -> tuple[Numbers, Changes, Indices]:
        """Shapley effects of dependent inputs by players (k,), the changes of discretisation, and replicates.

        The interval adds to that of the points the largest change of FOLDS refits, each without a fifth of the
        blocks, and what the terms that the surrogate does not hold may move.  Everything is one visit to
        all subsets: the surrogate, its refits and the finer levels are outputs of one function.

        Parameters
        ----------
        correlation : float array (d, d)
            Latent.
        players : inputs that play as one
        levels : LevelChanges
        """
        d = len(self._laws)
        functions: list[Callable[[FloatArray], FloatArray]] = [
            self.coefficients.evaluate,
            self._refits().evaluate,
        ]
        finer = [levels.run.less(part.difference) for part in levels.parts]
        functions += [coefficients.evaluate for coefficients in finer]
        count = POINTS if len(players) <= FEW_PLAYERS else FEWER_POINTS
        index = np.arange(count)
        found = shapley_effects(
            in_latent_normals(
                lambda u: np.concatenate([function(u) for function in functions], axis=1), correlation
            ),
            correlation,
            SobolPoints(2 * d, _SEED).at(index),
            index % SCRAMBLINGS,
            SCRAMBLINGS,
            self._confidence,
            groups=players,
        )
        value = found.value[:, 0]
        change = np.abs(found.value[:, 1 : 1 + FOLDS] - value[:, None]).max(axis=1)
        moved, start = {}, 1 + FOLDS
        for part, coefficients in zip(levels.parts, finer, strict=True):
            stop = start + coefficients.values.shape[1]
            moved[part.name] = value[:, None] - found.value[:, start:stop]
            start = stop
        e = self._error
        low = found.low[:, 0] - change - e * np.maximum(value, 0.0)
        high = found.high[:, 0] + change + e * np.maximum(1.0 - value, 0.0)
        alone = Indices(
            found.value[:, :1], found.low[:, :1], found.high[:, :1], found.without[:, :, :1],
            found.confidence, found.reason[:1],
        )  # fmt: skip
        return Numbers.from_surrogate(value, low, high), levels.bounds(moved), alone

    def _refits(self) -> Coefficients:
        """The same terms fitted without a part of the blocks, FOLDS outputs."""
        basis = self._expansion.basis
        kept = np.isfinite(self._y)
        values, y, fold = basis.evaluate(self._u[kept]), self._y[kept, None], self._block[kept] % FOLDS
        found = [fit(values[fold != k], y[fold != k]).coefficients for k in range(FOLDS)]
        return Coefficients(basis.germs, basis.indices, np.concatenate(found, axis=1))

    def _of(self, terms: BoolArray, confidence: float) -> Shares:
        return share_intervals(self._expansion, terms, self._error, confidence)

    def _shares(self, terms: BoolArray) -> Numbers:
        found = self._of(terms, self._confidence)
        return Numbers.from_surrogate(found.value[:, 0], found.low[:, 0], found.high[:, 0])

    @cached_property
    def _sd_error(self) -> float:
        return self._surrogate.sd(self._confidence).surrogate

    def _remaining(self, share: FloatArray, low: FloatArray, high: FloatArray) -> Numbers:
        """sqrt(V (1 - share)), its ends from those of the share and of the sd."""
        sd, error = math.sqrt(self.variance), self._sd_error

        def left(taken: FloatArray) -> FloatArray:
            rest: FloatArray = np.sqrt(np.clip(1.0 - taken, 0.0, 1.0))
            return rest

        return Numbers.from_surrogate(
            sd * left(share), max(sd - error, 0.0) * left(high), (sd + error) * left(low)
        )
