"""Chunks solved on other machines: an existing dask.distributed scheduler and its workers."""

from __future__ import annotations

import logging
import socket
import threading
from collections.abc import Iterable
from typing import Any

from transient.case.model import CaseError
from transient.sweep.cases import Plan
from transient.sweep.chunk import Frame, Piece, joined, solve_rows, unsolved
from transient.sweep.keys import Values
from transient.sweep.places import LOST, Finished, Place

PATIENCE = "10s"
AHEAD = 3  # chunks under way per thread of the cluster
_ALONE = threading.Lock()


def cluster(address: str) -> Place:
    """Chunks solved by the workers of the scheduler at ``address``, which is reached at once or refused.

    A worker that dies is the scheduler's business: it gives the chunk to another.  Raises ``CaseError``.
    """
    client = _client(address)

    def place(plan: Plan, chunks: Iterable[int]) -> Finished:
        try:
            yield from _finished(client, plan, iter(chunks))
        finally:
            client.close(timeout=2)

    return place


def _client(address: str) -> Any:
    try:
        import distributed
    except ImportError:
        raise CaseError(
            f'--cluster {address}: needs the package dask.distributed: pip install "transient[cluster]"'
        ) from None
    # Its messages about lost connections are said here in one line.
    for name in ("distributed", "distributed.core", "distributed.client", "distributed.comm"):
        logging.getLogger(name).setLevel(logging.CRITICAL)
    try:
        _knock(address)
        client = distributed.Client(address, timeout=PATIENCE, set_as_default=False)
    except (OSError, ValueError, TypeError) as error:
        raise CaseError(f"--cluster {address}: cannot be reached ({_said(error)}); is its scheduler running?") from None
    try:
        client.wait_for_workers(1, timeout=PATIENCE)
    except TimeoutError:
        client.close(timeout=2)
        raise CaseError(f"--cluster {address}: has no workers; start one with dask worker {address}") from None
    return client


def _knock(address: str) -> None:
    """Finds at once what a client would wait for.  Raises ``OSError`` and ``ValueError``."""
    from distributed.comm import get_address_host_port, resolve_address

    host, port = get_address_host_port(resolve_address(address))
    if not port:
        raise ValueError("a host and a port are needed, such as tcp://10.0.0.5:8786")
    socket.create_connection((host, port), timeout=5.0).close()


def _said(error: BaseException) -> str:
    text = getattr(error, "strerror", None) or (str(error).splitlines() or [type(error).__name__])[0]
    return text if len(text) <= 100 else f"{text[:97]}..."


def _finished(client: Any, plan: Plan, chunks: Any) -> Finished:
    """Chunks as they come in; so many are under way that no worker waits.

    Raises ``OSError`` where the scheduler is lost, or where a worker cannot run the program.
    """
    from distributed import CancelledError, KilledWorker, as_completed

    under_way: dict[Any, int] = {}
    queue = as_completed(loop=client.loop)

    def feed() -> None:
        most = AHEAD * max(sum(client.nthreads().values()), 1)
        while len(under_way) < most:
            chunk = next(chunks, None)
            if chunk is None:
                return
            future = _submit(client, plan, plan.span(chunk))
            under_way[future] = chunk
            queue.add(future)

    try:
        feed()
        while under_way:
            future = next(queue)
            chunk = under_way.pop(future)
            try:
                piece = future.result()
            except KilledWorker:
                piece = _row_by_row(client, plan, chunk)
            yield chunk, piece
            feed()
    except (CancelledError, StopIteration) as error:
        raise OSError(f"the cluster was lost ({_said(error)})") from None
    except ImportError as error:
        raise OSError(f"a worker cannot load the program ({_said(error)}); install it on all machines") from None


def _submit(client: Any, plan: Plan, span: tuple[int, int]) -> Any:
    arguments = (plan.stated["program"], plan.frame, plan.values(*span), plan.faults(*span))
    return client.submit(task, *arguments, pure=False)


def _row_by_row(client: Any, plan: Plan, chunk: int) -> Piece:
    """A chunk that ended several workers: only the row that does so is lost."""
    from distributed import KilledWorker

    pieces = []
    for row in range(*plan.span(chunk)):
        try:
            pieces.append(_submit(client, plan, (row, row + 1)).result())
        except KilledWorker:
            pieces.append(unsolved(plan.frame, 1, LOST))
    return joined(pieces)


def task(program: str, frame: Frame, values: Values, faults: dict[int, str]) -> Piece:
    """One chunk, on a worker: by the same program, one at a time in each process.  Raises ``OSError``."""
    from transient.result.store import _program

    if _program() != program:
        raise OSError(f"a worker has {_program()}, this is {program}; the same version is needed on all machines")
    with _ALONE:
        return solve_rows(frame, values, faults)
