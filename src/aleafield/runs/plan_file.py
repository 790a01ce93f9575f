"""plan.json: every adaptive choice of a run, made before the first chunk is solved and never again."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import asdict, dataclass, field, replace
from typing import Any

from aleafield.accounting import SHARE, number_of_probes, share_of_probes
from aleafield.accounting.probes import least_number
from aleafield.archive.chunks import LANE
from aleafield.archive.durable import write_json
from aleafield.archive.layout import Layout
from aleafield.ensemble.forward_model import ForwardModel
from aleafield.ensemble.level import Level, PathPart
from aleafield.errors import ArchiveError, InputError
from aleafield.field.noise_modes import NoiseModes
from aleafield.randomness.families import Family
from aleafield.sampling.allocation import Allocation

SCHEMA = 1
CHUNK_NUMBERS = 1 << 15
"""Realizations of a chunk times the number of nodes, about."""
MATRIX_NUMBERS = 1 << 24
"""Numbers in the kernel matrices of a chunk, where every realization has its own: 128 MiB, and about four times
as much while they are made.  More only where the least width needs more."""
LARGEST = 256
"""Realizations of a chunk at most; more only where the least width, 8 samples, needs more."""


@dataclass(frozen=True)
class Plan:
    """What a run does, down to the last choice.

    Attributes
    ----------
    digest : str
        Of the study.
    versions : mapping of package to version
    level : Level
        The run's.
    time_step : float
        Largest step of the run's schedule, units of time.
    schedule_times : tuple of float
        Times that every schedule holds.
    path : tuple of PathPart
        The parts of the discretisation error with the levels that measure them.
    allocation : Allocation
    probes : int
        Number of the first samples that are also solved, with all their noise paths, at the extra levels.
    probe_share : float
        Operations of the extra levels over those of the main samples.
    operations : mapping of level label to operations of one realization
    chunk_width : int
        Samples of a chunk, a multiple of 8; the extra levels take narrower ones where there are fewer probes.
        A chunk holds all noise paths of its samples.
    peak_references : mapping of quantity to position
    moment_times, kept_times : tuple of float
        Model times of the field's mean, standard deviation and bands, and of the stored fields.
    data_folder : str
        Below the results folder: where relative paths of the study's data files start.
    operators : tuple of mapping
        By part of the kernel: operator, its error and the reason for the choice.
    notes, choice_notes : tuple of str
        What the user must know of all this, and the part of it that an extension does not change.
    noise : NoiseModes or None
        The noise modes that are kept; None without noise.
    probe_demand : float
        Least number of probes over that of samples, so that the noise of the error split stays small; 0
        without noise.
    families : mapping of family to count
        Runs at the run's level besides the main sample, at least one each; see `with_rows`.
    settled : bool
        Whether no further runs are to be decided on what those above give.
    """

    digest: str
    versions: Mapping[str, str]
    level: Level
    time_step: float
    schedule_times: tuple[float, ...]
    path: tuple[PathPart, ...]
    allocation: Allocation
    probes: int
    probe_share: float
    operations: Mapping[str, float]
    chunk_width: int
    peak_references: Mapping[str, float]
    moment_times: tuple[float, ...]
    kept_times: tuple[float, ...]
    data_folder: str
    operators: tuple[Mapping[str, Any], ...] = ()
    notes: tuple[str, ...] = ()
    choice_notes: tuple[str, ...] = ()
    noise: NoiseModes | None = None
    probe_demand: float = 0.0
    families: Mapping[Family, int] = field(default_factory=dict)
    settled: bool = True

    @property
    def samples(self) -> int:
        """Parameter samples of the run."""
        return self.allocation.samples

    @property
    def repeats(self) -> int:
        """Noise paths of each parameter sample."""
        return self.allocation.repeats

    @property
    def realizations(self) -> int:
        """All noise paths of all parameter samples."""
        return self.allocation.realizations

    @property
    def probe_realizations(self) -> int:
        """All noise paths of the probes."""
        return self.probes * self.repeats

    @property
    def extra_levels(self) -> tuple[Level, ...]:
        """The levels besides the run's own that the path needs, in order."""
        return extra_levels(self.path, self.level)


def extra_levels(path: tuple[PathPart, ...], level: Level) -> tuple[Level, ...]:
    """The levels of a path other than the run's, in order."""
    return tuple(sorted({one for part in path for one in part.levels} - {level}))


def default_width(nodes: int, samples: int, matrix_numbers: int = 0, repeats: int = 1) -> int:
    """Samples of a chunk: about 2^15 numbers of state, a multiple of 8, all chunks about equally long.

    Parameters
    ----------
    nodes : of the run's level
    samples : of the run
    matrix_numbers : numbers of the kernel matrix that a realization has of its own at the finest level
    repeats : noise paths of each sample
    """
    affordable = min(CHUNK_NUMBERS // nodes, MATRIX_NUMBERS // max(matrix_numbers, 1), LARGEST)
    width = max(affordable // repeats // LANE * LANE, LANE)
    chunks = -(-samples // width)
    return -(-samples // (chunks * LANE)) * LANE


def count_probes(
    model: ForwardModel, level: Level, path: tuple[PathPart, ...], samples: int, demand: float = 0.0
) -> tuple[int, float]:
    """Number of probes and the share of the extra levels in the main cost, from counted operations.

    Parameters
    ----------
    model : ForwardModel
    level : the run's
    path : of the run's level
    samples : parameter samples
    demand : least number of probes over that of samples
    """
    extra = sum(model.operations(one) for one in extra_levels(path, level))
    if extra == 0.0:
        return 0, 0.0
    main = model.operations(level)
    probes = number_of_probes(samples, main, extra, least_number(samples, demand))
    return probes, share_of_probes(probes, samples, main, extra)


def plan_notes(
    allocation: Allocation, probes: int, probe_share: float, probe_demand: float = 0.0
) -> tuple[str, ...]:
    """What a user must know of the number of samples and probes."""
    notes = [allocation.note] if allocation.note else []
    wanted = least_number(allocation.samples, probe_demand)
    if probes < min(wanted, allocation.samples):
        notes.append(
            f"differences between levels are noisy: the error split asks for {wanted} probes and has {probes}, which "
            "cost as much as the samples already; a smaller time_step or more nodes make the differences smaller"
        )
    if probe_share > SHARE and allocation.realizations > 1:
        notes.append(
            f"the error split solves {probes} of the {allocation.samples} samples at finer and coarser levels "
            f"too, which costs {100 * probe_share:.0f} % of the samples themselves; more samples make it a "
            "smaller share"
        )
    return tuple(notes)


def with_more_samples(plan: Plan, model: ForwardModel, allocation: Allocation) -> Plan:
    """The plan of an extension: more samples, the probes anew for their number, nothing else anew.

    Other families keep their runs; who wants more of them for more samples asks `with_rows`.
    """
    probes, share = count_probes(model, plan.level, plan.path, allocation.samples, plan.probe_demand)
    return replace(
        plan,
        allocation=allocation,
        probes=probes,
        probe_share=share,
        notes=(*plan.choice_notes, *plan_notes(allocation, probes, share, plan.probe_demand)),
    )


def with_rows(plan: Plan, family: Family, count: int) -> Plan:
    """The plan with so many runs of a family in all, for a stage that is decided on what earlier ones gave.

    Raises
    ------
    InputError
        Under noise.
    ValueError
        For the main family, whose number the allocation says, for no run, and for fewer than there are.
    """
    if plan.noise is not None:
        raise InputError(
            "family",
            f"{family!r} under noise",
            "under noise the main sample is the only one: add samples to it",
        )
    if family == "main" or count < max(1, plan.families.get(family, 0)):
        raise ValueError(
            f"{count} runs of the family {family!r}: of another than main, at least as many as before"
        )
    return replace(plan, families={**plan.families, family: count})


def write_plan(layout: Layout, plan: Plan) -> None:
    """Store a plan as plan.json."""
    document = {"schema": SCHEMA, **asdict(plan), "path": [_part_as_json(p) for p in plan.path]}
    if not plan.families:
        del document["families"]
    if plan.settled:
        del document["settled"]
    write_json(layout.plan, document)


def read_plan(layout: Layout) -> Plan:
    """The plan of a results folder.

    Raises
    ------
    ArchiveError
        When there is none, or it cannot be understood.
    """
    if not layout.plan.exists():
        raise ArchiveError(f"{layout.folder}: no results of aleafield here (plan.json is missing)")
    try:
        return _from_json(json.loads(layout.plan.read_text(encoding="utf-8")))
    except (ValueError, KeyError, TypeError, AttributeError) as error:
        raise ArchiveError(
            f"{layout.plan}: cannot be understood ({type(error).__name__}: {error}); it was changed by hand "
            "or comes from another version of aleafield: run the study into a new folder"
        ) from error


def _part_as_json(part: PathPart) -> dict[str, Any]:
    return {**asdict(part), "peaks": sorted(part.peaks), "passages": sorted(part.passages)}


def _from_json(document: Mapping[str, Any]) -> Plan:
    content = dict(document)
    if content.pop("schema") != SCHEMA:
        raise ValueError(f"schema {document['schema']}")
    content["level"] = Level(**content["level"])
    content["path"] = tuple(_part_from_json(part) for part in content["path"])
    content["allocation"] = Allocation(**content["allocation"])
    content["noise"] = None if content["noise"] is None else NoiseModes(**content["noise"])
    for name in ("schedule_times", "moment_times", "kept_times", "operators", "notes", "choice_notes"):
        content[name] = tuple(content[name])
    return Plan(**content)


def _part_from_json(document: Mapping[str, Any]) -> PathPart:
    content = dict(document)
    for name in ("pair", "coarse_pair"):
        if content[name] is not None:
            first, second = content[name]
            content[name] = (Level(**first), Level(**second))
    for name in ("peaks", "passages"):
        content[name] = frozenset(content[name])
    return PathPart(**content)
