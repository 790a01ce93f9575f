"""Which input causes it, and what to measure next: statements of one quantity from whatever its runs allow.

An accepted surrogate serves all indices.  Without one first-order indices come from the sample and the others from
runs that exchange inputs; what neither gives is not stated, and the reason is.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from aleafield.accounting.index_changes import LevelChanges, LevelPair, fitted_run
from aleafield.accounting.index_statements import SHARE, SPREAD, Changes, Numbers, statements
from aleafield.accounting.sample_causes import SampleCauses
from aleafield.accounting.statement import Statement, no_statement
from aleafield.accounting.surrogate_causes import SurrogateCauses
from aleafield.arrays import FloatArray
from aleafield.chaos.acceptance import Verdict, judge
from aleafield.chaos.expansion import Expansion
from aleafield.chaos.germs import choose_germs, dependent_groups
from aleafield.chaos.multi_index import pairs
from aleafield.chaos.search import search
from aleafield.estimates.blocks import BlockArray
from aleafield.randomness.law import Law
from aleafield.sensitivity.exchange import Exchange
from aleafield.sensitivity.failures import tied_inputs
from aleafield.sensitivity.next_measurement import FIX_BELOW, PinDown, Ranking, ranking
from aleafield.sensitivity.ratios import MOST_MISSING, NO_SPREAD
from aleafield.sensitivity.shapley import MOST_PLAYERS, correlated_blocks

COUPLED = (
    "not determined under noise: it depends on how the paths of the noise are coupled across inputs, which is no "
    "property of the model; the total share of the noise is"
)
DEPENDENT = (
    "not determined: the inputs depend on one another, and what one of them explains alone cannot be parted from the "
    "others; Shapley effects can"
)
NO_CHANGE = Changes({}, {})
"""No discretisation part."""
ONE_PATH = "not determined with one noise path a parameter sample; ask for noise_repeats = 2 or more"


@dataclass(frozen=True, eq=False)
class CausesData:
    """One quantity's runs.

    Attributes
    ----------
    paths, laws : of the d inputs
    correlation : float array (d, d) or None
        Latent; None when the inputs are independent.
    u : float array (S, d)
        Points of the unit cube, before any copula.
    block : int array (S,)
        Scrambling of each, 0 .. n_blocks - 1.
    n_blocks : int
    y : float array (S,)
        Means over the noise paths of a parameter sample; NaN where it failed or does not occur.
    held_u, held_y : float arrays (H, d), (H,), or None
        Runs that nothing is fitted to.
    unit : float array (N, 2 d) or None
        Points of the rows of an exchange of every single input; row r is in the block of sample r, its A.
    row_values : float array (N, 2 d + 2) or None
        Runs of the rows: A, B, AB_1 .. AB_d, BA_1 .. BA_d.
    parts : sequence of LevelPair, or the same as plain tuples
        (name, factor F, values at the run's level, at the finer one) on samples 0 .. n_p - 1, means over repeats.
    noisy : bool
    repeats : int
        Noise paths of each parameter sample, 1 without noise.
    noise_share : Statement or None
        Share of the noise in the variance of one run: the `complement` of the parameters' share.
    """

    paths: Sequence[str]
    laws: Sequence[Law]
    correlation: FloatArray | None
    u: FloatArray
    block: BlockArray
    n_blocks: int
    y: FloatArray
    held_u: FloatArray | None = None
    held_y: FloatArray | None = None
    unit: FloatArray | None = None
    row_values: FloatArray | None = None
    parts: Sequence[LevelPair | tuple[str, float, FloatArray, FloatArray]] = ()
    noisy: bool = False
    repeats: int = 1
    noise_share: Statement | None = None


@dataclass(frozen=True)
class CausesRequest:
    """What is asked of a quantity.

    Attributes
    ----------
    indices : sequence of "first", "total", "second", "shapley"
    wanted_sd : float or None
        In the units of the quantity.
    fix_below : float or None
        Threshold for inputs that may be fixed, when it was asked for; None: FIX_BELOW where the total indices are
        there anyway.
    confidence : float in (0, 1)
    """

    indices: Sequence[str]
    wanted_sd: float | None
    fix_below: float | None
    confidence: float


@dataclass(frozen=True, eq=False)
class Fitted:
    """An expansion of the quantity (o = 1) and the verdict on it."""

    expansion: Expansion
    verdict: Verdict


@dataclass(frozen=True)
class InputCauses:
    """Statements of one input; None where not asked for."""

    first: Statement | None = None
    total: Statement | None = None
    second: Mapping[str, Statement] | None = None
    shapley: Statement | None = None

    def as_json(self) -> dict[str, object]:
        """What was asked for, in the shape of summary.json."""
        shape: dict[str, object] = {}
        for name in ("first", "total", "shapley"):
            statement: Statement | None = getattr(self, name)
            if statement is not None:
                shape[name] = statement.as_json()
        if self.second is not None:
            shape["second"] = {other: statement.as_json() for other, statement in self.second.items()}
        return shape


@dataclass(frozen=True)
class MeasureNext:
    """What knowing an input better is expected to leave of the sd, and whether it may be fixed (None: not known)."""

    remaining_sd_known: Statement
    remaining_sd_halved: Statement
    may_be_fixed: bool | None

    def as_json(self) -> dict[str, object]:
        """In the shape of summary.json."""
        return {
            "remaining_sd_known": self.remaining_sd_known.as_json(),
            "remaining_sd_halved": self.remaining_sd_halved.as_json(),
            "may_be_fixed": self.may_be_fixed,
        }


@dataclass(frozen=True, eq=False)
class Causes:
    """Everything that is said of the causes of one quantity's spread.

    Attributes
    ----------
    paths : of the inputs
    inputs : mapping of path to InputCauses; empty where no index was asked for
    noise : Statement or None
        Total share of the noise.
    measure_next : mapping of path to MeasureNext
    wanted_sd, pinned : float and PinDown, or None
        Its remaining sd is sure at the confidence as far as sampling and surrogate go.
    ranked, ranked_by : Ranking, or None where nothing ranks the inputs, and the name of the index
    notes : tuple of str
    """

    paths: tuple[str, ...]
    inputs: Mapping[str, InputCauses]
    noise: Statement | None
    measure_next: Mapping[str, MeasureNext]
    wanted_sd: float | None
    pinned: PinDown | None
    ranked: Ranking | None
    ranked_by: str | None
    notes: tuple[str, ...]

    def as_json(self) -> dict[str, object]:
        """The members sensitivity, measure_next, pin_down, ranking, notes; no NaN, no Infinity."""
        sensitivity: dict[str, object] = {path: found.as_json() for path, found in self.inputs.items()}
        if self.noise is not None:
            sensitivity["noise"] = {"total": self.noise.as_json()}
        return {
            "sensitivity": sensitivity,
            "measure_next": {path: found.as_json() for path, found in self.measure_next.items()},
            "pin_down": [] if self.pinned is None else [self._pinned(self.pinned)],
            "ranking": None if self.ranked is None else self._ranked(self.ranked),
            "notes": list(self.notes),
        }

    def _pinned(self, found: PinDown) -> dict[str, object]:
        shape: dict[str, object] = {
            "inputs": None if found.inputs is None else [self.paths[i] for i in found.inputs],
            "remaining_sd": found.remaining_sd if math.isfinite(found.remaining_sd) else None,
            "wanted_sd": self.wanted_sd,
            "exhaustive": found.exhaustive,
        }
        if found.reason is not None:
            shape["reason"] = found.reason
        return shape

    def _ranked(self, found: Ranking) -> dict[str, object]:
        return {
            "by": self.ranked_by,
            "order": [self.paths[i] for i in found.order],
            "above_next": list(found.above_next),
            "first_is_largest": found.first_is_largest,
        }


def surrogate_of(data: CausesData) -> Fitted | None:
    """The best expansion of the quantity and the verdict of the held-out runs on it.

    None under noise, without held-out runs or inputs, and where fewer than two runs gave a value.
    """
    if data.noisy or data.held_u is None or data.held_y is None or not len(data.laws):
        return None
    if np.isfinite(data.y).sum() < 2:
        return None
    groups = () if data.correlation is None else dependent_groups(data.correlation)
    y = data.y[:, None]
    expansion = search(data.u, y, data.laws, block=data.block.astype(np.int64), groups=groups)
    return Fitted(expansion, judge(expansion, data.u, y, data.held_u, data.held_y[:, None])[0])


def needs_exchange(fitted: Fitted | None, request: CausesRequest, data: CausesData) -> bool:
    """Whether runs that exchange inputs are needed for what is asked, and allowed by what the study is.

    Not where so many runs have no value that no index could be stated of what they give.
    """
    if float(np.isnan(data.y).mean()) > MOST_MISSING:
        return False
    accepted = fitted is not None and fitted.verdict.accepted
    asked = bool({"total", "second"} & set(request.indices))
    asked = asked or request.wanted_sd is not None or request.fix_below is not None
    return asked and not accepted and not data.noisy and data.correlation is None and len(data.laws) > 0


def causes(data: CausesData, fitted: Fitted | None, request: CausesRequest) -> Causes:
    """All statements that are asked for.

    Parameters
    ----------
    data : CausesData
    fitted : Fitted or None
        As `surrogate_of` gives it.
    request : CausesRequest

    Returns
    -------
    Causes
        From an accepted surrogate where there is one; else first order from the sample, total and second order
        from the exchange.  Indices are biased by the discretisation too: see `index_changes.LevelChanges`.
        Under noise only first order, of the variance of one run, and the total share of the noise.
    """
    found = _Findings(data, fitted, request)
    asked = [name for name in ("first", "total", "second", "shapley") if name in request.indices]
    members = {name: found.index(name) for name in asked if name != "second"}
    second = found.second() if "second" in asked else None
    inputs = {
        path: InputCauses(
            **{name: stated[i] for name, stated in members.items()},
            second=None if second is None else second[path],
        )
        for i, path in enumerate(data.paths)
        if asked
    }
    noise = None
    if data.noisy and asked:
        noise = data.noise_share or no_statement(ONE_PATH)
    ranked, by = found.ranking()
    return Causes(
        tuple(data.paths),
        inputs,
        noise,
        found.measure_next(),
        request.wanted_sd,
        None if request.wanted_sd is None else found.pin_down(request.wanted_sd),
        ranked,
        by,
        found.notes(),
    )


class _Findings:
    """What the runs of one quantity say of its causes."""

    def __init__(self, data: CausesData, fitted: Fitted | None, request: CausesRequest) -> None:
        self._data, self._fitted, self._request = data, fitted, request
        self._d = len(data.laws)
        self._source: SurrogateCauses | SampleCauses | None = None
        self._refused: str | None = None
        self._ranking: tuple[Ranking | None, str | None] = (None, None)
        self._levels: LevelChanges | None = None
        if fitted is not None and fitted.verdict.accepted:
            assert data.held_u is not None
            assert data.held_y is not None
            self._source = SurrogateCauses(
                fitted.expansion, fitted.verdict, data.laws, data.u, data.y, data.block,
                data.held_u, data.held_y, request.confidence,
            )  # fmt: skip
        elif data.correlation is None and self._d:
            self._source = self._from_sample()
        if self._source is not None and self._source.variance > 0.0:
            self._levels = self._changes(self._source)

    def _from_sample(self) -> SampleCauses | None:
        data, left = self._data, None
        if data.repeats > 1:
            share = data.noise_share
            if share is None or share.value is None or share.error["total"] is None:
                self._refused = "not determined: the share of the noise in the variance is not" + (
                    "" if share is None or share.reason is None else f" ({share.reason})"
                )
                return None
            averaged, total = 1.0 - 1.0 / data.repeats, share.error["total"]
            ends = (share.value, max(share.value - total, 0.0), min(share.value + total, 1.0))
            middle, high, low = (1.0 - averaged * end for end in ends)
            left = (middle, low, high)
        return SampleCauses(
            data.laws, data.u, data.y, data.block, data.n_blocks, data.row_values, left,
            self._request.confidence,
        )  # fmt: skip

    def _changes(self, source: SurrogateCauses | SampleCauses) -> LevelChanges:
        data = self._data
        if isinstance(source, SurrogateCauses):
            run = source.coefficients
        else:
            run = fitted_run(data.u, data.y, choose_germs(data.laws))
        return LevelChanges(
            run, source.variance, data.laws, data.u, data.block, data.parts, self._request.confidence
        )

    def index(self, name: str) -> tuple[Statement, ...]:
        """First, total or Shapley indices of all inputs."""
        if name == "shapley":
            return self._shapley()
        if name == "first":
            numbers, changes = self._first()
        else:
            numbers, changes = self._total()
        return statements(numbers, changes, SHARE, self._given())

    def second(self) -> dict[str, dict[str, Statement]]:
        """Second-order indices of all pairs, each under both of its inputs."""
        paths, order = self._data.paths, pairs(self._d)
        numbers, changes = self._by_exchange(lambda source: source.second(), len(order))
        if self._levels is not None and numbers.reasons.count(None):
            changes = self._levels.of("second")
        stated = statements(numbers, changes, SHARE, self._given())
        found: dict[str, dict[str, Statement]] = {path: {} for path in paths}
        for (i, j), statement in zip(order, stated, strict=True):
            found[paths[i]][paths[j]] = found[paths[j]][paths[i]] = statement
        return found

    def measure_next(self) -> dict[str, MeasureNext]:
        """What is left of the sd when an input is known or its spread halved; which inputs may be fixed."""
        if self._source is None or self._data.correlation is not None:
            known = halved = Numbers.nothing(self._why(), self._d)
            of_known = of_halved = NO_CHANGE
        else:
            known, halved = self._source.known(), self._source.halved()
            of_known, of_halved = (
                NO_CHANGE if self._levels is None else self._levels.of("known"),
                NO_CHANGE if self._levels is None else self._levels.of("halved"),
            )
        fixed = self._fixed()
        left = statements(known, of_known, SPREAD, self._given())
        left_halved = statements(halved, of_halved, SPREAD, self._given())
        return {
            path: MeasureNext(*row)
            for path, row in zip(self._data.paths, zip(left, left_halved, fixed, strict=True), strict=True)
        }

    def pin_down(self, wanted_sd: float) -> PinDown:
        """The fewest inputs to pin down; none, with the reason, where indices are not defined."""
        if self._source is None or self._data.correlation is not None:
            return PinDown(None, math.nan, True, self._why())
        return self._source.pin_down(wanted_sd)

    def ranking(self) -> tuple[Ranking | None, str | None]:
        """How sure the order of the inputs is, and by which index; of Shapley effects where they were asked for."""
        if self._ranking[0] is not None or self._data.correlation is not None or self._levels is None:
            return self._ranking
        assert self._source is not None
        exchanged = isinstance(self._source, SurrogateCauses) or self._source.exchanged
        return self._source.ranking(), "total" if exchanged else "first"

    def notes(self) -> tuple[str, ...]:
        """What a reader must know of all of them."""
        said = list(self._given())
        if self._fitted is not None and not self._fitted.verdict.accepted:
            said.append(f"no surrogate was used: {self._fitted.verdict.reason}")
        return tuple(said)

    def _given(self) -> tuple[str, ...]:
        """To which inputs missing values are tied."""
        data = self._data
        if data.correlation is not None:
            return ()
        u, y = data.u, data.y
        if data.unit is not None and data.row_values is not None:
            u = np.concatenate((u, Exchange(self._d).points(data.unit).reshape(-1, self._d)))
            y = np.concatenate((y, data.row_values.ravel()))
        tied = tied_inputs(u, ~np.isfinite(y))
        if not len(tied):
            return ()
        names = ", ".join(data.paths[i] for i in tied)
        return (f"runs without a value are tied to {names}: this holds given that there is a value",)

    def _why(self) -> str:
        if self._data.correlation is not None:
            return DEPENDENT
        return self._refused or "not determined: there are no uncertain inputs"

    def _first(self) -> tuple[Numbers, Changes]:
        if self._source is None or self._data.correlation is not None:
            return Numbers.nothing(self._why(), self._d), NO_CHANGE
        return self._source.first(), NO_CHANGE if self._levels is None else self._levels.of("first")

    def _total(self) -> tuple[Numbers, Changes]:
        numbers, changes = self._by_exchange(lambda source: source.total(), self._d)
        if self._levels is not None and numbers.reasons.count(None):
            changes = self._levels.of("total")
        return numbers, changes

    def _by_exchange(
        self, numbers: Callable[[SurrogateCauses | SampleCauses], Numbers], k: int
    ) -> tuple[Numbers, Changes]:
        """Numbers that a surrogate or exchanged inputs give, else why there are none."""
        source = self._source
        if self._data.noisy:
            return Numbers.nothing(COUPLED, k), NO_CHANGE
        if source is None or self._data.correlation is not None:
            return Numbers.nothing(self._why(), k), NO_CHANGE
        if isinstance(source, SampleCauses) and not source.exchanged:
            reason = "not determined: it needs an accepted surrogate, or runs that exchange inputs"
            if self._fitted is not None:
                reason += f"; the surrogate was refused: {self._fitted.verdict.reason}"
            return Numbers.nothing(reason, k), NO_CHANGE
        return numbers(source), NO_CHANGE

    def _fixed(self) -> list[bool | None]:
        """Whether the upper bound of each total index, discretisation included, lies below the threshold."""
        numbers, changes = self._total()
        threshold = FIX_BELOW if self._request.fix_below is None else self._request.fix_below
        if self._source is None or None not in numbers.reasons:
            return [None] * self._d
        upper = self._source.total_at_most() + changes.bound()
        return [
            None if reason is not None else bool(most < threshold)
            for reason, most in zip(numbers.reasons, upper, strict=True)
        ]

    def _shapley(self) -> tuple[Statement, ...]:
        """Shapley effects; of groups where the inputs are too many to visit all subsets."""
        data, source = self._data, self._source
        if data.noisy:
            return (no_statement(COUPLED),) * self._d
        if not isinstance(source, SurrogateCauses):
            reason = "not determined: Shapley effects need an accepted surrogate"
            if self._fitted is not None:
                reason += f"; it was refused: {self._fitted.verdict.reason}"
            return (no_statement(reason),) * self._d
        if self._levels is None:
            return statements(Numbers.nothing(NO_SPREAD, self._d), NO_CHANGE, SHARE)
        if data.correlation is None:
            return statements(
                source.shapley_of_independent(), self._levels.of("shapley"), SHARE, self._given()
            )
        players: Sequence[tuple[int, ...]] = [(i,) for i in range(self._d)]
        if self._d > MOST_PLAYERS:
            players = correlated_blocks(data.correlation)
        if len(players) > MOST_PLAYERS:
            reason = f"not determined: Shapley effects of {len(players)} inputs; at most {MOST_PLAYERS} are visited"
            return (no_statement(reason),) * self._d
        numbers, changes, alone = source.shapley(data.correlation, players, self._levels)
        stated = statements(numbers, changes, SHARE, self._given())
        if len(players) == self._d:
            self._ranking = (ranking(alone, 0), "shapley")
        found: dict[int, Statement] = {}
        for group, statement in zip(players, stated, strict=True):
            together = ", ".join(data.paths[i] for i in group)
            shared = no_statement(
                f"not determined: more than {MOST_PLAYERS} inputs; only that of {together} together"
            )
            found.update(dict.fromkeys(group, statement if len(group) == 1 else shared))
        return tuple(found[i] for i in range(self._d))
