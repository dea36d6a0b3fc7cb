"""``rows``: cases listed one by one, in a CSV file beside the sweep file or as tables of keys.

The header names a key of the case file per column, with its unit in square brackets where the cells are plain numbers:
``gap.height [mm],wall.upper.speed.over [ms],start.state``.  Without a unit a cell holds what a case file would say,
such as ``0.8 mm`` or ``steady``.
"""

from __future__ import annotations

import csv
import re
import warnings
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path as FilePath
from typing import Any

import numpy as np

from transient.case.model import CaseError
from transient.case.override import parse_value
from transient.sweep.axes import Axis, choice
from transient.sweep.facts import Facts
from transient.sweep.keys import Varied
from transient.sweep.stated import Stated
from transient.units import QuantityError, convert, quantity, si_unit, typed

_HEAD = re.compile(r"\s*([^\[\]\s]+)\s*(?:\[([^\[\]]*)\])?\s*")
NEED = "a header such as gap.height [mm],wall.upper.speed.over [ms] is needed"
MOST_CANDIDATES = 50


@dataclass(frozen=True)
class Listed:
    """The rows as typed: texts (or values) by key, each with its ``unit`` or None; ``lines`` of the file by row.

    Plain numbers may come as an array instead; then there is nothing to complain of, and no need of ``lines``.
    """

    name: str
    cells: dict[str, Sequence[Any] | np.ndarray]
    units: dict[str, str | None]
    lines: list[int]

    def candidates(self, key: str) -> tuple[Any, ...]:
        """Some of a key's values as a case file would state them."""
        unit = self.units[key]
        cells = self.cells[key]
        some = [*cells[:MOST_CANDIDATES], *cells[-1:]]
        return tuple(_stated(cell, unit) for cell in some)


def _stated(cell: Any, unit: str | None) -> Any:
    if isinstance(cell, float) and unit is not None:
        cell = repr(float(cell)).removesuffix(".0")
    if not isinstance(cell, str):
        return cell
    if unit is None:
        return parse_value(cell) if cell else cell
    return f"{cell} {unit}".strip()


def read_rows(stated: Stated) -> Listed | None:
    """The listed rows, None where the sweep has none; raises ``CaseError``."""
    given = stated.rows
    if given is None:
        return None
    if isinstance(given, list | tuple) and given and all(isinstance(row, Mapping) for row in given):
        return _from_tables(stated, [dict(row) for row in given])
    if not isinstance(given, str) or not given.strip():
        raise stated.source.fault(("rows",), given, "names no rows", 'a CSV file is needed, such as rows = "cases.csv"')
    return _from_file(stated, given)


def _from_tables(stated: Stated, rows: list[dict[str, Any]]) -> Listed:
    keys = list(rows[0])
    for i, row in enumerate(rows):
        if list(row) != keys:
            raise stated.source.refuse(("rows", i), f"has other keys than the first row; {', '.join(keys)} are needed")
    cells = {key: [row[key] for row in rows] for key in keys}
    return Listed("rows", cells, dict.fromkeys(keys), list(range(1, len(rows) + 1)))


def _from_file(stated: Stated, name: str) -> Listed:
    path = (stated.source.folder or ".") / name if stated.source.folder else name

    def refuse(message: str, line: int = 0) -> CaseError:
        place = f"{name}:{line}" if line else name
        return stated.source.refuse(("rows",), f"{place}: {message}")

    try:
        with open(path, encoding="utf-8-sig", newline="") as file:
            reader = csv.reader(file)
            head = next((row for row in reader if any(row) and row[0][:1] != "#"), [])
            line = reader.line_num
            plain = _all_numbers(path, line, len(head)) if all("[" in cell for cell in head) else None
            file.seek(0)
            reader = csv.reader(file if plain is None else [])
            lines = [(reader.line_num, row) for row in reader if any(row) and row[0][:1] != "#"]
    except UnicodeDecodeError:
        raise refuse("is not a text file (UTF-8); a CSV file is needed") from None
    except (OSError, ValueError, csv.Error) as error:
        raise refuse(f"cannot be read ({getattr(error, 'strerror', None) or error})") from None
    if plain is not None:
        heads = _heads(head, line, refuse)
        return Listed(name, {key: column for (key, _), column in zip(heads, plain.T, strict=True)}, dict(heads), [])
    return _typed_rows(name, lines, refuse)


def _typed_rows(name: str, lines: list[tuple[int, list[str]]], refuse: Callable[..., CaseError]) -> Listed:
    """Rows of texts, each with the number of its line; the first is the header."""
    if len(lines) < 2:
        raise refuse(f"holds no rows; {NEED}, and a line for each case")
    heads = _heads(lines[0][1], lines[0][0], refuse)
    for number, row in lines[1:]:
        if len(row) != len(heads):
            raise refuse(f"has {len(row)} cells; {len(heads)} are needed", number)
    numbers, rows = zip(*lines[1:], strict=True)
    columns = zip(*rows, strict=True)
    cells = {key: [*map(str.strip, column)] for (key, _), column in zip(heads, columns, strict=True)}
    return Listed(name, cells, dict(heads), [*numbers])


def _all_numbers(path: str | FilePath, skipped: int, columns: int) -> np.ndarray | None:
    """The numbers (rows, columns) below the header of a file that holds nothing else; None where it is not so plain."""
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            out = np.loadtxt(path, delimiter=",", skiprows=skipped, comments=None, ndmin=2, encoding="utf-8-sig")
    except ValueError:
        return None
    return out if len(out) and out.shape[1] == columns and np.isfinite(out).all() else None


def _heads(cells: list[str], line: int, refuse: Callable[..., CaseError]) -> list[tuple[str, str | None]]:
    heads: list[tuple[str, str | None]] = []
    for cell in cells:
        match = _HEAD.fullmatch(cell)
        if match is None:
            raise refuse(f"{typed(cell)} names no key; {NEED}", line)
        if match[1] in dict(heads):
            raise refuse(f"{match[1]}: is given twice; keep one of them", line)
        heads.append((match[1], match[2]))
    return heads


def axis(stated: Stated, rows: Listed, facts: dict[str, Facts], reads: Callable[[str, Any], bool]) -> Axis:
    """The rows as one axis; a cell that cannot be understood makes its row one that says so.  Raises ``CaseError``."""
    faults: dict[int, str] = {}
    columns = [_column(stated, rows, key, facts[key], reads, faults) for key in rows.cells]
    return Axis(tuple(key for key, _ in columns), tuple(values for _, values in columns), faults)


def _column(
    stated: Stated, rows: Listed, key: str, facts: Facts, reads: Callable[[str, Any], bool], faults: dict[int, str]
) -> tuple[Varied, np.ndarray]:
    unit, cells = rows.units[key], rows.cells[key]
    if facts.kind == "choice":
        return choice(key, [_stated(cell, unit) for cell in cells])
    dimension = facts.dimension or "fraction"
    if unit:
        values = _numbers(rows, key, dimension, unit, faults)
    else:
        values = np.array([_one(rows, key, i, cell, dimension, faults) for i, cell in enumerate(cells)])
        texts = [i for i in np.flatnonzero(np.isnan(values)) if isinstance(cells[i], str) and reads(key, cells[i])]
        if texts:  # "auto" among times: then the key is one of choices
            for i in texts:
                faults.pop(int(i), None)
            return choice(key, [_stated(cell, unit) for cell in cells])
    if facts.kind == "whole" and np.all((values == np.rint(values)) | np.isnan(values)):
        return Varied(key, "whole"), np.nan_to_num(values).astype(np.int64)
    return Varied(key, "quantity", dimension, si_unit(dimension)), values


def _fault(rows: Listed, key: str, row: int, message: str) -> str:
    return f"{rows.name}:{rows.lines[row]}: {key}: {message}"


def _numbers(rows: Listed, key: str, dimension: str, unit: str, faults: dict[int, str]) -> np.ndarray:
    """A column of plain numbers in one unit, in SI; NaN where a cell is no number."""
    cells = rows.cells[key]
    out = cells if isinstance(cells, np.ndarray) else np.array([*map(_number, cells)])
    for i in np.flatnonzero(~np.isfinite(out)):
        out[i] = np.nan
        need = f"a plain number in {unit} is needed"
        faults.setdefault(int(i), _fault(rows, key, i, f"{typed(cells[i])} is no number; {need}"))
    return convert(out, unit, dimension)


def _number(cell: Any) -> float:
    try:
        return float(cell)
    except (ValueError, TypeError):
        return np.nan


def _one(rows: Listed, key: str, row: int, cell: Any, dimension: str, faults: dict[int, str]) -> float:
    """A cell that carries its own unit, in SI; NaN where it cannot be understood."""
    try:
        return quantity(parse_value(cell) if dimension == "fraction" and isinstance(cell, str) else cell, dimension)
    except QuantityError as error:
        faults.setdefault(row, _fault(rows, key, row, str(error)))
        return np.nan
