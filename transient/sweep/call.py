"""A sweep from Python: plan, place and store put together."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from transient.case.model import Case, CaseError
from transient.case.read import read_case
from transient.sweep.file import gathered, write
from transient.sweep.output import opened, refuse_too_many
from transient.sweep.pieces import Memory
from transient.sweep.places import chosen
from transient.sweep.plan import plan_of
from transient.sweep.run import solve
from transient.sweep.table import Table, read


def solved(
    case: Case | str | os.PathLike[str],
    tree: Mapping[str, Any],
    workers: int | None,
    cluster: str | None,
    out: str | os.PathLike[str] | None,
    resume: bool,
    overwrite: bool,
    confirm: bool,
) -> Table:
    """The table of a sweep over ``case`` with the tables of a sweep file; see ``transient.sweep``."""
    base = case if isinstance(case, Case) else read_case(case)
    plan = plan_of(base, tree)
    refuse_too_many(plan, plan.title, confirm, "confirm=True")
    place = chosen(plan, workers, cluster)
    if out is None:
        store = Memory(plan)
        solve(plan, store, place, _unwatched)
        return gathered(plan, store)
    folder = opened(plan, Path(out), resume, overwrite)
    if folder is not None:
        with folder:
            solve(plan, folder, place, _unwatched)
            write(plan, folder, out)
            folder.end()
    table = read(out)
    if not isinstance(table, Table):
        raise CaseError(f"{os.fspath(out)}: is not the result of a sweep")
    return table


def _unwatched(cases: int) -> None:
    """Nobody watches."""
