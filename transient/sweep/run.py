"""A plan solved: chunk by chunk into a store, wherever its chunks are solved."""

from __future__ import annotations

from collections.abc import Callable

from transient.sweep.cases import Plan
from transient.sweep.pieces import Store
from transient.sweep.places import Place

# Told how many further rows are finished; called with 0 while time passes.
Watch = Callable[[int], None]


def solve(plan: Plan, store: Store, place: Place, watch: Watch) -> None:
    """Solves what the store is missing.

    Raises ``OSError`` where the store cannot keep a chunk; whatever was kept stays kept.
    """
    for finished in place(plan, store.missing()):
        if finished is None:
            watch(0)
            continue
        chunk, piece = finished
        store.put(chunk, piece)
        first, behind = plan.span(chunk)
        watch(behind - first)
