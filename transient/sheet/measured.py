"""A measured history from a CSV file whose header names columns with their units."""

from __future__ import annotations

import csv
import os
import re
from pathlib import Path

from transient.case.table import TableFault, read_columns
from transient.result.result import ResultError
from transient.result.trace import Trace
from transient.units import DIMENSIONS, QuantityError, convert, si_unit

_HEADED = re.compile(r"\s*(.*?)\s*[\[(]([^\])]*)[\])]\s*$")


def measured(path: str | os.PathLike[str], like: Trace, column: str | None = None, shift: float = 0.0) -> Trace:
    """The history in a CSV file that is to be held beside ``like``.

    The header's cells carry units, such as ``time [ms]`` and ``stress [Pa]``; the time is the column whose name begins
    with "time" or "t", else the first; the value is ``column`` (its name, with or without unit, or its number from 1),
    else the one named as ``like``, else the only one in its unit.  ``shift`` (s) is added to the times.
    Raises ResultError in one line.
    """
    path = Path(path)
    header = _header(path)
    time = next((i for i, (name, _) in enumerate(header) if name.lower() in ("time", "t")), 0)
    value = _column(path, header, time, like, column)
    try:
        times, values = read_columns(path, path.name, str(time + 1), str(value + 1))
    except TableFault as fault:
        raise ResultError(f"{path.parent / str(fault) if path.parent != Path() else fault}") from None
    times = _si(path, times, header[time], "time")
    values = _si(path, values, header[value], _dimension(like.unit))
    return Trace(like.name, header[value][0] or like.words, path.name, like.unit, times + shift, values, sampled=True)


def _header(path: Path) -> list[tuple[str, str]]:
    """(name, unit or "") of every column."""
    try:
        text = path.read_text(encoding="utf-8-sig")
    except FileNotFoundError:
        raise ResultError(f"{path}: there is no such file") from None
    except (OSError, UnicodeDecodeError):
        raise ResultError(f"{path}: is not a text file; a CSV file with a header is needed") from None
    first = next((line for line in text.splitlines() if line.strip() and not line.startswith("#")), "")
    delimiter = next((sign for sign in ";\t" if sign in first), ",")
    cells = next(csv.reader([first], delimiter=delimiter), [])
    if len(cells) < 2:
        raise ResultError(f"{path}: needs two columns at least, the time and a value")
    found = [_HEADED.match(cell) for cell in cells]
    return [(m[1], m[2].strip()) if m else (cell.strip(), "") for m, cell in zip(found, cells, strict=True)]


def _column(path: Path, header: list[tuple[str, str]], time: int, like: Trace, column: str | None) -> int:
    names = [f"{name} [{unit}]" if unit else name for name, unit in header]
    others = [i for i in range(len(header)) if i != time]
    if column is not None:
        if column.isdigit() and 1 <= int(column) <= len(header):
            return int(column) - 1
        hits = [i for i in others if column in (names[i], header[i][0])]
    else:
        hits = [i for i in others if header[i][0] == like.name] or [i for i in others if _fits(header[i][1], like.unit)]
        hits = hits or (others if len(others) == 1 else [])
    if len(hits) != 1:
        told = ", ".join(f'"{names[i]}"' for i in others)
        raise ResultError(f"{path}: which column? choose one of {told}")
    return hits[0]


def _dimension(unit: str) -> str:
    return next((name for name in DIMENSIONS if si_unit(name) == unit), "fraction")


def _fits(unit: str, wanted: str) -> bool:
    try:
        convert([1.0], unit, _dimension(wanted))
    except QuantityError:
        return False
    return bool(unit)


def _si(path: Path, values, column: tuple[str, str], dimension: str):
    name, unit = column
    if not unit:
        example = si_unit(dimension)
        raise ResultError(f'{path}: column "{name}" needs its unit in the header, such as "{name} [{example}]"')
    try:
        return convert(values, unit, dimension)
    except QuantityError as error:
        raise ResultError(f'{path}: column "{name} [{unit}]": {error}') from None
