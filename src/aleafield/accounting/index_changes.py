"""What the discretisation does to indices: the index at two levels, from the same probes."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal, NamedTuple

import numpy as np
from scipy.special import ndtr

from aleafield.accounting.index_statements import Changes
from aleafield.arrays import FloatArray, IntArray
from aleafield.chaos.basis import Basis
from aleafield.chaos.germs import Germ
from aleafield.chaos.multi_index import first_terms, second_terms, total_degree, total_terms, within
from aleafield.chaos.regression import fit
from aleafield.estimates.blocks import BlockArray, student
from aleafield.randomness.law import Law
from aleafield.sensitivity.main_effects import halving
from aleafield.sensitivity.ratios import jackknife_error

Kind = Literal["first", "total", "second", "shapley", "known", "halved"]

ROWS_PER_TERM = 2.0
"""Least rows per term of a fit to differences: the jackknife takes whole blocks away from it."""
ROWS_PER_TERM_OF_RUN = 4.0
"""The same for a fit to the noisy or rough values of a run without a surrogate."""
HIGHEST_DEGREE, MOST_TERMS = 4, 500
WORST_CONDITION = 1e3
_SCORES = 1 << 14
"""Points of the midpoint rule in the normal score, over [-8, 8]."""


class LevelPair(NamedTuple):
    """One discretisation part: a quantity at the run's level and at a finer one, on the first samples.

    name : "space", "quadrature", "time" or "noise_modes";  factor : F, from a difference to a bound of the error;
    run, finer : float arrays (n_p,), NaN where there is no value.
    """

    name: str
    factor: float
    run: FloatArray
    finer: FloatArray


@dataclass(frozen=True, eq=False)
class Coefficients:
    """An expansion as indices are taken from it: degrees (terms, d), coefficients (terms, m) of m outputs."""

    germs: tuple[Germ, ...]
    degrees: IntArray
    values: FloatArray

    def evaluate(self, u: FloatArray) -> FloatArray:
        """Outputs (N, m) at points of the unit cube (N, d)."""
        outputs: FloatArray = Basis(self.germs, self.degrees).evaluate(u) @ self.values
        return outputs

    def less(self, other: Coefficients) -> Coefficients:
        """This one (m = 1 or that of the other) less another in the same germs, over the union of their terms."""
        place = {tuple(degrees): row for row, degrees in enumerate(self.degrees.tolist())}
        new = [degrees for degrees in other.degrees.tolist() if tuple(degrees) not in place]
        for degrees in new:
            place[tuple(degrees)] = len(place)
        values = np.zeros((len(place), other.values.shape[1]))
        values[: len(self.values)] = self.values
        values[[place[tuple(degrees)] for degrees in other.degrees.tolist()]] -= other.values
        union = np.concatenate(
            (self.degrees, np.array(new, dtype=np.int64).reshape(-1, self.degrees.shape[1]))
        )
        return Coefficients(self.germs, union, values)


def fitted_run(u: FloatArray, y: FloatArray, germs: tuple[Germ, ...]) -> Coefficients:
    """A low expansion of a run's values (N,) where no surrogate was accepted: good enough to start from."""
    kept = np.isfinite(y)
    degrees = _affordable(germs, kept.sum() / ROWS_PER_TERM_OF_RUN, u[kept]) or [total_degree(len(germs), 0)]
    found = fit(Basis(germs, degrees[-1]).evaluate(u[kept]), y[kept, None])
    return Coefficients(germs, degrees[-1], found.coefficients)


def _affordable(germs: tuple[Germ, ...], most: float, u: FloatArray) -> list[IntArray]:
    """Sets of terms that so many rows afford and that the points tell apart, the poorest first.

    Linear, squares added, then total degrees from 2 on.
    """
    highest = [germ.highest for germ in germs]
    squares = total_degree(len(germs), 2)
    additive = squares[(squares > 0).sum(axis=1) <= 1]
    sets = [total_degree(len(germs), 1), additive]
    for p in range(2, HIGHEST_DEGREE + 1):
        if len(sets[-1]) > most:
            break
        sets.append(total_degree(len(germs), p))
    found = []
    for degrees in (within(chosen, highest) for chosen in sets):
        if len(degrees) > min(most, MOST_TERMS):
            break
        if np.linalg.cond(Basis(germs, degrees).evaluate(u)) <= WORST_CONDITION:
            found.append(degrees)
    return found


@dataclass(frozen=True, eq=False)
class LevelChange:
    """One part as a function of the inputs: what the run differs by from the finer level.

    Attributes
    ----------
    name : str
    factor : float
    difference : Coefficients
        m = 1 + G outputs: from all probes, then without one of the G blocks that they lie in.
    """

    name: str
    factor: float
    difference: Coefficients


class LevelChanges:
    """The parts of the discretisation, ready to change any number that an expansion gives.

    With c the coefficients of the run's level and delta those of the difference Q(h) - Q(h / 2), fitted on the
    probes with few terms, a number I changes by D = I(c) - I(c - delta).  Both levels share their inputs, so the
    sampling error of I falls out of D: 32 pairs resolve a bias far below it.  The noise of D by the jackknife
    over blocks of probes.

    Parameters
    ----------
    run : Coefficients, m = 1
        At the run's level.
    variance : float
        Of the quantity; what of it `run` does not hold is taken to be alike at all levels.
    laws : of the inputs
    u : float array (S, d)
    block : int array (S,)
    parts : sequence of LevelPair
    confidence : float in (0, 1)
    """

    def __init__(
        self,
        run: Coefficients,
        variance: float,
        laws: Sequence[Law],
        u: FloatArray,
        block: BlockArray,
        parts: Sequence[tuple[str, float, FloatArray, FloatArray]],
        confidence: float,
    ) -> None:
        self.run = run
        self._rest = max(variance - float(np.square(run.values[1:]).sum()), 0.0)
        self._laws = laws
        self._confidence = confidence
        pairs = [LevelPair(*part) for part in parts]
        measured = [(pair, _difference(run.germs, u, block, pair)) for pair in pairs]
        self.parts = tuple(LevelChange(p.name, p.factor, found) for p, found in measured if found is not None)
        self._unmeasured = tuple(pair.name for pair, found in measured if found is None)

    def of(self, kind: Kind) -> Changes:
        """What the parts do to an index of every input (or pair), or to the sd that remains."""
        return self.changes(lambda coefficients: self._numbers(kind, coefficients))

    def changes(self, numbers: Callable[[Coefficients], FloatArray]) -> Changes:
        """What the parts do to numbers (k, m) of expansions of m outputs."""
        at_run = numbers(self.run)
        moved = {part.name: at_run - numbers(self.run.less(part.difference)) for part in self.parts}
        return self.bounds(moved)

    def bounds(self, moved: dict[str, FloatArray]) -> Changes:
        """Bounds from differences (k, 1 + G) of each part: from all probes, then without one block each."""
        size, noise = {}, {}
        for part in self.parts:
            d = moved[part.name]
            t = student(self._confidence, d.shape[1] - 2)
            size[part.name] = part.factor * np.abs(d[:, 0])
            noise[part.name] = part.factor * t * jackknife_error(d[:, 1:].T)
        note = None
        if self._unmeasured:
            note = f"{', '.join(self._unmeasured)}: too few probes to tell what the discretisation does to it"
        return Changes(size, noise, self._unmeasured, note)

    def _numbers(self, kind: Kind, at: Coefficients) -> FloatArray:
        squares = np.square(at.values)
        squares[0] = 0.0
        variance = squares.sum(axis=0) + self._rest
        if kind == "known":
            return _root(variance - first_terms(at.degrees) @ squares)
        if kind == "halved":
            forms = halving_forms(at.germs, at.degrees, self._laws)
            removed = np.array([np.square(form @ at.values).sum(axis=0) for form in forms])
            return _root(variance - removed)
        weights = {
            "first": first_terms,
            "total": total_terms,
            "second": second_terms,
            "shapley": shapley_weights,
        }[kind](at.degrees)
        with np.errstate(invalid="ignore", divide="ignore"):
            shares: FloatArray = weights @ squares / variance
        return shares


def _root(variance: FloatArray) -> FloatArray:
    root: FloatArray = np.sqrt(np.maximum(variance, 0.0))
    return root


def shapley_weights(degrees: IntArray) -> FloatArray:
    """Shapley effects of independent inputs are weighted sums of squared coefficients, (d, terms).

    Each term is shared alike among its inputs (Owen 2014, from memory).
    """
    used = degrees > 0
    weights: FloatArray = used.T / np.maximum(used.sum(axis=1), 1)
    return weights


def _difference(
    germs: tuple[Germ, ...], u: FloatArray, block: BlockArray, pair: LevelPair
) -> Coefficients | None:
    """The difference of two levels as an expansion, all probes first, then without each block; None when too few."""
    difference = np.asarray(pair.run - pair.finer, dtype=np.float64)
    kept = np.flatnonzero(np.isfinite(difference))
    y, at, place = difference[kept], u[kept], block[kept]
    blocks = np.unique(place)
    if len(blocks) < 3:
        return None
    fewest = len(kept) - max(int((place == g).sum()) for g in blocks)
    for degrees in reversed(_affordable(germs, min(len(kept) / ROWS_PER_TERM, fewest), at)):
        basis = Basis(germs, degrees).evaluate(at)
        fits = [fit(basis[rows], y[rows, None]) for rows in (slice(None), *(place != g for g in blocks))]
        if max(found.condition for found in fits) <= WORST_CONDITION:
            return Coefficients(
                germs, degrees, np.concatenate([found.coefficients for found in fits], axis=1)
            )
    return None


def halving_forms(germs: Sequence[Germ], degrees: IntArray, laws: Sequence[Law]) -> list[FloatArray]:
    """For each input a matrix (K, terms): squares of its products with coefficients sum to what halving removes.

    Products of the main effect's polynomials with the functions of `sensitivity.main_effects.halving`, averaged by
    the midpoint rule in the normal score, whose cells end where the halves of a law meet.
    """
    z = (np.arange(_SCORES) + 0.5) * (16.0 / _SCORES) - 8.0
    density = np.exp(-0.5 * np.square(z))
    u = np.clip(ndtr(z), 2.0**-53, 1.0 - 2.0**-53)
    own = first_terms(degrees)
    forms = []
    for i, (germ, law) in enumerate(zip(germs, laws, strict=True)):
        effect = halving(law)
        form = np.zeros((len(effect.weights), len(degrees)))
        at = degrees[own[i], i]
        if len(at):
            functions = effect.evaluate(u) * (density / density.sum())[:, None]
            products = functions.T @ germ.evaluate(u, int(at.max()))[:, at]
            form[:, own[i]] = np.sqrt(effect.weights)[:, None] * products
        forms.append(form)
    return forms
