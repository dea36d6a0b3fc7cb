"""Keys set from outside the file: where a dotted key points, and what its text means."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable, Mapping
from typing import Any

from transient.case.lines import Path
from transient.case.source import CaseError
from transient.case.tree import copied
from transient.units import typed


def parse_key(key: str) -> Path:
    """The path of a dotted key such as ``wall.upper.speed.parts.1.to`` (list items from 1)."""
    parts = key.strip().split(".")
    if not all(part.strip() for part in parts):
        raise CaseError(f"{typed(key)} is no key; a dotted key is needed, such as gap.height", key)
    return tuple(part.strip() for part in parts)


def parse_value(text: str) -> Any:
    """A value as TOML reads it, else the text itself."""
    try:
        tree = tomllib.loads(f"value = {text}")
    except (ValueError, RecursionError):
        return text
    # A line break in the text could smuggle further keys in.
    return tree["value"] if set(tree) == {"value"} else text


def put(tree: dict[str, Any], changes: Iterable[tuple[Path, Any]]) -> tuple[dict[str, Any], list[Path]]:
    """(a copy of ``tree`` with keys set, their paths with list items as numbers); raises ``CaseError``."""
    out = copied(tree)
    paths = [_put(out, path, value) for path, value in changes]
    return out, paths


def _put(tree: dict[str, Any], path: Path, value: Any) -> Path:
    here: Any = tree
    done: tuple[str | int, ...] = ()
    for position, part in enumerate(path):
        last = position == len(path) - 1
        if isinstance(here, list):
            part = _item(here, part, done)
        elif not isinstance(here, dict):
            raise CaseError(f"{'.'.join(map(str, done))} is {typed(here)}, which has no keys", ".".join(map(str, path)))
        if last:
            here[part] = copied(value)
        elif isinstance(here, dict):
            here.setdefault(part, {})
        here = here[part]
        done = (*done, part)
    return done


def _item(here: list[Any], part: str | int, done: Path) -> int:
    number = int(part) if str(part).isdigit() else 0
    if not 1 <= number <= len(here):
        name = ".".join(map(str, done))
        raise CaseError(f"{name} is a list of {len(here)}; an item from 1 to {len(here)} is needed, not {typed(part)}")
    return number - 1


def as_changes(changes: Mapping[str, Any]) -> list[tuple[Path, Any]]:
    """Changes by dotted key, or with double underscores for dots, as (path, value)."""
    return [(parse_key(key if "." in key else key.replace("__", ".")), value) for key, value in changes.items()]
