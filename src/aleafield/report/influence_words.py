"""The influence of the inputs in sentences: what matters, how sure that is, what to measure next."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

from aleafield.report.findings import Finding, with_units
from aleafield.report.influence import (
    Influence,
    InputInfluence,
    Measurement,
    PinnedSet,
    ends_of,
)
from aleafield.report.parts import FIRST, INDICES, SHAPLEY, TOTAL, IndexKind
from aleafield.report.rounding import DASH, short, typographic
from aleafield.report.verdict import interval_text, listed, value_text

_MOST_NAMED = 6
_SURE = 0.95
"""Certainty from which a ranking counts as sure."""
_BEYOND_DOUBT = 0.9995
_NOTED = 0.005
"""Share of the variance from which inputs are said to act together."""

_LEADS = {
    TOTAL: "{path} matters most for {quantity}: its total index is {value}",
    SHAPLEY: "{path} has the largest part in the spread of {quantity}: its Shapley effect is {value}",
    FIRST: "{path} by itself explains most of the spread of {quantity}: its first-order index is {value}",
}


def with_interval(found: Finding) -> str:
    """Value and interval, as in "0.612 (0.581 to 0.647)"; a dash where it is not determined."""
    return DASH if found.value is None else f"{value_text(found)} ({interval_text(found)})"


def leading(influence: Influence) -> str:
    """Which input matters most, and how sure it is that none matters more; empty where no index has a value."""
    kind, tiers = influence.ruling, influence.tiers()
    if kind is None:
        return ""
    first = influence.inputs[0]
    text = _LEADS[kind].format(
        path=first.path, quantity=influence.quantity, value=with_interval(first.indices[kind])
    )
    rivals = [one.path for one in tiers[0] if one is not first]
    if influence.first_is_largest is not None and len(influence.inputs) > 1:
        text += f". That none exceeds it is {_certain(influence.first_is_largest)}"
    elif rivals:
        text += f". Its interval is not clear of {listed(rivals)}, so that the first place is not sure"
    elif len(tiers) > 1:
        text += ". No other interval reaches it"
    return f"{text}."


def order(influence: Influence, confidence: str) -> str:
    """The ranking as far as intervals keep it apart; empty for fewer than two inputs with a value."""
    if len(influence.above_next) > 1:
        return _chain(influence)
    tiers = influence.tiers()
    if sum(len(tier) for tier in tiers) < 2:
        return ""
    if len(tiers) == 1:
        return f"The {confidence} intervals of {listed(_paths(tiers[0]))} overlap: their order is not sure."
    steps = [
        listed(_paths(tier)) + ("" if len(tier) == 1 else " (in no sure order)")
        for tier in tiers[:_MOST_NAMED]
    ]
    rest = sum(len(tier) for tier in tiers[_MOST_NAMED:])
    if rest:
        steps.append(f"the other {rest}")
    return f"The order that the {confidence} intervals leave no doubt about: {'; then '.join(steps)}."


def _chain(influence: Influence) -> str:
    """Each input after the one before, with the certainty that it is really below."""
    below = zip(influence.inputs[1:_MOST_NAMED], influence.above_next, strict=False)
    steps = [influence.inputs[0].path, *(f"{one.path} ({_in_percent(sure)} %)" for one, sure in below)]
    rest = len(influence.inputs) - len(steps)
    end = f"; then the other {rest}" if rest else ""
    return f"In order: {', '.join(steps)}{end}. In brackets: how certain it is that the one before is really larger."


def together(influence: Influence) -> str:
    """Which inputs act in combination, as far as that is determined."""
    return _pairs(influence) if influence.pairs else _interactions(influence)


def _pairs(influence: Influence) -> str:
    known = [pair for pair in influence.pairs if pair.index.value is not None]
    if not known:
        return ""
    sure = [
        pair
        for pair in known
        if pair.index.value is not None and pair.index.value >= _NOTED and ends_of(pair.index)[0] > 0.0
    ]
    bound = max((ends_of(pair.index)[1] for pair in known if pair not in sure), default=0.0)
    limit = f"can hold more than {_ceiled(bound)} of the variance" if math.isfinite(bound) else "is bounded"
    if not sure:
        return f"No pair of inputs is seen to act together to speak of, and none {limit}."
    named = [f"{pair.first} with {pair.other}, {with_interval(pair.index)}" for pair in sure[:_MOST_NAMED]]
    text = f"Acting together, beyond what each does alone: {'; '.join(named)} of the variance"
    if len(sure) > _MOST_NAMED:
        text += f"; and {len(sure) - _MOST_NAMED} weaker pairs"
    return f"{text}." if len(sure) == len(known) else f"{text}. No other pair {limit}."


def _interactions(influence: Influence) -> str:
    both = [one for one in influence.inputs if {FIRST, TOTAL} <= one.indices.keys()]
    gaps = {one.path: ends_of(one.indices[TOTAL])[0] - ends_of(one.indices[FIRST])[1] for one in both}
    acting = [path for path, gap in gaps.items() if gap >= _NOTED]
    if not acting:
        return ""
    verb, them = ("acts", "its") if len(acting) == 1 else ("act", "their")
    return (
        f"{listed(acting)} {verb} in combination with other inputs: {them} total index lies clearly above the "
        "first-order one."
    )


def noise_share(influence: Influence) -> str:
    """What the noise causes; empty where it does not apply."""
    noise = influence.noise
    if noise is None:
        return ""
    if noise.value is None:
        return f"The share of the noise: {_unknown(noise.reason)}."
    return (
        f"The noise holds {with_interval(noise)} of the variance: that share stays when all inputs are known."
    )


def undetermined(influence: Influence) -> list[str]:
    """Why indices have no value, one sentence for each kind and reason."""
    stated: dict[tuple[str, str], list[str]] = {}
    for one in influence.inputs:
        for kind in INDICES:
            if kind in one.indices and one.indices[kind].value is None:
                stated.setdefault((_PLURALS[kind], one.indices[kind].reason), []).append(one.path)
    for pair in influence.pairs:
        if pair.index.value is None:
            stated.setdefault((_SECOND, pair.index.reason), []).append(f"{pair.first} with {pair.other}")
    whole = {_SECOND: len(influence.pairs)}
    found = []
    for (kind_name, reason), names in stated.items():
        all_of_them = len(names) == whole.get(kind_name, len(influence.inputs))
        of = "" if all_of_them else f" of {listed(names)}"
        found.append(f"{kind_name}{of} for {influence.quantity}: {_unknown(reason)}.")
    return found


_PLURALS: dict[IndexKind, str] = {
    FIRST: "First-order indices",
    TOTAL: "Total indices",
    SHAPLEY: "Shapley effects",
}
_SECOND = "Second-order indices"


def narrowing(found: Measurement) -> str:
    """Which input to measure first, and what that would bring; why not, where that is not determined."""
    best = found.best
    if best is None:
        reasons = {one.known.reason for one in found.measures if one.known.reason}
        why = "; ".join(sorted(_unknown(reason) for reason in reasons)) or _unknown("")
        return f"What measuring an input would bring for {found.quantity}: {why}."
    if found.present.value is not None and best.known.value is not None:
        low = ends_of(found.present)[0]
        if best.known.value >= low:
            return (
                f"Knowing a single input of {found.quantity} better would not visibly narrow it: its standard "
                f"deviation of {value_text(found.present)} stays within its own error."
            )
    text = (
        f"Of single inputs, {best.path} would narrow {found.quantity} most: known exactly, it would leave a standard "
        f"deviation of {with_interval(best.known)} on average instead of {value_text(found.present)}"
    )
    return f"{text}.{_halving(found)}"


def _halving(found: Measurement) -> str:
    best = found.best
    if best is None or best.halved.value is None:
        return ""
    return f" Halving its spread would leave {with_interval(best.halved)}."


def fixing(found: Measurement) -> str:
    """Which inputs may be fixed."""
    known = [one for one in found.measures if one.may_be_fixed is not None]
    if not known:
        return (
            f"Which inputs may be fixed without changing {found.quantity} is not determined: that takes total "
            "indices."
            if found.best is not None
            else ""
        )
    fixed = [one.path for one in known if one.may_be_fixed]
    if not fixed:
        return f"No input of {found.quantity} may be fixed: each may change it."
    whole = "their middle" if len(fixed) > 1 else "its middle"
    return (
        f"{listed(fixed, 12)} may be fixed at {whole} without changing {found.quantity}: the total index is surely "
        "below the threshold of the study (fix_below)."
    )


def pinned(found: Measurement, one: PinnedSet, written: Callable[[str], str] = typographic) -> str:
    """What must be known for the wanted spread.

    Parameters
    ----------
    found : Measurement
    one : of its sets
    written : how a number in digits is set
    """

    def size(value: float) -> str:
        return with_units(written(short(value)), found.units)

    aim = f"the standard deviation of {found.quantity}"
    if one.inputs is None:
        why = one.reason or "no set of inputs suffices"
        return f"Nothing that can be learnt of the inputs surely brings {aim} down to {size(one.wanted_sd)}: {why}."
    if not one.inputs:
        return f"Nothing need be measured: {aim} is within {size(one.wanted_sd)} already."
    left = "" if one.remaining_sd is None else f": {size(one.remaining_sd)} is expected to stay"
    sure = (
        "no smaller set suffices"
        if one.exhaustive
        else "found by a search that may have missed a smaller set"
    )
    return f"To bring {aim} down to {size(one.wanted_sd)}, pin down {listed(one.inputs, 30)}{left} ({sure})."


def _unknown(reason: str) -> str:
    """A reason as what follows a colon; many begin with the words themselves.

    >>> _unknown("not determined by 16 samples"), _unknown("too rough"), _unknown("")
    ('not determined by 16 samples', 'not determined (too rough)', 'not determined')
    """
    if reason.startswith("not determined"):
        return reason
    return f"not determined ({reason})" if reason else "not determined"


def _paths(tier: Sequence[InputInfluence]) -> list[str]:
    return [one.path for one in tier]


def _certain(share: float) -> str:
    """How certain, at least, in words.

    >>> _certain(1.0), _certain(0.998), _certain(0.871), _certain(0.0)
    ('practically certain', '99.8 % certain at least', 'only 87.1 % certain at least', 'not certain at all')
    """
    if share >= _BEYOND_DOUBT:
        return "practically certain"
    if share <= 0.0:
        return "not certain at all"
    return f"{'' if share >= _SURE else 'only '}{_in_percent(share)} % certain at least"


def _in_percent(share: float) -> str:
    """A certainty in per cent to one decimal, never above what was found and never all.

    >>> _in_percent(1.0), _in_percent(0.9989), _in_percent(0.87)
    ('over 99.9', '99.8', '87')
    """
    if share >= _BEYOND_DOUBT:
        return "over 99.9"
    return f"{math.floor(1000 * share + 1e-9) / 10:g}"


def _ceiled(bound: float) -> str:
    """A bound to two digits, rounded upwards.

    >>> _ceiled(0.0123), _ceiled(0.0)
    ('0.013', '0')
    """
    if bound <= 0:
        return "0"
    scale = 10.0 ** (1 - math.floor(math.log10(bound)))
    return f"{math.ceil(bound * scale - 1e-9) / scale:.2g}"
