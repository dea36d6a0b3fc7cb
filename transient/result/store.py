"""Results on disk: HDF5 with dimension scales, so that any netCDF-4 reader finds coordinates and units.

``Conventions`` names this layout and not the CF conventions: those want coordinate variables to be numbers and time
to be counted from a date, and ``wall`` holds names, ``time`` seconds from the start of the run.
"""

from __future__ import annotations

import json
import os
from datetime import UTC, datetime
from functools import lru_cache
from pathlib import Path
from typing import Any

import h5py
import numpy as np
from h5py import h5a, h5d, h5ds, h5p, h5s, h5t

from transient.result.result import Result, ResultError, Variable
from transient.result.whole import reason, whole

SCHEMA = 1
CONVENTIONS = f"transient-{SCHEMA}"
# Below this many bytes, compressing costs more time than the smaller file is worth.
WORTH_COMPRESSING = 1 << 20
# Large enough to compress well, small enough to read a part of.
CHUNK_BYTES = 1 << 20
# Root attributes that carry the parts of a Result rather than its free attributes.
OWN = ("case", "summary")

# First bytes of every HDF5 file (HDF5 File Format Specification, II.A).
_SIGNATURE = b"\x89HDF\r\n\x1a\n"
_SCALAR = h5s.create(h5s.SCALAR)
_TEXT = h5py.string_dtype()
_TEXT_STORED = h5t.py_create(_TEXT, logical=True)
_TEXT_HELD = h5t.py_create(_TEXT)


def write(result: Result, path: str | os.PathLike[str]) -> None:
    """Writes ``result`` to ``path``, replacing a former file; the file appears whole or not at all.

    Root attributes: ``title``, ``case``, ``summary`` (JSON), ``program``, ``created``, ``Conventions``, ``schema``
    and the result's own.  Raises ResultError where the summary holds NaN or infinity, where sizes along one
    dimension differ, or where the system refuses to write.
    """
    sizes = _sizes(result)
    attributes = _root(result)
    with whole(path) as draft, h5py.File(draft, "w", track_order=True) as file:
        scales = _write_scales(file.id, result, sizes)
        for name, variable in result.variables.items():
            if variable.dims != (name,):
                _write_variable(file.id, name, variable, [scales[dim] for dim in variable.dims])
        for name, value in attributes.items():
            file.attrs[name] = value


def read(path: str | os.PathLike[str]) -> Result:
    """The result that was written to ``path``.

    Raises ResultError, one line, where there is no such file, where it is cut short, no HDF5, of another origin,
    of a newer schema, or where a part is missing.
    """
    path = Path(path)
    if not path.exists():
        raise ResultError(f"{path}: there is no such file")
    if path.is_dir():
        raise ResultError(f"{path}: is a folder; a result file (.h5) is needed")
    try:
        with h5py.File(path, "r") as file:
            attributes = _read_root(file, path)
            variables = {name: _read_variable(item, path) for name, item in file.items() if _is_variable(item)}
    except (OSError, RuntimeError, KeyError, UnicodeDecodeError) as error:
        raise ResultError(f"{path}: {_unreadable(path, error)}") from error
    case_text = attributes.pop("case")
    return Result(variables, _parse(attributes.pop("summary"), path), case_text, attributes)


def _sizes(result: Result) -> dict[str, int]:
    """Length of every dimension, which all variables must agree on."""
    sizes: dict[str, int] = {}
    for name, variable in result.variables.items():
        if np.ndim(variable.data) != len(variable.dims):
            raise ResultError(f"{name} has {np.ndim(variable.data)} dimensions but names {len(variable.dims)}")
        for dim, size in zip(variable.dims, np.shape(variable.data), strict=True):
            if sizes.setdefault(dim, size) != size:
                raise ResultError(f"{name} has {size} values along {dim}, others have {sizes[dim]}")
    return sizes


def _root(result: Result) -> dict[str, Any]:
    """Root attributes in the order in which they are written."""
    return {
        "title": result.title,
        "program": _program(),
        "created": datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ"),
        **result.attributes,
        "Conventions": CONVENTIONS,
        "schema": SCHEMA,
        "summary": to_json(result.summary),
        "case": result.case_text,
    }


@lru_cache(maxsize=1)
def _program() -> str:
    from importlib.metadata import PackageNotFoundError, version

    try:
        return f"transient {version('transient')}"
    except PackageNotFoundError:
        return "transient"


def to_json(summary: dict[str, Any]) -> str:
    """The summary as JSON text; a NaN or an infinity raises ResultError, since JSON has neither."""
    try:
        return json.dumps(summary, allow_nan=False, ensure_ascii=False, default=_plain)
    except ValueError as error:
        raise ResultError("the summary holds a number that is not finite, which JSON cannot carry") from error


def _plain(value: Any) -> Any:
    if isinstance(value, np.generic | np.ndarray):
        return value.tolist()
    raise TypeError(f"{type(value).__name__} has no JSON form")


def _write_scales(file: h5py.h5f.FileID, result: Result, sizes: dict[str, int]) -> dict[str, h5d.DatasetID]:
    """Writes one dimension scale per dimension; a bare one, as netCDF-4 has it, where no variable is named like it."""
    scales = {}
    for dim, size in sizes.items():
        own = result.variables.get(dim)
        if own is not None and own.dims == (dim,):
            scales[dim] = _write_variable(file, dim, own, [])
            label = dim
        else:
            scales[dim] = h5d.create(file, dim.encode(), h5t.IEEE_F32BE, h5s.create_simple((size,)))
            label = f"This is a netCDF dimension but not a netCDF variable.{size:10d}"
        h5ds.set_scale(scales[dim], label.encode())
    return scales


def _write_variable(
    file: h5py.h5f.FileID, name: str, variable: Variable, scales: list[h5d.DatasetID]
) -> h5d.DatasetID:
    """Writes one variable.  Through the low-level calls: a file of many small arrays is written twice as fast."""
    data = np.asarray(variable.data)
    space = h5s.create_simple(data.shape)
    if data.dtype.kind in "UOT":
        dataset = h5d.create(file, name.encode(), _TEXT_STORED, space)
        if data.size:
            dataset.write(h5s.ALL, h5s.ALL, data.astype(_TEXT), _TEXT_HELD)
    else:
        # HDF5 has no truth values that netCDF readers know; the attribute tells xarray to turn them back.
        stored = np.ascontiguousarray(data.astype(np.int8) if data.dtype == bool else data)
        dataset = h5d.create(file, name.encode(), h5t.py_create(stored.dtype), space, _layout(stored))
        dataset.write(h5s.ALL, h5s.ALL, stored)
    _text(dataset, "units", variable.units)
    _text(dataset, "long_name", variable.long_name)
    if data.dtype == bool:
        _text(dataset, "dtype", "bool")
    for axis, scale in enumerate(scales):
        h5ds.attach_scale(dataset, scale, axis)
    return dataset


def _layout(data: np.ndarray) -> h5p.PropDCID | None:
    """Creation properties: shuffled and lightly compressed chunks for large arrays, else contiguous."""
    if data.nbytes < WORTH_COMPRESSING:
        return None
    rows = max(1, CHUNK_BYTES // (data.nbytes // data.shape[0] or 1))
    layout = h5p.create(h5p.DATASET_CREATE)
    layout.set_chunk((min(rows, data.shape[0]), *data.shape[1:]))
    layout.set_shuffle()
    layout.set_deflate(1)
    return layout


def _text(dataset: h5d.DatasetID, name: str, value: str) -> None:
    h5a.create(dataset, name.encode(), _TEXT_STORED, _SCALAR).write(np.array(value, dtype=_TEXT), _TEXT_HELD)


def _is_variable(item: h5py.Dataset | h5py.Group) -> bool:
    if not isinstance(item, h5py.Dataset):
        return False
    label = item.attrs.get("NAME", b"") if "CLASS" in item.attrs else b""
    return not bytes(label).startswith(b"This is a netCDF dimension but not")


def _read_root(file: h5py.File, path: Path) -> dict[str, Any]:
    """Root attributes, once it is sure that the file is a result of a schema known here."""
    attributes = {name: value.item() if isinstance(value, np.generic) else value for name, value in file.attrs.items()}
    schema = attributes.get("schema")
    if not isinstance(schema, int) or not str(attributes.get("Conventions", "")).startswith("transient-"):
        raise ResultError(f"{path}: is an HDF5 file, but not a result of this program")
    if schema > SCHEMA:
        raise ResultError(f"{path}: has schema {schema}, newer than {SCHEMA} which this version reads; update it")
    for name in OWN:
        if not isinstance(attributes.get(name), str):
            raise ResultError(f"{path}: is damaged, its attribute {name} is missing")
    return attributes


def _read_variable(item: h5py.Dataset, path: Path) -> Variable:
    name = item.name.lstrip("/")
    for wanted in ("units", "long_name"):
        if wanted not in item.attrs:
            raise ResultError(f"{path}: is damaged, {name} has no {wanted}")
    if h5py.check_string_dtype(item.dtype):
        data = item.asstr()[()].astype(str)
    else:
        data = item[()]
    if item.attrs.get("dtype") == "bool":
        data = data.astype(bool)
    if item.is_scale:
        dims: tuple[str, ...] = (name,)
    else:
        dims = tuple(dim[0].name.lstrip("/") for dim in item.dims)
    return Variable(dims, data, str(item.attrs["units"]), str(item.attrs["long_name"]))


def _parse(text: str, path: Path) -> dict[str, Any]:
    try:
        summary = json.loads(text)
    except ValueError:
        summary = None
    if not isinstance(summary, dict):
        raise ResultError(f"{path}: is damaged, its summary is not readable")
    return summary


def _unreadable(path: Path, error: Exception) -> str:
    if isinstance(error, OSError) and error.errno and error.strerror:
        return f"cannot be read: {reason(error)}"
    with open(path, "rb") as file:
        signed = file.read(len(_SIGNATURE)) == _SIGNATURE
    if not signed:
        return "is not an HDF5 file; a result file (.h5) is needed"
    return "is cut short or damaged; run the case again"
