"""A finished sweep put together from its chunks: in memory, or as HDF5 that xarray opens as it is."""

from __future__ import annotations

import json
import os
from collections.abc import Iterator
from datetime import UTC, datetime
from typing import Any

import h5py
import numpy as np

from transient.case.write import to_toml
from transient.result import store as results
from transient.result.result import Variable
from transient.result.whole import whole
from transient.sweep.cases import Plan
from transient.sweep.chunk import Histories, Piece, joined
from transient.sweep.columns import CODES, STATUS, VERDICTS
from transient.sweep.keys import Varied
from transient.sweep.pieces import Store, pieces
from transient.sweep.says import Data, summary
from transient.sweep.table import KIND, Table

PARCEL = 65536  # rows written at once
CASE = ("1", "number of the case, from 0")
_TEXT = h5py.string_dtype()
_LABELS = {"status": np.array(STATUS, object), "verdict": np.array(VERDICTS, object)}
_TITLES = {
    "status": "whether the case was solved, refused or failed",
    "verdict": "whether the answer may be trusted",
    "message": "why a case was not solved, or what to be careful about",
}


def gathered(plan: Plan, store: Store) -> Table:
    """The table of a finished sweep, held in memory."""
    found = [(_parts(plan, first, behind, piece), piece) for first, behind, piece in pieces(store, plan)]
    variables = {"case": Variable(("case",), np.arange(plan.rows), *CASE)}
    for name, kind, units, title in _described(plan):
        data = np.concatenate([parts[name] for parts, _ in found])
        variables[name] = Variable(("case",), data.astype(str) if kind == _TEXT else data, units, title)
    variables |= _kept(plan, [piece.histories for _, piece in found if piece.histories is not None])
    codes = {name: np.concatenate([piece.columns[name] for _, piece in found]) for name in CODES}
    said = summary(Data(plan, codes, lambda name: variables[name].data))
    return Table(variables, said, plan.frame.case_text, _attributes(plan))


def write(plan: Plan, store: Store, path: str | os.PathLike[str]) -> dict[str, Any]:
    """Writes the file of a finished sweep, whole or not at all, part by part; returns its summary.

    Raises ``ResultError`` where the system refuses to write.
    """
    codes = {name: np.empty(plan.rows, np.int8) for name in CODES}
    with whole(path) as draft, h5py.File(draft, "w", track_order=True) as file:
        datasets = _datasets(plan, file)
        for first, behind, piece in _parcels(plan, store):
            for name, data in _parts(plan, first, behind, piece).items():
                datasets[name][first:behind] = data
            for name, column in codes.items():
                column[first:behind] = piece.columns[name]
        _write_histories(plan, store, file)
        said = summary(Data(plan, codes, lambda name: _read(datasets[name])))
        file.attrs.update({**_attributes(plan), "summary": results.to_json(said), "case": plan.frame.case_text})
    return said


def _datasets(plan: Plan, file: h5py.File) -> dict[str, h5py.Dataset]:
    """Empty variables over the cases, by name."""
    scale = file.create_dataset("case", data=np.arange(plan.rows))
    scale.attrs.update(_titled(*CASE))
    scale.make_scale("case")
    out = {}
    for name, kind, units, title in _described(plan):
        out[name] = file.create_dataset(name, (plan.rows,), kind)
        out[name].attrs.update(_titled(units, title))
        out[name].dims[0].attach_scale(scale)
    return out


def _parcels(plan: Plan, store: Store) -> Iterator[tuple[int, int, Piece]]:
    """Pieces in order, small ones together: a call for each would cost more than the writing."""
    waiting: list[Piece] = []
    start = 0
    for _, behind, piece in pieces(store, plan):
        waiting.append(piece)
        if behind - start >= PARCEL or behind == plan.rows:
            yield start, behind, joined(waiting)
            waiting, start = [], behind


def _titled(units: str, title: str) -> dict[str, str]:
    return {"units": units, "long_name": title}


def _attributes(plan: Plan) -> dict[str, Any]:
    return {
        "title": plan.title,
        "kind": KIND,
        "program": plan.stated["program"],
        "created": datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ"),
        "sweep": json.dumps(plan.stated),
        "Conventions": results.CONVENTIONS,
        "schema": results.SCHEMA,
    }


def _described(plan: Plan) -> Iterator[tuple[str, Any, str, str]]:
    """(name, type, units, title) of every variable over the cases."""
    for key in plan.frame.keys:
        yield key.name, _type(key), key.unit, key.name
    for name, title in _TITLES.items():
        yield name, _TEXT, "1", title
    for column in plan.frame.columns:
        yield column.name, np.dtype(float), column.unit, column.long_name


def _type(key: Varied) -> Any:
    return {"quantity": np.dtype(float), "whole": np.dtype(np.int64), "choice": _TEXT}[key.kind]


def _parts(plan: Plan, first: int, behind: int, piece: Any) -> dict[str, np.ndarray]:
    """A chunk's variables as they are stored."""
    values = plan.values(first, behind)
    out = {key.name: _shown(key, values[key.name]) for key in plan.frame.keys}
    for name, column in piece.columns.items():
        out[name] = _LABELS[name][column] if name in _LABELS else column
    return out


def _shown(key: Varied, values: np.ndarray) -> np.ndarray:
    if key.kind != "choice":
        return values
    return np.array([_label(one) for one in key.choices], object)[values]


def _label(choice: Any) -> str:
    """A text as it is, anything else as the case file has it."""
    return choice if isinstance(choice, str) else to_toml({"it": {"is": choice}}).partition("is = ")[2].strip()


HISTORY_ROWS = ("history_rows", "1", "stored rows of this case's history, one after the other along `row`")


def _kept(plan: Plan, found: list[Histories]) -> dict[str, Variable]:
    """Histories in memory: end to end along ``row``, as many as ``history_rows`` says for each case."""
    if not found:
        return {}
    name, units, title = HISTORY_ROWS
    out = {name: Variable(("case",), np.concatenate([one.rows for one in found]), units, title)}
    out["history_time"] = Variable(("row",), np.concatenate([one.time for one in found]), "s", "time")
    stress = np.concatenate([one.stress for one in found])
    for i, wall in enumerate(plan.frame.walls):
        out[f"history_stress_{wall}"] = Variable(("row",), stress[:, i], "Pa", f"stress on the {wall} wall")
    return out


def _write_histories(plan: Plan, store: Store, file: h5py.File) -> None:
    """The same in the file, chunk by chunk (a contiguous ragged array in the words of CF conventions 9.3.3)."""
    if not plan.frame.histories:
        return
    name, units, title = HISTORY_ROWS
    rows = np.concatenate([piece.histories.rows for _, _, piece in pieces(store, plan)])
    counts = file.create_dataset(name, data=rows)
    counts.attrs.update({**_titled(units, title), "sample_dimension": "row"})
    counts.dims[0].attach_scale(file["case"])
    total = int(rows.sum())
    scale = file.create_dataset("row", (total,), ">f4")
    scale.make_scale(f"This is a netCDF dimension but not a netCDF variable.{total:10d}")
    names = {"history_time": ("s", "time")}
    names |= {f"history_stress_{wall}": ("Pa", f"stress on the {wall} wall") for wall in plan.frame.walls}
    for one, (unit, long_name) in names.items():
        dataset = file.create_dataset(one, (total,), float)
        dataset.attrs.update(_titled(unit, long_name))
        dataset.dims[0].attach_scale(scale)
    at = 0
    for _, _, piece in pieces(store, plan):
        part = slice(at, at + len(piece.histories.time))
        file["history_time"][part] = piece.histories.time
        for i, wall in enumerate(plan.frame.walls):
            file[f"history_stress_{wall}"][part] = piece.histories.stress[:, i]
        at = part.stop


def _read(dataset: h5py.Dataset) -> np.ndarray:
    return dataset.asstr()[()] if h5py.check_string_dtype(dataset.dtype) else dataset[()]
