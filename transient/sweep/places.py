"""Where chunks are solved: in this process, or in several beside it."""

from __future__ import annotations

import os
import signal
import sys
import threading
import time
import warnings
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager, suppress
from multiprocessing import connection, get_context
from typing import Any

from transient.sweep.cases import Plan
from transient.sweep.chunk import Piece, joined, solve_rows, unsolved

# (chunk, piece) of each finished chunk, in whatever order; None where there is nothing to tell but that time passes.
Finished = Iterator[tuple[int, Piece] | None]
Place = Callable[[Plan, Iterable[int]], Finished]

AHEAD = 2  # tasks that a worker holds: it shall not wait while its last one is written
TICK = 0.25  # s
LOST = "the process that solved it was ended by the system"


def solve_span(plan: Plan, span: tuple[int, int]) -> Piece:
    """Some of a plan's rows, from the first to before the last."""
    return solve_rows(plan.frame, plan.values(*span), plan.faults(*span))


def here(plan: Plan, chunks: Iterable[int]) -> Finished:
    """Chunks solved in this process, one after the other."""
    for chunk in chunks:
        yield chunk, solve_span(plan, plan.span(chunk))


def chosen(plan: Plan, workers: int | None, cluster: str | None) -> Place:
    """Where a user wants a plan solved; raises ``CaseError`` where a cluster cannot be reached."""
    if cluster is not None:
        from transient.sweep.cluster import cluster as at

        return at(cluster)
    number = default_workers() if workers is None else max(workers, 1)
    return here if min(number, plan.chunks) == 1 else processes(number)


def default_workers() -> int:
    """As many as this process may use cores."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def processes(workers: int) -> Place:
    """Chunks solved in ``workers`` processes; one that dies is replaced, and its chunk solved again."""

    def place(plan: Plan, chunks: Iterable[int]) -> Finished:
        team = Team(plan, chunks, workers)
        try:
            yield from team.finished()
        finally:
            team.end()

    return place


class Worker:
    """One process, its pipe, and the chunks it was given and has not returned."""

    def __init__(self, plan: Plan):
        # Forking shares what is loaded already; elsewhere each process loads it anew.
        self.plan = plan
        context: Any = get_context("fork" if sys.platform == "linux" else "spawn")
        self.pipe, theirs = context.Pipe()
        self.process = context.Process(target=_work, args=(theirs, plan, os.getpid()), daemon=True)
        with warnings.catch_warnings(), _undisturbed():
            # Python cautions against forking beside threads; those of the numeric libraries know of it.
            warnings.simplefilter("ignore", DeprecationWarning)
            self.process.start()
        theirs.close()
        self.held: deque[int] = deque()

    def give(self, chunk: int) -> None:
        """Hands over one more chunk."""
        self.held.append(chunk)
        self.pipe.send(self.plan.span(chunk))

    def end(self) -> None:
        """Ends the process at once."""
        self.process.kill()
        self.process.join()
        self.pipe.close()


class Team:
    """The workers of a sweep and what is left to do."""

    def __init__(self, plan: Plan, chunks: Iterable[int], workers: int):
        self.plan = plan
        self.left = deque(chunks)
        plan.values(0, 1)  # samples are made ready once, before the workers are, which then share them
        self.deaths: dict[int, int] = {}
        self.workers = [Worker(plan) for _ in range(min(workers, len(self.left)))]

    def finished(self) -> Finished:
        """Chunks as they come in."""
        self._feed()
        while any(worker.held for worker in self.workers):
            ready = connection.wait([worker.pipe for worker in self.workers if worker.held], TICK)
            yield None
            for worker in [worker for worker in self.workers if worker.pipe in ready]:
                try:
                    piece = worker.pipe.recv()
                except (EOFError, OSError):
                    yield from self._bury(worker)
                else:
                    yield worker.held.popleft(), piece
            self._feed()

    def _feed(self) -> None:
        for _ in range(AHEAD):
            for worker in self.workers:
                if self.left and len(worker.held) < AHEAD:
                    # One that just died is found by the next wait, with this chunk among those it held.
                    with suppress(OSError):
                        worker.give(self.left[0])
                    self.left.popleft()

    def _bury(self, worker: Worker) -> Finished:
        """Another process for a dead one; the chunk that ended two of them is solved row by row."""
        under_way, *others = worker.held
        self.deaths[under_way] = self.deaths.get(under_way, 0) + 1
        self.left.extendleft(reversed(others))
        if self.deaths[under_way] < 2:
            self.left.appendleft(under_way)
        else:
            yield under_way, _row_by_row(self.plan, under_way)
        worker.end()
        self.workers[self.workers.index(worker)] = Worker(self.plan)

    def end(self) -> None:
        """Ends all processes at once."""
        for worker in self.workers:
            worker.end()


def _row_by_row(plan: Plan, chunk: int) -> Piece:
    """A chunk whose rows have a process each, so that only the row that ends its process is lost."""
    return joined([_alone(plan, (row, row + 1)) for row in range(*plan.span(chunk))])


def _alone(plan: Plan, span: tuple[int, int]) -> Piece:
    worker = Worker(plan)
    try:
        worker.pipe.send(span)
        return worker.pipe.recv()
    except (EOFError, OSError):
        return unsolved(plan.frame, span[1] - span[0], LOST)
    finally:
        worker.end()


def _work(pipe: Any, plan: Plan, parent: int) -> None:
    """A worker's life: spans of rows in, pieces out.  An interrupt is its parent's business."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    _heed({signal.SIGINT}, False)
    threading.Thread(target=_outlive_not, args=(parent,), daemon=True).start()
    while True:
        try:
            pipe.send(solve_span(plan, pipe.recv()))
        except (EOFError, BrokenPipeError):
            return


def _heed(signals: set[signal.Signals], held_back: bool) -> None:
    if hasattr(signal, "pthread_sigmask"):
        signal.pthread_sigmask(signal.SIG_BLOCK if held_back else signal.SIG_UNBLOCK, signals)


@contextmanager
def _undisturbed() -> Iterator[None]:
    """Holds an interrupt back while a worker comes to life: it ignores them, but not yet."""
    _heed({signal.SIGINT}, True)
    try:
        yield
    finally:
        _heed({signal.SIGINT}, False)


def _outlive_not(parent: int) -> None:
    """Ends this process soon after its parent was killed, whatever it is at."""
    while os.getppid() == parent:
        time.sleep(0.5)
    os._exit(1)
