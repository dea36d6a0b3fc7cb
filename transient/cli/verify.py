"""``transient verify``: the solver against exact solutions, row by row."""

from __future__ import annotations

import json
import platform
import time
from typing import TYPE_CHECKING, Annotated

import typer

from transient.cli.words import FAILED, GOOD, Version, say

if TYPE_CHECKING:
    from transient.trust.verification import Row


def verify(
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON object with all rows.")] = False,
    version: Version = False,
) -> int:
    """Compare the solver with exact solutions.

    Runs the built-in verification set and prints the worst error of each row beside its limit.
    """
    from transient.answer import solve
    from transient.trust.verification import verify as run_all

    began = time.perf_counter()
    rows = run_all(solve)
    seconds = time.perf_counter() - began
    passed = all(row.passed for row in rows)
    if as_json:
        say(json.dumps(_record(rows, seconds, passed), ensure_ascii=False, allow_nan=False))
    else:
        say("\n".join(_lines(rows, seconds)))
    return GOOD if passed else FAILED


def _lines(rows: list[Row], seconds: float) -> list[str]:
    """The rows as a table, and what made them."""
    from transient.cli.numbers import columns

    cells = [["", "worst error", "limit", "exact answer after"]]
    cells += [
        ["ok" if row.passed else "FAILED", f"{row.worst:.2e}", f"{row.limit:.2e}", row.source] for row in rows
    ]
    names = ["what is checked", *(row.name for row in rows)]
    table = list(columns([[name, *line] for name, line in zip(names, cells, strict=True)]))
    failed = sum(not row.passed for row in rows)
    verdict = "every row is within its limit" if not failed else f"{failed} outside their limit"
    parts = ", ".join(f"{name} {number}" for name, number in _versions().items())
    return [*table, "", f"{len(rows)} rows in {seconds:.1f} s: {verdict}", parts]


def _record(rows: list[Row], seconds: float, passed: bool) -> dict[str, object]:
    """The same for programs."""
    return {
        "passed": passed,
        "rows": [
            {"name": r.name, "worst_error": r.worst, "limit": r.limit, "source": r.source, "passed": r.passed}
            for r in rows
        ],
        "seconds": seconds,
        "versions": _versions(),
    }


def _versions() -> dict[str, str]:
    """What the numbers were made with."""
    from importlib.metadata import version as installed

    packages = ("transient", "numpy", "scipy", "numba", "h5py")
    return {**{name: installed(name) for name in packages}, "python": platform.python_version()}
