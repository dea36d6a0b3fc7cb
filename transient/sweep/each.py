"""The runner that takes every row: one case after the other, as ``transient run`` solves it."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence

from transient.case.model import Case, CaseError
from transient.result.result import Result
from transient.sweep.columns import FAILED, REFUSED, Column, Columns, blank, put_summary
from transient.sweep.keys import Values, Varied, changes

Keep = Callable[[int, Result], None]


def takes(base: Case, keys: Sequence[Varied]) -> bool:
    """Always."""
    return True


def solve(
    base: Case, keys: Sequence[Varied], values: Values, columns: Iterable[Column], keep: Keep | None = None
) -> Columns:
    """Every row solved, refused or failed, and saying why; ``keep(row, result)`` is told each solved one."""
    rows = len(next(iter(values.values())))
    columns = tuple(columns)
    out = blank(columns, rows)
    for row in range(rows):
        result = _one(base, keys, values, row, out)
        if result is None:
            continue
        put_summary(out, row, columns, result.summary)
        if keep is not None:
            keep(row, result)
    return out


def _one(base: Case, keys: Sequence[Varied], values: Values, row: int, out: Columns) -> Result | None:
    """The row's result; None where there is none and ``out`` says why."""
    from transient.answer import SolveError, run  # takes a while to load, and a batch has its own solver

    try:
        return run(base.replace(changes(keys, values, row)))
    except CaseError as error:
        status, message = REFUSED, str(error)
    except SolveError as error:
        status, message = FAILED, str(error)
    except Exception as error:  # the other rows shall not suffer from it
        status, message = FAILED, f"an error of the program's own ({type(error).__name__}: {error})"
    out["status"][row] = status
    out["message"][row] = " ".join(message.split())
    return None
