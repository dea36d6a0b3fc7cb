"""HISTORY: a quantity, or an inline table of one of the history kinds, compiled to a drive."""

from __future__ import annotations

from typing import Any

import numpy as np

from transient.case.keys import TABLE_FILE, TABLE_UNITS, Key
from transient.case.lines import Path
from transient.case.reading import Reading, Section, si_value
from transient.case.source import nearest
from transient.case.table import TableFault, read_columns, table_path
from transient.drive import KINDS
from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, DriveError, constant
from transient.units import DIMENSIONS, QuantityError, convert, rate_of, typed

MOST_REPEATS = 10**9
_LARGEST = float(np.finfo(float).max)


def read_history(reading: Reading, path: Path, value: Any, dimension: str) -> Drive:
    """The drive of a HISTORY whose values are of ``dimension``; raises ``CaseError``.

    A bare quantity is a sudden start from zero, or held for ever where the start is steady.
    """
    if not isinstance(value, dict):
        held = si_value(reading, path, value, dimension)
        return constant(held, before=held if reading.steady else 0.0)
    kind = _kind(reading, path, value)
    tabular = any(field.quantity == "times" for field in kind.fields)
    extra = [key.name for key in (*TABLE_FILE, *TABLE_UNITS)] if tabular else []
    section = Section(reading, path, value, ("kind", *(field.name for field in kind.fields), *extra))
    reading.echo((*path, "kind"), kind.name)
    given = _table_arguments(section, dimension) if tabular else {}
    for field in kind.fields:
        if field.quantity in ("times", "values"):
            continue
        if field.name in section:
            given[_python_name(field.name)] = _argument(section, field, dimension)
        elif field.required:
            raise _missing(section, field, dimension)
    try:
        return kind.build(**given)
    except DriveError as error:
        raise (
            section.refuse(error.key.rstrip("_"), str(error)) if error.key else reading.source.refuse(path, str(error))
        ) from None


def _kind(reading: Reading, path: Path, value: dict[str, Any]) -> Kind:
    names = list(KINDS)
    if "kind" not in value:
        known = ", ".join(names)
        raise reading.source.refuse((*path, "kind"), f"is missing; a history needs a kind, one of {known}")
    name = value["kind"]
    if not isinstance(name, str) or name not in KINDS:
        raise reading.source.refuse(
            (*path, "kind"), f"{typed(name)} is no kind of history; {nearest(str(name), names)}"
        )
    return KINDS[name]


def _python_name(name: str) -> str:
    return f"{name}_" if name == "from" else name


def field_dimension(field: Field, dimension: str) -> str:
    """The dimension of one key of a history whose values are of ``dimension``; "" where it has none."""
    own = {"value": dimension, "time": "time", "frequency": "frequency", "angle": "angle"}
    if field.quantity in ("value_rate", "value_jerk"):
        return rate_of(dimension, 1 if field.quantity == "value_rate" else 2)
    return own.get(field.quantity, "")


def _missing(section: Section, field: Field, dimension: str) -> Exception:
    own = field_dimension(field, dimension)
    need = (
        f'{DIMENSIONS[own].words} is needed, such as "{DIMENSIONS[own].example}"' if own else field.doc + " is needed"
    )
    return section.refuse(field.name, f"is missing; {need}")


def _argument(section: Section, field: Field, dimension: str) -> Any:
    """One key's value as the kind's ``build`` takes it."""
    value, path, reading = section.tree[field.name], (*section.path, field.name), section.reading
    own = field_dimension(field, dimension)
    if own:
        return si_value(reading, path, value, own, "positive" if field.positive else "")
    if field.quantity == "history":
        return read_history(reading, path, value, dimension)
    if field.quantity == "histories":
        if not isinstance(value, list | tuple):
            raise section.fault(field.name, "is no list", "a list of histories is needed, in [ ]")
        return [read_history(reading, (*path, i), part, dimension) for i, part in enumerate(value)]
    if field.quantity == "count":
        return section.read(Key(field.name, "whole", field.doc, low=1, high=MOST_REPEATS, example="10"))
    return section.read(Key(field.name, "choice", field.doc, choices=field.choices))


def _table_arguments(section: Section, dimension: str) -> dict[str, np.ndarray]:
    """Times and values in SI, from the file or the lists."""
    if "file" in section:
        times, values = _from_file(section)
    else:
        times, values = _from_lists(section)
    units = {key.name: _unit(section, key) for key in TABLE_UNITS}
    out = {}
    for name, numbers, key, own in (("times", times, "time_unit", "time"), ("values", values, "unit", dimension)):
        try:
            out[name] = convert(numbers, units[key], own)
        except QuantityError as error:
            raise section.refuse(key, str(error)) from None
        _check_size(section, name, out[name], own)
    return out


def _unit(section: Section, key: Key) -> Any:
    if key.name not in section:
        raise section.refuse(
            key.name, f"is missing; {key.doc[0].lower()}{key.doc[1:]} is needed, such as {key.example}"
        )
    return section.tree[key.name]


def _check_size(section: Section, name: str, values: np.ndarray, dimension: str) -> None:
    one = DIMENSIONS[dimension]
    high = np.flatnonzero(np.abs(values) > one.largest)
    if len(high):
        raise section.refuse(name, f"row {high[0] + 1} is outside the range taken, up to {one.largest:g} {one.si}")


def _from_file(section: Section) -> tuple[np.ndarray, np.ndarray]:
    for name in section.given(("times", "values")):
        raise section.refuse(name, "is given beside file; either a file or times and values are needed")
    name = section.read(TABLE_FILE[0])
    columns = [_column(section, key) for key in TABLE_FILE[1:]]
    try:
        times, values = read_columns(table_path(name, section.reading.source.folder), name, *columns)
    except TableFault as fault:
        raise section.refuse(fault.key, str(fault)) from None
    section.reading.echo((*section.path, "file"), f"{name} ({len(times)} rows)")
    _resolve(section, times, values)
    return times, values


def _column(section: Section, key: Key) -> str | int:
    value = section.tree.get(key.name, key.default)
    if isinstance(value, bool) or not isinstance(value, str | int):
        raise section.fault(
            key.name, "is no column", f"a header name or a number from 1 is needed, such as {key.example}"
        )
    return value


def _resolve(section: Section, times: np.ndarray, values: np.ndarray) -> None:
    """Put the file's rows into the resolved tree, in place of its name."""
    here: Any = section.reading.resolved
    for part in section.path:
        here = here[part]
    for key in TABLE_FILE:
        here.pop(key.name, None)
    here.update(times=times.tolist(), values=values.tolist())


def _from_lists(section: Section) -> tuple[np.ndarray, np.ndarray]:
    for name in section.given(key.name for key in TABLE_FILE[1:]):
        raise section.refuse(name, "is given without file; it names a column of a CSV file")
    lists = []
    for name in ("times", "values"):
        if name not in section:
            raise section.refuse(name, "is missing; a list of numbers is needed, or a file")
        lists.append(_numbers(section, name))
    section.reading.echo((*section.path, "times"), f"{len(lists[0])} times and values")
    return lists[0], lists[1]


def _numbers(section: Section, name: str) -> np.ndarray:
    value = section.tree[name]
    if isinstance(value, np.ndarray):
        value = value.tolist()
    if not isinstance(value, list | tuple) or not value:
        raise section.fault(name, "is no list of numbers", "a list is needed, such as [0, 0.5, 1]")
    for i, item in enumerate(value):
        if isinstance(item, bool) or not isinstance(item, int | float | np.number) or not abs(item) <= _LARGEST:
            raise section.reading.source.fault(
                (*section.path, name, i), item, "is no finite number", "plain numbers are needed, with their unit in "
                + ("time_unit" if name == "times" else "unit"),
            )  # fmt: skip
    return np.array(value, dtype=float)
