"""From a plan to an ensemble: solve what is missing, store it, put it together.

Only the protocol of a forward model is seen here; which field it solves, and what is asked of it, is not.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from contextlib import ExitStack, closing
from dataclasses import dataclass, field

from aleafield.archive.chunk_store import ChunkStore
from aleafield.archive.chunks import LANE, Task, cut
from aleafield.archive.description import Description
from aleafield.archive.durable import remove, write_json
from aleafield.archive.ensemble_file import Summary, build
from aleafield.archive.ensemble_reader import EnsembleReader, reading
from aleafield.archive.field_state import read_state
from aleafield.archive.layout import Layout
from aleafield.archive.sources import EarlierEnsemble, InTurn, StoredChunks
from aleafield.archive.table import write_table
from aleafield.ensemble.forward_model import ForwardModel
from aleafield.errors import Interrupted
from aleafield.randomness.families import Family
from aleafield.runs.plan_file import Plan
from aleafield.runs.progress import Progress
from aleafield.runs.workers import Solver, solved

WORTH_A_PROCESS = 4e9
"""Operations below which a worker process is not worth its start, about two seconds of work."""


@dataclass(frozen=True)
class Cost:
    """What a run took, over all its starts: wall-clock and processor time in seconds."""

    wall: float = 0.0
    processor: float = 0.0


@dataclass(frozen=True)
class Stored:
    """How much of an ensemble is in place: realizations, those that are probes, runs of other families; 0 and none
    where there is no ensemble."""

    realizations: int = 0
    probes: int = 0
    families: Mapping[Family, int] = field(default_factory=dict)

    @staticmethod
    def whole(plan: Plan) -> Stored:
        """All that a plan asks for."""
        return Stored(plan.realizations, plan.probe_realizations, dict(plan.families))


@dataclass(frozen=True)
class Question:
    """What is asked of an ensemble: how its file describes it, and how its summary is made."""

    describe: Callable[[Plan, Cost], Description]
    summarise: Callable[[EnsembleReader, Plan, Cost], Summary]


def stored_ensemble(layout: Layout) -> Stored:
    """What ensemble.nc of a folder holds."""
    if not layout.ensemble.exists():
        return Stored()
    with reading(layout.ensemble) as reader:
        return Stored(len(reader), reader.probes, reader.families)


def tasks_of(plan: Plan, stored: Stored) -> list[Task]:
    """What is to be solved beyond what is in place: the extra levels, the main sample, the other families."""
    tasks: list[Task] = []
    for level in plan.extra_levels:
        width = min(plan.chunk_width, -(-plan.probes // LANE) * LANE) * plan.repeats
        tasks += cut(level, stored.probes, plan.probe_realizations, width)
    width = plan.chunk_width * plan.repeats
    tasks += cut(plan.level, stored.realizations, plan.realizations, width)
    for family, count in plan.families.items():
        tasks += cut(plan.level, stored.families.get(family, 0), count, plan.chunk_width, family)
    return tasks


def execute(
    layout: Layout, model: ForwardModel, plan: Plan, stored: Stored, workers: int, progress: Progress
) -> int:
    """Solve and store every task that is not stored yet, in no more processes than the work is worth.

    Returns
    -------
    int
        How many tasks were solved.

    Raises
    ------
    Interrupted
        On Ctrl-C, when a worker dies or when the disk fails; what was stored is safe.
    """
    store = ChunkStore(layout)
    tasks = tasks_of(plan, stored)
    missing = [task for task in tasks if not store.holds(task)]
    work = {task: plan.operations[task.level.label] * task.count for task in tasks}
    solver = Solver(model, plan.level, plan.moment_times, plan.kept_times)
    processes = min(workers, max(1, int(sum(work[task] for task in missing) / WORTH_A_PROCESS)))
    done = 0
    progress.start(sum(work.values()), sum(work.values()) - sum(work[task] for task in missing))
    try:
        with closing(solved(solver, missing, processes)) as results:
            for task, chunk in results:
                store.put(task, chunk)
                progress.advance(work[task])
                done += 1
    except KeyboardInterrupt:
        held = len(tasks) - len(missing) + done
        raise Interrupted(
            f"interrupted: {held} of {len(tasks)} chunks are stored in {layout.folder}; the same command "
            "goes on from there"
        ) from None
    finally:
        progress.finish()
    return done


def put_together(layout: Layout, plan: Plan, question: Question) -> Summary:
    """Build ensemble.nc, ensemble.csv and summary.json from what is stored; see `gather`."""
    summary = gather(layout, plan, question)
    with reading(layout.ensemble) as reader:
        write_table(layout, reader)
    write_json(layout.summary, summary)
    return summary


def gather_stage(layout: Layout, plan: Plan, question: Question) -> None:
    """Build an ensemble.nc without statistics, so that the next stage can be decided on it.

    Statements that an earlier, shorter run left would belong to no ensemble: they go first.
    """
    remove(layout.summary)
    gather(layout, plan, Question(question.describe, lambda *_: {"quantities": {}}))


def gather(layout: Layout, plan: Plan, question: Question) -> Summary:
    """Build ensemble.nc from what is stored.

    What an ensemble already in place holds is taken from it, the rest from the chunks.
    """
    stored = stored_ensemble(layout)
    cost, held_state = Cost(), None
    with ExitStack() as stack:
        sources: list[EarlierEnsemble | StoredChunks] = []
        if stored.realizations:
            reader = stack.enter_context(reading(layout.ensemble))
            digest = reader.attribute("field_state_sha256")
            state = None if digest is None else read_state(layout, stored.realizations, str(digest))
            held_state = digest if stored.realizations == plan.realizations else None
            sources.append(EarlierEnsemble(reader, plan.level, state))
            cost = Cost(float(reader.attribute("wall_time_s")), float(reader.attribute("processor_time_s")))
        if stored != Stored.whole(plan):
            store = ChunkStore(layout)
            sources.append(StoredChunks(store, tasks_of(plan, stored)))
            cost = Cost(cost.wall + store.wall_seconds, cost.processor + store.processor_seconds)
        return build(
            layout,
            question.describe(plan, cost),
            InTurn(*sources),
            lambda columns: question.summarise(columns, plan, cost),
            held_state,
        )


def is_solved(layout: Layout, plan: Plan) -> bool:
    """Whether all runs that a plan names are in the ensemble."""
    return stored_ensemble(layout) == Stored.whole(plan)


def is_complete(layout: Layout, plan: Plan) -> bool:
    """Whether everything that comes from solving is in place, and no stage is left to decide."""
    return plan.settled and is_solved(layout, plan)


def clear_parts(layout: Layout) -> None:
    """Remove the chunks, once the ensemble that holds them is in place."""
    remove(layout.parts)
