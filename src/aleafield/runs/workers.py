"""Solving tasks, in this process or in several, one BLAS thread each."""

from __future__ import annotations

import os
import pickle
import signal
import threading
import time
from collections.abc import Generator, Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ProcessPoolExecutor, wait
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from dataclasses import dataclass, replace
from multiprocessing import active_children, get_context, parent_process
from multiprocessing.connection import wait as wait_for_end

import numpy as np

from aleafield.archive.chunks import Chunk, Task
from aleafield.archive.description import MOST_KEPT
from aleafield.archive.field_state import BAND_SAMPLES, FAN_REALIZATIONS, FieldState
from aleafield.ensemble.forward_model import ForwardModel
from aleafield.ensemble.level import Level
from aleafield.ensemble.moments import FieldMoments
from aleafield.errors import InputError, Interrupted

WINDOW = 3
"""Tasks handed out per worker at a time."""
THREAD_VARIABLES = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS", "BLIS_NUM_THREADS")


@dataclass(frozen=True)
class Solver:
    """From a task to its chunk; picklable.

    Attributes
    ----------
    model : ForwardModel
    level : Level
        The run's: only there, and only in the main sample, fields are looked at.
    moment_times, kept_times : tuple of float
    """

    model: ForwardModel
    level: Level
    moment_times: tuple[float, ...]
    kept_times: tuple[float, ...]

    def __call__(self, task: Task) -> Chunk:
        """Evaluate a task's realizations and sum up their fields."""
        start = time.process_time()
        n_kept = min(max(MOST_KEPT - task.first, 0), task.count) if self.kept_times else 0
        times: list[float] = []
        if task.level == self.level and task.family == "main":
            times = sorted({*self.moment_times, *(self.kept_times if n_kept else ())})
        records = self.model.evaluate(task.level, task.indices, times, task.family).first(task.count)
        state = kept = None
        if records.fields is not None:
            at_moments = np.searchsorted(times, self.moment_times)
            fields = records.fields[:, at_moments]
            n_band, n_fan = (max(most - task.first, 0) for most in (BAND_SAMPLES, FAN_REALIZATIONS))
            state = FieldState(
                FieldMoments.of(fields, records.valid),
                fields[:n_band].copy(),
                {name: values[:n_fan, at_moments] for name, values in records.histories.items() if n_fan},
            )
            if n_kept:
                kept = records.fields[:n_kept, np.searchsorted(times, self.kept_times)]
        seconds = time.process_time() - start
        return Chunk(task.first, replace(records, fields=None, histories={}), state, kept, seconds)


def solved(solver: Solver, tasks: Sequence[Task], workers: int) -> Generator[tuple[Task, Chunk]]:
    """Tasks with their chunks, in the order in which they end.

    Parameters
    ----------
    solver : Solver
    tasks : sequence of Task
    workers : int
        1: in this process.

    Raises
    ------
    Interrupted
        When a worker process ends before its task does.
    InputError
        When the model cannot be sent to other processes.
    """
    if workers == 1 or len(tasks) <= 1:
        return _solved_here(solver, tasks)
    return _solved_elsewhere(solver, tasks, min(workers, len(tasks)))


def _solved_here(solver: Solver, tasks: Sequence[Task]) -> Generator[tuple[Task, Chunk]]:
    from threadpoolctl import threadpool_limits

    for task in tasks:
        with threadpool_limits(1):
            chunk = solver(task)
        yield task, chunk


def _solved_elsewhere(solver: Solver, tasks: Sequence[Task], workers: int) -> Generator[tuple[Task, Chunk]]:
    _refuse_inside_a_worker()
    try:
        payload = pickle.dumps(solver)
    except (pickle.PicklingError, AttributeError, TypeError) as error:
        raise InputError(
            "workers",
            f"{workers} given, but the model cannot be sent to other processes ({error})",
            "define functions that serve as quantities in a module of their own, or use one worker",
        ) from error
    others = set(active_children())
    waiting = list(reversed(tasks))
    running: dict[Future[Chunk], Task] = {}
    with _one_thread_each():
        pool = ProcessPoolExecutor(workers, get_context("spawn"), _prepare, (payload,))
        try:
            while waiting or running:
                while waiting and len(running) < WINDOW * workers:
                    task = waiting.pop()
                    with _interrupts_held_back():
                        running[pool.submit(_solve, task)] = task
                done, _ = wait(running, return_when=FIRST_COMPLETED)
                for future in done:
                    task = running.pop(future)
                    yield task, future.result()
        except BrokenProcessPool as error:
            raise Interrupted(
                "a worker process ended before its work was done (out of memory, or killed); what was stored "
                "is safe: run the same command again, with fewer --workers where memory is short. In a "
                'script the call must stand under: if __name__ == "__main__"'
            ) from error
        except BaseException:
            for child in set(active_children()) - others:
                child.terminate()
            raise
        finally:
            pool.shutdown(wait=True, cancel_futures=True)


def _refuse_inside_a_worker() -> None:
    if parent_process() is not None:
        raise InputError(
            "workers",
            "several workers asked by a process that is a worker itself",
            'in a script put the call under: if __name__ == "__main__"; or use one worker',
        )


@contextmanager
def _one_thread_each() -> Iterator[None]:
    """Processes started inside take one BLAS thread."""
    before = {name: os.environ.get(name) for name in THREAD_VARIABLES}
    os.environ.update(dict.fromkeys(THREAD_VARIABLES, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                del os.environ[name]
            else:
                os.environ[name] = value


@contextmanager
def _interrupts_held_back() -> Iterator[None]:
    """Processes started inside never see Ctrl-C: the parent ends them."""
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


_payload = b""
_solver: Solver | None = None


def _prepare(payload: bytes) -> None:
    """Start of a worker: keep the model, take one thread, end with the parent."""
    from threadpoolctl import threadpool_limits

    global _payload
    _payload = payload
    threadpool_limits(1)
    threading.Thread(target=_end_with_parent, daemon=True).start()


def _end_with_parent() -> None:
    parent = parent_process()
    if parent is not None:
        wait_for_end([parent.sentinel])
        os._exit(1)


def _solve(task: Task) -> Chunk:
    global _solver
    if _solver is None:
        try:
            _solver = pickle.loads(_payload)
        except (AttributeError, ImportError) as error:
            raise InputError(
                "workers",
                f"the model cannot be read in a worker process ({error})",
                "define functions that serve as quantities in a module of their own, or use one worker",
            ) from None
    assert _solver is not None
    return _solver(task)
