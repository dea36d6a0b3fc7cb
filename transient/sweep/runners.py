"""Who solves the rows of a chunk: the registry of sweep runners, fastest first.

A runner is a module of this room with

- ``takes(base, keys) -> bool``: whether it solves rows of this form at all, told from the case and the varied keys;
- ``solve(base, keys, values, columns) -> Columns``: one entry a row; a row that it does not vouch for it leaves with
  status "open", and the next runner gets it.

``each`` takes everything and leaves nothing open.  A row's numbers may depend on its own values only, never on the rows
beside it: that makes a sweep the same whatever the number of workers.
"""

from __future__ import annotations

from collections.abc import Sequence
from importlib import import_module
from typing import Any

from transient.case.model import Case
from transient.sweep.keys import Varied

RUNNERS: tuple[str, ...] = ("lanes", "each")


def runners(base: Case, keys: Sequence[Varied]) -> list[Any]:
    """The runners that take rows of this form, in the order in which they are asked."""
    found = [import_module(f"transient.sweep.{name}") for name in RUNNERS]
    return [runner for runner in found if runner.takes(base, keys)]
