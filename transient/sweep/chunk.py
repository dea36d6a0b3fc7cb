"""A chunk of rows: a pure function of the case's text, the keys and the rows' values, wherever it is solved."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np

from transient.case.model import Case
from transient.result.result import Result
from transient.sweep import each
from transient.sweep.columns import FAILED, OPEN, REFUSED, Column, Columns, blank
from transient.sweep.keys import Values, Varied
from transient.sweep.runners import runners


@dataclass(frozen=True)
class Frame:
    """What all chunks of a sweep share: small, and the same on every machine.

    ``walls`` the names whose stress histories are kept where ``histories`` is set.
    """

    case_text: str
    keys: tuple[Varied, ...]
    columns: tuple[Column, ...]
    walls: tuple[str, ...]
    histories: bool = False


@dataclass(frozen=True, eq=False)
class Histories:
    """Stress histories of a chunk end to end: ``rows`` (n,) how many belong to each case, ``time`` (total,) s,
    ``stress`` (total, walls) Pa."""

    rows: np.ndarray
    time: np.ndarray
    stress: np.ndarray


@dataclass(frozen=True, eq=False)
class Piece:
    """A finished chunk."""

    columns: Columns
    histories: Histories | None = None


@lru_cache(maxsize=4)
def _base(text: str) -> Case:
    import tomllib

    return Case(tomllib.loads(text))


def solve_rows(frame: Frame, values: Values, faults: Mapping[int, str]) -> Piece:
    """A finished chunk: ``values`` (n,) per key; ``faults`` what is wrong with rows that are no case at all."""
    base = _base(frame.case_text)
    rows = len(next(iter(values.values())))
    out = blank(frame.columns, rows)
    for row, message in faults.items():
        out["status"][row], out["message"][row] = REFUSED, message
    if frame.histories:
        return _with_histories(frame, base, values, out)
    for runner in runners(base, frame.keys):
        left = np.flatnonzero(out["status"] == OPEN)
        if len(left):
            part = {name: column[left] for name, column in values.items()}
            with _left_to_the_next(runner):
                _put(out, left, runner.solve(base, frame.keys, part, frame.columns))
    return Piece(out)


def left_open(frame: Frame, values: Values) -> float:
    """The share of rows that only the last runner solves, which takes them one by one."""
    base = _base(frame.case_text)
    able = runners(base, frame.keys)[:-1]
    known = np.all([np.isfinite(column) for column in values.values()], axis=0)
    if frame.histories or not able or not known.any():
        return 1.0
    open_rows = np.ones(int(known.sum()), bool)
    part = {name: column[known] for name, column in values.items()}
    for runner in able:
        with _left_to_the_next(runner):
            open_rows &= runner.solve(base, frame.keys, part, frame.columns)["status"] == OPEN
    return float(open_rows.mean())


@contextmanager
def _left_to_the_next(runner: Any) -> Iterator[None]:
    """A runner of many rows at once that meets an error of its own leaves them to the next; the last has none."""
    try:
        yield
    except Exception:
        if runner is each or os.environ.get("TRANSIENT_DEBUG"):
            raise


def unsolved(frame: Frame, rows: int, message: str) -> Piece:
    """A piece of rows that failed, all for one reason."""
    out = blank(frame.columns, rows)
    out["status"][:] = FAILED
    out["message"][:] = message
    if not frame.histories:
        return Piece(out)
    return Piece(out, Histories(np.zeros(rows, np.int64), np.empty(0), np.empty((0, len(frame.walls)))))


def joined(pieces: Sequence[Piece]) -> Piece:
    """Pieces end to end."""
    columns = {name: np.concatenate([one.columns[name] for one in pieces]) for name in pieces[0].columns}
    kept = [one.histories for one in pieces if one.histories is not None]
    if not kept:
        return Piece(columns)
    parts = {name: np.concatenate([getattr(one, name) for one in kept]) for name in ("rows", "time", "stress")}
    return Piece(columns, Histories(**parts))


def _put(out: Columns, rows: np.ndarray, part: Columns) -> None:
    for name, column in out.items():
        column[rows] = part[name]


def _with_histories(frame: Frame, base: Case, values: Values, out: Columns) -> Piece:
    left = np.flatnonzero(out["status"] == OPEN)
    kept: dict[int, tuple[np.ndarray, np.ndarray]] = {}

    def keep(row: int, result: Result) -> None:
        kept[int(left[row])] = _history(result, frame.walls)

    if len(left):
        part = {name: column[left] for name, column in values.items()}
        _put(out, left, each.solve(base, frame.keys, part, frame.columns, keep))
    counts = np.zeros(len(out["status"]), np.int64)
    for row, (time, _) in kept.items():
        counts[row] = len(time)
    ordered = [kept[row] for row in sorted(kept)]
    time = np.concatenate([np.empty(0), *(one[0] for one in ordered)])
    stress = np.concatenate([np.empty((0, len(frame.walls))), *(one[1] for one in ordered)])
    return Piece(out, Histories(counts, time, stress))


def _history(result: Result, walls: tuple[str, ...]) -> tuple[np.ndarray, np.ndarray]:
    names = [str(name) for name in result.variables["wall"].data]
    time = result.variables["time"].data
    stress = np.full((len(time), len(walls)), np.nan)
    for i, wall in enumerate(walls):
        if wall in names:
            stress[:, i] = result.variables["wall_stress"].data[:, names.index(wall)]
    return time, stress
