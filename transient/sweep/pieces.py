"""Finished chunks: kept in memory, or in a folder beside the result, so that whatever was finished outlives a kill.

A chunk's file is written beside its name, flushed to the disk and renamed: it is whole or absent.
"""

from __future__ import annotations

import json
import os
import shutil
from collections.abc import Iterator
from contextlib import suppress
from pathlib import Path
from typing import Any, Protocol

import numpy as np

from transient.case.model import CaseError
from transient.sweep.cases import Plan
from transient.sweep.chunk import Histories, Piece
from transient.sweep.columns import CODES, Column

IDENTITY = "sweep.json"
LOCK = "lock"
END = b"\nthe end\n"  # of a chunk's file that is whole


class Store(Protocol):
    """Where finished chunks go and come from."""

    def put(self, chunk: int, piece: Piece) -> None:
        """Keeps a finished chunk."""

    def get(self, chunk: int) -> Piece:
        """A chunk that was put."""

    def missing(self) -> list[int]:
        """The chunks still to solve."""


class Memory:
    """Chunks of a sweep that fits in memory and is gone with the process."""

    def __init__(self, plan: Plan):
        self.plan = plan
        self.pieces: dict[int, Piece] = {}

    def put(self, chunk: int, piece: Piece) -> None:
        """Keeps a finished chunk."""
        self.pieces[chunk] = piece

    def get(self, chunk: int) -> Piece:
        """A chunk that was put."""
        return self.pieces[chunk]

    def missing(self) -> list[int]:
        """The chunks still to solve."""
        return [chunk for chunk in range(self.plan.chunks) if chunk not in self.pieces]


class Folder:
    """Chunks as files in ``path``; one sweep at a time, from ``begin`` until the end of a ``with`` block."""

    def __init__(self, plan: Plan, path: Path):
        self.plan, self.path = plan, path
        self.columns = plan.frame.columns
        self._lock: Any = None

    def begin(self) -> None:
        """Makes the folder and names the sweep it belongs to.  Raises ``OSError``."""
        self.path.mkdir(parents=True, exist_ok=True)
        self._hold()
        if not (self.path / IDENTITY).exists():
            _whole(self.path / IDENTITY, json.dumps(self.plan.stated).encode())

    def _hold(self) -> None:
        """Refuses a second sweep into the same folder; the system lets go of it when the process ends."""
        try:
            import fcntl
        except ImportError:  # no such locks on this system
            return
        self._lock = open(self.path / LOCK, "w")  # noqa: SIM115 (held until the sweep ends)
        try:
            # Of the kind that forked workers do not share: they may outlive a killed parent for a moment.
            fcntl.lockf(self._lock, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except (BlockingIOError, PermissionError):
            self.close()
            busy = "another sweep is writing there; wait for it, or name another --out"
            raise CaseError(f"{self.path}: {busy}") from None

    def put(self, chunk: int, piece: Piece) -> None:
        """Keeps a finished chunk.  Raises ``OSError`` where the disk is full."""
        place = self._file(chunk)
        draft = place.with_suffix(".draft")
        try:
            with open(draft, "wb") as file:
                for array in _packed(piece, self.columns):
                    np.save(file, array, allow_pickle=False)
                file.write(END)
                file.flush()
                os.fsync(file.fileno())
            os.replace(draft, place)
        except OSError:
            with suppress(OSError):
                draft.unlink()
            raise

    def get(self, chunk: int) -> Piece:
        """A chunk that was put."""
        number = 6 if self.plan.frame.histories else 3
        with open(self._file(chunk), "rb") as file:
            return _unpacked([np.load(file, allow_pickle=False) for _ in range(number)], self.columns)

    def missing(self) -> list[int]:
        """The chunks still to solve; what is there but not whole counts as missing."""
        return [chunk for chunk in range(self.plan.chunks) if not self._there(chunk)]

    def _there(self, chunk: int) -> bool:
        try:
            with open(self._file(chunk), "rb") as file:
                file.seek(-len(END), os.SEEK_END)
                return file.read() == END
        except OSError:
            return False

    def _file(self, chunk: int) -> Path:
        return self.path / f"{chunk:07d}.piece"

    def close(self) -> None:
        """Lets others write there."""
        if self._lock is not None:
            self._lock.close()
            self._lock = None

    def __enter__(self) -> Folder:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def end(self) -> None:
        """Takes the folder away: its chunks are in the result."""
        self.close()
        shutil.rmtree(self.path, ignore_errors=True)


def identity(path: Path) -> dict[str, Any] | None:
    """What the sweep whose chunks lie in ``path`` was; None where there are none."""
    try:
        return json.loads((path / IDENTITY).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None


def _whole(place: Path, data: bytes) -> None:
    draft = place.with_suffix(".draft")
    with open(draft, "wb") as file:
        file.write(data)
        file.flush()
        os.fsync(file.fileno())
    os.replace(draft, place)


def _packed(piece: Piece, columns: tuple[Column, ...]) -> list[np.ndarray]:
    """A piece as a few plain arrays: the numbers as one block, whose writing costs less than that of many."""
    rows = len(piece.columns["status"])
    numbers = np.array([piece.columns[column.name] for column in columns], dtype=float).reshape(len(columns), rows)
    out = [numbers, np.array([piece.columns[name] for name in CODES]), np.array(piece.columns["message"], dtype=str)]
    kept = piece.histories
    return out if kept is None else [*out, kept.rows, kept.time, kept.stress]


def _unpacked(arrays: list[np.ndarray], columns: tuple[Column, ...]) -> Piece:
    numbers, codes, messages, *kept = arrays
    out = {column.name: row for column, row in zip(columns, numbers, strict=True)}
    out |= {**dict(zip(CODES, codes, strict=True)), "message": messages.astype(object)}
    return Piece(out, Histories(*kept) if kept else None)


def pieces(store: Store, plan: Plan) -> Iterator[tuple[int, int, Piece]]:
    """(first row, row behind the last, piece) of every chunk in order."""
    for chunk in range(plan.chunks):
        yield (*plan.span(chunk), store.get(chunk))
