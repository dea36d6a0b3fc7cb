"""Two columns of a CSV file beside the case file, as plain numbers; every fault is told with its row."""

from __future__ import annotations

import csv
import re
from pathlib import Path as FilePath
from typing import NamedTuple

import numpy as np

from transient.case.source import nearest
from transient.units import typed

_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?")
_COMMA = re.compile(r"[+-]?\d+,\d+(?:[eE][+-]?\d+)?")


class TableFault(ValueError):
    """What is wrong with a table file; ``key`` is the case file's key at fault."""

    def __init__(self, message: str, key: str = "file"):
        super().__init__(message)
        self.key = key


class Row(NamedTuple):
    """One row: its number in the file (from 1, the header counted) and its cells."""

    number: int
    cells: list[str]


def table_path(name: str, folder: FilePath | None) -> FilePath:
    """Where a table file named in a case lies; only CSV files in the case file's folder or below are read."""
    plain = name.replace("\\", "/")
    need = 'the path of a CSV file relative to the case file is needed, such as "speed.csv"'
    if plain.startswith(("/", "~")) or re.match(r"[A-Za-z]:", plain):
        raise TableFault(f"{typed(name)} is not relative to the case file; {need}")
    if ".." in plain.split("/"):
        raise TableFault(f"{typed(name)} leaves the case file's folder; {need}")
    if not plain.lower().endswith(".csv"):
        raise TableFault(f"{typed(name)} is no CSV file; {need}")
    if folder is None:
        raise TableFault(
            f"{typed(name)} has no folder to be read from; give times and values, or read the case from a file"
        )
    return folder / plain


def read_columns(path: FilePath, name: str, time_column: str | int, column: str | int) -> tuple[np.ndarray, np.ndarray]:
    """(times (n,), values (n,)) as written, units not applied; raises ``TableFault``."""
    rows = _rows(path, name)
    width = len(rows[0].cells)
    wanted = (time_column, column)
    header = rows[0].cells if _has_header(rows[0], wanted) else None
    places = [_place(one, header, width, key, name) for one, key in zip(wanted, ("time_column", "column"), strict=True)]
    body = rows[1:] if header else rows
    if not body:
        raise TableFault(f"{name} holds no rows of numbers; times and values are needed")
    numbers = np.array([[_number(row, place, width, name) for place in places] for row in body])
    back = np.flatnonzero(np.diff(numbers[:, 0]) < 0)
    if len(back):
        row = body[back[0] + 1]
        raise TableFault(
            f"{name} row {row.number}: the time goes back to {row.cells[places[0]].strip()}; rising times are needed"
        )
    return numbers[:, 0], numbers[:, 1]


def _rows(path: FilePath, name: str) -> list[Row]:
    try:
        text = path.read_bytes().decode("utf-8-sig")
    except FileNotFoundError:
        raise TableFault(f"there is no file {typed(name)} beside the case file") from None
    except IsADirectoryError:
        raise TableFault(f"{typed(name)} is a folder; a CSV file is needed") from None
    except OSError as error:
        raise TableFault(f"{typed(name)} cannot be read ({error.strerror})") from None
    except UnicodeDecodeError:
        raise TableFault(f"{typed(name)} is not a text file (UTF-8)") from None
    if "\x00" in text:
        raise TableFault(f"{typed(name)} is not a text file (UTF-8)")
    lines = text.splitlines()
    while lines and not lines[-1].strip(" \t,;"):
        lines.pop()
    first = next((line for line in lines if line.strip() and not line.startswith("#")), "")
    if not first:
        raise TableFault(f"{name} is empty; times and values are needed")
    delimiter = next((sign for sign in ";\t" if sign in first), ",")
    reader = csv.reader(lines, delimiter=delimiter)
    try:
        rows = [Row(reader.line_num, cells) for cells in reader if not (cells and cells[0].startswith("#"))]
    except csv.Error as error:
        raise TableFault(f"{name} row {reader.line_num}: {error}") from None
    while rows and not rows[0].cells:
        rows.pop(0)
    return rows


def _has_header(row: Row, wanted: tuple[str | int, ...]) -> bool:
    if any(isinstance(one, str) and not one.isdigit() for one in wanted):
        return True
    cells = [cell.strip() for cell in row.cells]
    return not any(_NUMBER.fullmatch(cell) or _COMMA.fullmatch(cell) for cell in cells)


def _place(wanted: str | int, header: list[str] | None, width: int, key: str, name: str) -> int:
    names = [cell.strip() for cell in header or []]
    if isinstance(wanted, str) and wanted.strip() in names:
        return names.index(wanted.strip())
    if isinstance(wanted, str) and not wanted.isdigit():
        raise TableFault(f"{name} has no column {typed(wanted)}; {nearest(wanted, names)}", key)
    number = int(wanted)
    if not 1 <= number <= width:
        raise TableFault(f"{name} has {width} columns; a column from 1 to {width} is needed, not {number}", key)
    return number - 1


def _number(row: Row, place: int, width: int, name: str) -> float:
    where = f"{name} row {row.number}"
    if not row.cells:
        raise TableFault(f"{where} is empty; a table without gaps is needed")
    if len(row.cells) > width:
        raise TableFault(
            f"{where} has {len(row.cells)} cells, the first row {width}; are there decimal commas? Points are needed"
        )
    cell = row.cells[place].strip() if place < len(row.cells) else ""
    if not cell:
        raise TableFault(f"{where} has no value in column {place + 1}; a table without gaps is needed")
    if _COMMA.fullmatch(cell):
        raise TableFault(f"{where}: {typed(cell)} has a decimal comma; a decimal point is needed")
    if not _NUMBER.fullmatch(cell) or not np.isfinite(float(cell)):
        raise TableFault(f"{where}: {typed(cell)} is no number")
    return float(cell)
