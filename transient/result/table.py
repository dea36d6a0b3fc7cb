"""Histories, or the rows of a sweep, as text that a spreadsheet or a structural program reads."""

from __future__ import annotations

import csv
import os
from typing import TextIO

import numpy as np

from transient.result.result import Result, ResultError, Variable
from transient.result.whole import whole


def write_csv(result: Result, target: str | os.PathLike[str] | TextIO) -> None:
    """All histories (for a sweep: all rows) as CSV, to a path (whole or not at all) or an open text stream.

    One header line with names and SI units, such as ``time [s],wall_stress upper [Pa]``, then one line per row;
    comma, decimal point and ``\\n`` whatever the system's language.  Every number has the digits that give the
    same double back; where no number exists (an infinite stress, a refused row) ``nan`` is written.  A variable
    over a labelled second dimension makes one column per label; variables of more dimensions are left out.
    Raises ResultError where the result holds no rows, or where the file cannot be written.
    """
    header, columns = table(result)
    if hasattr(target, "write"):
        _fill(target, header, columns)
        return
    with whole(target) as draft, open(draft, "w", encoding="utf-8", newline="") as file:
        _fill(file, header, columns)


def table(result: Result) -> tuple[list[str], list[np.ndarray]]:
    """(header, columns): what ``write_csv`` writes; the columns are arrays (rows,) of numbers or texts."""
    lead = leading(result)
    names = sorted(result.variables, key=lambda name: name != lead)
    header: list[str] = []
    columns: list[np.ndarray] = []
    for name in names:
        variable = result.variables[name]
        if variable.dims[:1] != (lead,) or len(variable.dims) > 2:
            continue
        if len(variable.dims) == 1:
            header.append(_title(name, variable))
            columns.append(variable.data)
            continue
        for i, label in enumerate(_labels(result, variable.dims[1], variable.data.shape[1])):
            header.append(_title(f"{name} {label}", variable))
            columns.append(variable.data[:, i])
    return header, columns


def leading(result: Result) -> str:
    """The dimension whose entries are the rows: ``case`` in a sweep, else ``time``."""
    dims = {variable.dims[0] for variable in result.variables.values() if variable.dims}
    for name in ("case", "time"):
        if name in dims:
            return name
    raise ResultError("the result holds neither histories nor rows of a sweep")


def _title(name: str, variable: Variable) -> str:
    return name if variable.data.dtype.kind in "UOT" else f"{name} [{variable.units}]"


def _labels(result: Result, dim: str, size: int) -> list[str]:
    scale = result.variables.get(dim)
    return [str(i) for i in range(size)] if scale is None else [str(label) for label in scale.data.tolist()]


def _fill(file: TextIO, header: list[str], columns: list[np.ndarray]) -> None:
    writer = csv.writer(file, lineterminator="\n")
    writer.writerow(header)
    writer.writerows(zip(*(column.tolist() for column in columns), strict=True))
