"""Sampling error and discretisation parts put together into one statement."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np

from aleafield.accounting.bias import OPEN, Bias, Unmeasured, bias_of, joint_change
from aleafield.accounting.measured import MeasuredPart
from aleafield.accounting.order import AGREEMENT, SMALLEST_ORDER, Order
from aleafield.accounting.records import MESH, PartDifferences
from aleafield.accounting.statement import ERROR_KEYS, Statement, no_statement, representable
from aleafield.accounting.statistic import MEAN, Statistic
from aleafield.ensemble.level import Side
from aleafield.estimates import Estimate, Sample

RESOLUTION = 0.1
"""A part below this share of the total is honest only inside the total."""
MESH_PARTS = ("quadrature", "space")
"""The parts that `MESH` refines together."""
ROUNDING = 1e-9
"""Parts below this share of the value are not worth a note."""
CANCELLATION = 0.5
"""Below this share of the sum of its parts a bound of both together is worth a note."""
MODEL_TERM = 0.25
"""Share of the biases that stays in the interval of a corrected value."""


@dataclass(frozen=True)
class Sampled:
    """A value with the lengths of its sampling interval to the left and to the right, both >= 0."""

    value: float
    left: float
    right: float


def split_error(
    sample: Sample, parts: Sequence[PartDifferences], statistic: Statistic, confidence: float
) -> Statement:
    """A statistic of the run with the parts of its error.

    Parameters
    ----------
    sample : Sample
        All samples of the run.
    parts : sequence of PartDifferences
        The discretisation parts, each at most once; a part that is absent does not apply.
    statistic : Statistic
    confidence : float in (0, 1)

    Returns
    -------
    Statement
        With T -+ (l, r) the sampling interval, B the sum of the sizes and N^2 that of the squared noises of
        the biases: interval [T - B - sqrt(l^2 + N^2), T + B + sqrt(r^2 + N^2)], `total` its longer side.
        Biases add linearly: they are not random, and their root-sum-square misses the truth too often.  Given
        a part "mesh", it bounds space and quadrature together where that is tighter and converges.  Where
        a bias is not determined nothing is stated but the parts that are, and the reason.
    """
    return combine(sample, [MeasuredPart(sample, part) for part in parts], statistic, confidence)


def combine(
    sample: Sample, measured: Sequence[MeasuredPart], statistic: Statistic, confidence: float
) -> Statement:
    """`split_error` for parts that are already measured."""
    with np.errstate(over="ignore", invalid="ignore"):
        return state(
            statistic.estimate(sample, confidence), sample, measured, OfStatistic(statistic, confidence)
        )


class Subject(Protocol):
    """What is stated: a number, and how the parts of the discretisation act on it."""

    @property
    def limits(self) -> tuple[float, float]:
        """Smallest and largest possible value; the interval is cut there."""

    @property
    def corrected(self) -> bool:
        """Whether a corrected value is offered."""

    def biases(self, measured: Sequence[MeasuredPart], value: float) -> Biases:
        """The biases of all parts, `value` being the number itself."""

    def order(self, measured: MeasuredPart) -> Order:
        """The order that judged a part."""

    def open_sides(self, measured: MeasuredPart) -> frozenset[Side]:
        """Sides on which a part bounds nothing."""


def state(
    estimate: Estimate, sample: Sample, measured: Sequence[MeasuredPart], subject: Subject
) -> Statement:
    """An estimate of the run with the parts of its error, put together as `split_error` says."""
    if estimate.value is None or estimate.low is None or estimate.high is None:
        return no_statement(estimate.reason or "not determined")
    if not math.isfinite(estimate.value):
        return no_statement("it is beyond the range of double precision")
    parts = [m for m in measured if m.part.name != MESH]
    found = subject.biases(parts, estimate.value)
    for mesh in measured:
        if mesh.part.name == MESH and _converges(subject.order(mesh)):
            rest = [m for m in parts if m.part.name not in MESH_PARTS]
            found = _together(found, subject.biases([mesh, *rest], estimate.value), estimate.value)
    orders = {m.part.name: subject.order(m) for m in parts if m.usable.any()}
    sampled = Sampled(estimate.value, estimate.value - estimate.low, estimate.high - estimate.value)
    sampling = None if sample.certain else max(sampled.left, sampled.right)
    sizes = {name: bias.size for name, bias in found.known.items()}
    if found.lost:
        error: dict[str, float | None] = dict.fromkeys(ERROR_KEYS)
        error.update(sizes, sampling=sampling)
        return representable(Statement(None, error, None, reason="; ".join(found.lost), orders=orders))
    noise = math.hypot(*(bias.noise for bias in found.known.values()))
    plain = _statement(subject.limits, sampled, sizes, noise if sizes else None, sampling)
    notes = (*found.notes, *_notes(plain, orders, parts))
    sides = {m.part.name: subject.open_sides(m) for m in parts}
    if any(sides.values()):
        return representable(_opened(plain, sides, notes, orders))
    corrected = None
    erratic = any(m.part.erratic for m in measured)
    if subject.corrected and sizes and not erratic and not _diverges(plain, orders):
        corrected = _corrected(sampled, found.known, noise, sampling)
    return representable(
        Statement(plain.value, plain.error, plain.interval, corrected, notes=notes, orders=orders)
    )


@dataclass(frozen=True)
class Biases:
    """Biases of all parts of a number, why some are not determined, and what to say of them."""

    known: dict[str, Bias]
    lost: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()

    @property
    def size(self) -> float:
        """Sum of the sizes."""
        return math.fsum(bias.size for bias in self.known.values())

    @staticmethod
    def of(biases: Mapping[str, Bias | Unmeasured]) -> Biases:
        """Biases by part, those apart that the probes do not determine."""
        lost = dict.fromkeys(bias.reason for bias in biases.values() if isinstance(bias, Unmeasured))
        return Biases({name: b for name, b in biases.items() if isinstance(b, Bias)}, tuple(lost))


@dataclass(frozen=True)
class OfStatistic:
    """A statistic as the subject of a statement."""

    statistic: Statistic
    confidence: float

    @property
    def limits(self) -> tuple[float, float]:
        """Those of the statistic."""
        return self.statistic.limits

    @property
    def corrected(self) -> bool:
        """For the mean alone."""
        return self.statistic == MEAN

    def biases(self, measured: Sequence[MeasuredPart], value: float) -> Biases:
        """Biases one by one; quantiles and probabilities raised to what all parts do at once."""
        statistic = self.statistic
        found = Biases.of({m.part.name: bias_of(m, statistic, value, self.confidence) for m in measured})
        if found.lost or statistic.has_influence or len(measured) < 2:
            return found
        joint = joint_change(measured, statistic, value)
        if math.isinf(joint):
            return replace(found, lost=("with all parts together the quantity might not occur at all",))
        sizes = _raised_to(joint, {name: bias.size for name, bias in found.known.items()})
        return Biases({name: replace(bias, size=sizes[name]) for name, bias in found.known.items()})

    def order(self, measured: MeasuredPart) -> Order:
        """That of the quantity, of its margin, or the more cautious of both."""
        if self.statistic.kind == "occurs":
            return measured.margin_order
        by_values = self.statistic.kind in ("quantile", "exceed")
        return measured.order if by_values else measured.conditional_order

    def open_sides(self, measured: MeasuredPart) -> frozenset[Side]:
        """Those of the part for this statistic."""
        return measured.open_sides(self.statistic)


def _opened(
    closed: Statement, sides: Mapping[str, frozenset[Side]], notes: tuple[str, ...], orders: dict[str, Order]
) -> Statement:
    """A statement whose interval is open where a part bounds nothing: that part and the total are not known."""
    assert closed.interval is not None
    error = dict(closed.error) | {name: None for name, open_at in sides.items() if open_at} | {"total": None}
    low, high = closed.interval
    at = frozenset[Side]().union(*sides.values())
    said = tuple(
        f"{name}: no bound {' or '.join(sorted(open_at))} the stated value: {OPEN}"
        for name, open_at in sides.items()
        if open_at
    )
    interval = (None if "below" in at else low, None if "above" in at else high)
    known = {name: order for name, order in orders.items() if not sides[name]}
    return Statement(closed.value, error, interval, notes=(*said, *notes), orders=known)


def _together(apart: Biases, joined: Biases, value: float) -> Biases:
    """The biases with space and quadrature bounded together, where that is the tighter bound.

    Along the path the two may be of opposite sign: nodal values of a collocation scheme, for one, feel the
    integrals alone, and refining the projector takes back what refining the rule had added.  Each part then
    keeps its share of the sum.
    """
    comparable = not joined.lost and set(MESH_PARTS) <= set(apart.known)
    if not comparable or (not apart.lost and joined.size >= apart.size):
        return apart
    mesh = joined.known[MESH]
    sizes = {name: apart.known[name].size for name in MESH_PARTS}
    total = math.fsum(sizes.values())
    shares = {name: size / total if total > 0.0 else 0.5 for name, size in sizes.items()}
    known = {name: bias for name, bias in joined.known.items() if name != MESH}
    for name in MESH_PARTS:
        # noise in quadrature and corrections in a line give back those of the two together
        known[name] = Bias(
            mesh.size * shares[name], mesh.noise * math.sqrt(shares[name]), mesh.correction * shares[name]
        )
    note = (
        f"space and quadrature cancel in part: {total:.2g} one by one, {mesh.size:.2g} together; each is "
        "shown with its share of the latter"
    )
    matters = mesh.size < CANCELLATION * total and total > ROUNDING * abs(value)
    return Biases(known, (), (note,) if matters else ())


def _converges(order: Order) -> bool:
    """Whether the observed order is not below the expected one (1 for faster than any power)."""
    wanted = 1.0 if order.expected is None else order.expected - AGREEMENT
    return order.observed is None or order.observed >= wanted


def _raised_to(joint: float, sizes: dict[str, float]) -> dict[str, float]:
    """Sizes whose sum is at least the joint change, each raised in proportion (alike where all are 0)."""
    total = math.fsum(sizes.values())
    if joint <= total:
        return sizes
    if total == 0.0:
        return dict.fromkeys(sizes, joint / len(sizes))
    return {name: size * (joint / total) for name, size in sizes.items()}


def _statement(
    limits: tuple[float, float],
    sampled: Sampled,
    sizes: dict[str, float],
    noise: float | None,
    sampling: float | None,
) -> Statement:
    """Value, error and interval, the latter cut to what is possible, the total uncut."""
    bias = math.fsum(sizes.values())
    left = bias + math.hypot(sampled.left, noise or 0.0)
    right = bias + math.hypot(sampled.right, noise or 0.0)
    low, high = max(sampled.value - left, limits[0]), min(sampled.value + right, limits[1])
    error: dict[str, float | None] = dict.fromkeys(ERROR_KEYS)
    error.update(sizes, bias_noise=noise, sampling=sampling, total=max(left, right))
    return Statement(sampled.value, error, (low, high))


def _corrected(sampled: Sampled, biases: dict[str, Bias], noise: float, sampling: float | None) -> Statement:
    """The mean less its estimated biases, half-width 0.25 B + sqrt(l^2 + N^2).

    Without the model term 0.25 B the interval misses once the sampling error is small.
    """
    by = math.fsum(bias.correction for bias in biases.values())
    moved = replace(sampled, value=sampled.value - by)
    sizes = {name: MODEL_TERM * bias.size for name, bias in biases.items()}
    return representable(_statement(MEAN.limits, moved, sizes, noise, sampling))


def _resolved(statement: Statement, name: str) -> bool:
    size, total = statement.error[name], statement.error["total"]
    return size is not None and total is not None and size >= RESOLUTION * total


def _diverges(statement: Statement, orders: dict[str, Order]) -> bool:
    """Whether a part that matters does not converge: then its limit cannot be guessed."""
    return any(
        order.observed is not None and order.observed < SMALLEST_ORDER and _resolved(statement, name)
        for name, order in orders.items()
    )


def _notes(
    statement: Statement, orders: dict[str, Order], measured: Sequence[MeasuredPart]
) -> tuple[str, ...]:
    """Orders that disagree, parts below the resolution of the split, probes that failed."""
    notes = [
        f"{name}: {order.message}"
        for name, order in orders.items()
        if order.message is not None and _resolved(statement, name)
    ]
    small = [name for name in orders if not _resolved(statement, name)]
    if small:
        notes.append(f"below the resolution of the split: {', '.join(small)}")
    for m in measured:
        failed = int((~m.usable).sum())
        if failed:
            notes.append(f"{m.part.name}: {failed} of {len(m.usable)} probes failed and are left out")
    return tuple(notes)
