"""A sweep as its user states it: a TOML file, or the arguments of a call; its tables and its refusals."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path as FilePath
from typing import Any

from transient.case.lines import Path
from transient.case.model import CaseError
from transient.case.source import Source, nearest
from transient.case.tree import copied
from transient.units import typed

TABLES = ("title", "case", "rows", "vary", "scatter", "keep")
RANGE = ("from", "to", "count", "spacing", "values")
DRAWN = ("normal", "uniform", "triangular")
SCATTER_OWN = ("samples", "seed", "points")
# Where the keys of the case file stand: in messages these go by their own name.
HOLDERS = ("vary", "scatter")


@dataclass(frozen=True)
class Stated:
    """The tables of a sweep, each checked for unknown keys: ``vary`` and ``scatter`` by dotted key of the case.

    ``at`` says where in the file each of those keys stands.
    """

    source: Source
    title: str
    case: str
    rows: Any
    vary: dict[str, Any]
    scatter: dict[str, Any]
    settings: dict[str, Any]
    histories: bool
    at: dict[str, Path]

    def refuse(self, key: str, message: str, *inside: str | int) -> CaseError:
        """A refusal about a varied key (or what stands ``inside`` its table), as "file:line: key: message"."""
        lines, here = self.source.lines, self.at.get(key, (key,))
        # A plain list is short for { values = [...] }: its items stand one level higher.
        paths = [(*here, *inside), (*here, *(part for part in inside if part != "values"))]
        ways = [path[:end] for end in range(len(here) + len(inside), 0, -1) for path in paths]
        line = next((lines[way] for way in ways if way in lines), None)
        file = self.source.file
        place = f"{file}:{line}" if file and line else file
        name = ".".join([key, *(str(part) for part in inside if not isinstance(part, int))])
        return CaseError(": ".join(part for part in (place, name, message) if part), key)


def read_stated(file: str) -> Stated:
    """The sweep in a file; raises ``CaseError``."""
    text = _text(file)
    try:
        tree = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise CaseError(f"{file}: is not TOML: {str(error)[:1].lower()}{str(error)[1:]}") from None
    except (ValueError, RecursionError):
        raise CaseError(f"{file}: is not TOML that can be read") from None
    source = Source(file, FilePath(file).parent, text)
    if "case" not in tree:
        need = 'the case file to vary is needed, such as case = "flow_cell.toml"'
        if "gap" in tree:
            need = "this is a case file; a sweep file names one and says what varies"
        raise CaseError(f"{file}: case: is missing; {need}", "case")
    return state(tree, source)


def _text(file: str) -> str:
    try:
        return FilePath(file).read_bytes().decode("utf-8-sig")
    except FileNotFoundError:
        raise CaseError(f"{file}: there is no such file; the path of a sweep file is needed") from None
    except IsADirectoryError:
        raise CaseError(f"{file}: is a folder; the path of a sweep file is needed") from None
    except UnicodeDecodeError:
        raise CaseError(f"{file}: is not a text file (UTF-8); a TOML sweep file is needed") from None
    except (OSError, ValueError) as error:
        raise CaseError(f"{file}: cannot be read ({getattr(error, 'strerror', None) or 'not a path'})") from None


def state(tree: Mapping[str, Any], source: Source) -> Stated:
    """The tables of a sweep from plain values; raises ``CaseError``."""
    _known(source, tree, (), TABLES)
    for name, kind, need in (
        ("title", str, "a text is needed"),
        ("case", str, 'the path of a case file is needed, such as "flow_cell.toml"'),
        ("vary", dict, "a table is needed: keys of the case file and their ranges"),
        ("scatter", dict, "a table is needed: keys of the case file and how they scatter"),
        ("keep", dict, "a table is needed, such as histories = true"),
    ):
        if name in tree and not isinstance(tree[name], kind):
            raise source.fault((name,), tree[name], "does not belong here", need)
    keep = tree.get("keep", {})
    _known(source, keep, ("keep",), ("histories",))
    histories = keep.get("histories", False)
    if not isinstance(histories, bool):
        raise source.fault(("keep", "histories"), histories, "is neither true nor false", "true or false is needed")
    at: dict[str, Path] = {}
    scattered = dict(tree.get("scatter", {}))
    settings = {name: scattered.pop(name) for name in SCATTER_OWN if name in scattered}
    vary = _flat(tree.get("vary", {}), ("vary",), RANGE, at)
    scatter = _flat(scattered, ("scatter",), DRAWN, at)
    stated = Stated(
        source, tree.get("title", ""), tree.get("case", ""), tree.get("rows"), vary, scatter, settings, histories, at
    )
    for key in scatter:
        if key in vary:
            raise stated.refuse(key, "stands in [vary] and in [scatter]; it is needed in one of them")
    return stated


def _known(source: Source, table: Mapping[str, Any], path: Path, known: Iterable[str]) -> None:
    for name in table:
        if name not in known:
            raise source.refuse((*path, name), f"unknown key; {nearest(name, known)}")


def _flat(table: Mapping[str, Any], path: Path, marks: tuple[str, ...], at: dict[str, Path]) -> dict[str, Any]:
    """Specifications by dotted key, whether the key is written in quotes or as tables inside tables."""
    out: dict[str, Any] = {}
    for name, value in table.items():
        here = (*path, name)
        if isinstance(value, dict) and value and not any(mark in value for mark in marks) and _nested(value):
            out |= {f"{name}.{inner}": one for inner, one in _flat(value, here, marks, at).items()}
            for inner in [key for key, place in at.items() if place[: len(here)] == here]:
                at[f"{name}.{inner}"] = at.pop(inner)
        else:
            out[name] = copied(value) if isinstance(value, dict | list | tuple) else value
            at[name] = here
    return out


def _nested(table: Mapping[str, Any]) -> bool:
    return all(isinstance(value, dict | list) for value in table.values())


def table_of(stated: Stated, key: str, spec: Any, known: tuple[str, ...], example: str) -> dict[str, Any]:
    """A key's specification as a table with none but ``known`` keys; raises ``CaseError``."""
    if not isinstance(spec, dict) or not spec:
        raise stated.refuse(key, f"{typed(spec)} is no range; one is needed, such as {example}")
    for name in spec:
        if name not in known:
            raise stated.refuse(key, f"unknown key; {nearest(name, known)}", name)
    return spec
