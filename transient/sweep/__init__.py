"""Many cases: which (``plan``), where they are solved (``places``), what comes of it (``table``); ``size``.

``transient.sweep(case, vary=None, *, scatter=None, rows=None, histories=False, workers=None, cluster=None, out=None,
resume=False, overwrite=False, confirm=False)`` solves every combination of ``vary`` (and ``rows``), and samples of what
scatters, and returns a ``Table`` with a row per case::

    table = transient.sweep(case, vary={"gap.height": ["0.6 mm", "0.8 mm"]}, workers=2)
    table["gap.height"], table.settling_time

``vary`` maps dotted keys to lists or ranges, ``scatter`` is like a sweep file's [scatter] with its ``samples`` and
``seed``, ``rows`` lists cases one by one; values are typed as in a case file, with their units.  ``workers`` processes
(default: one per core), or a dask.distributed scheduler at ``cluster``.  With ``out`` the result goes to that file, its
finished part outlives an interruption, and ``resume`` goes on with it.  More than ten million cases want ``confirm``.
Raises ``CaseError`` where the sweep itself is refused; a case that cannot be solved is a row that says why.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Mapping, Sequence
from types import ModuleType
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from transient.case.model import Case
    from transient.sweep.table import Table


class _Room(ModuleType):
    """This module, callable: the room has the name that its use in Python has."""

    def __call__(
        self,
        case: Case | str | os.PathLike[str],
        vary: Mapping[str, Any] | None = None,
        *,
        scatter: Mapping[str, Any] | None = None,
        rows: Sequence[Mapping[str, Any]] | None = None,
        histories: bool = False,
        workers: int | None = None,
        cluster: str | None = None,
        out: str | os.PathLike[str] | None = None,
        resume: bool = False,
        overwrite: bool = False,
        confirm: bool = False,
    ) -> Table:
        """A sweep over a case: see the room's own words above."""
        from transient.sweep.call import solved

        tree: dict[str, Any] = {"vary": dict(vary or {}), "scatter": dict(scatter or {})}
        if rows is not None:
            tree["rows"] = list(rows)
        tree["keep"] = {"histories": histories}
        return solved(case, tree, workers, cluster, out, resume, overwrite, confirm)


sys.modules[__name__].__class__ = _Room
