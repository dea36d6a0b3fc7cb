"""A case file in, a validated case out, or a refusal of one line."""

from __future__ import annotations

import os
import re
import tomllib
from collections.abc import Iterable, Sequence
from pathlib import Path as FilePath
from typing import Any

from transient.case.lines import Path
from transient.case.model import Case
from transient.case.override import parse_key, parse_value, put
from transient.case.source import CaseError, Source

__all__ = ["CaseError", "read_case"]

_PLACE = re.compile(r" \(at (?:line (\d+), column \d+|end of document)\)$")
_TWICE = ("Cannot overwrite", "Cannot declare", "Cannot mutate", "Duplicate inline", "Cannot redefine")


def read_case(path: str | os.PathLike[str], overrides: Iterable[tuple[str, str] | str] = ()) -> Case:
    """The case in a file, with keys overridden by (key, text) pairs or "KEY=VALUE"; raises ``CaseError``."""
    file = os.fspath(path)
    text = _read_text(file)
    try:
        tree = _parse(file, text)
        changes = [_change(file, one) for one in overrides]
        return _case(file, text, tree, changes)
    except RecursionError:
        raise CaseError(f"{file}: is nested too deeply") from None


def _case(file: str, text: str, tree: dict[str, Any], changes: list[tuple[Path, Any]]) -> Case:
    try:
        tree, paths = put(tree, changes)
    except CaseError as error:
        raise CaseError(f"{file}: --set {error.key}: {error}", error.key) from None
    return Case(tree, Source(file, FilePath(file).parent, text, frozenset(paths)))


def _change(file: str, override: tuple[str, str] | str) -> tuple[Path, Any]:
    key, value = override.split("=", 1) if isinstance(override, str) and "=" in override else override
    try:
        return parse_key(key), parse_value(value)
    except CaseError as error:
        raise CaseError(f"{file}: --set {key}: {error}") from None


def _read_text(file: str) -> str:
    try:
        data = FilePath(file).read_bytes()
    except FileNotFoundError:
        raise CaseError(f"{file}: there is no such file; the path of a case file is needed") from None
    except IsADirectoryError:
        raise CaseError(f"{file}: is a folder; the path of a case file is needed") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "not a path"
        raise CaseError(f"{file}: cannot be read ({reason})") from None
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = "\x00"
    if "\x00" in text:
        raise CaseError(f"{file}: is not a text file (UTF-8); a TOML case file is needed")
    return text


def _parse(file: str, text: str) -> dict[str, Any]:
    try:
        tree = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise CaseError(_toml_fault(file, text, str(error))) from None
    except ValueError:  # the interpreter's limit on the length of whole numbers
        raise CaseError(f"{file}: holds a number that is too long") from None
    if not tree:
        raise CaseError(f'{file}: is empty; "transient template plates" prints a case file to start from')
    return tree


def _toml_fault(file: str, text: str, message: str) -> str:
    """What the TOML reader says, with file, line and key, and a hint where the mistake is a common one."""
    lines = text.splitlines()
    match = _PLACE.search(message)
    number = int(match[1]) if match and match[1] else len(lines)
    number = max(1, min(number, len(lines)))
    words = _PLACE.sub("", message)
    line = lines[number - 1] if lines else ""
    key, value = _key_on(lines, number)
    if words.startswith(_TWICE):
        inline = re.search(r"[\"']([^\"']+)[\"']$", words) if words.startswith("Duplicate") else None
        name = f"{key}.{inline[1]}" if inline and key else key or line.strip()
        return f"{file}:{number}: {name}: is given twice; keep one of them"
    if value and not value.startswith(('"', "'", "[", "{")):
        bare = value.split("#")[0].strip()
        if re.fullmatch(r"[+-]?\d+,\d+", bare):
            return f"{file}:{number}: {key}: {bare} has a decimal comma; a decimal point is needed"
        example = f'{key.split(".")[-1]} = "{bare}"'
        return f"{file}:{number}: {key}: {bare} needs quotes; write {example}"
    prefix = f"{key}: " if key else ""
    return f"{file}:{number}: {prefix}is not TOML: {words[:1].lower()}{words[1:]}"


def _key_on(lines: Sequence[str], number: int) -> tuple[str, str]:
    """(dotted key, value text) that stands on a line, as far as a broken file tells."""
    line = lines[number - 1] if lines else ""
    header = ""
    for earlier in reversed(lines[:number]):
        found = re.match(r"\s*\[+\s*([^\[\]]+?)\s*\]+", earlier)
        if found:
            header = found[1]
            break
    pair = re.match(r"\s*([A-Za-z0-9_.\-\"']+)\s*=\s*(.*)$", line)
    if pair is None:
        return (header, "") if line.lstrip().startswith("[") else ("", "")
    return ".".join(part for part in (header, pair[1]) if part), pair[2]
