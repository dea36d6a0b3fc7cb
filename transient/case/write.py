"""A tree of plain values as TOML text that reads back to the same tree, to the last bit."""

from __future__ import annotations

import re
from typing import Any

_BARE = re.compile(r"[A-Za-z0-9_-]+")
_ESCAPES = {'"': '\\"', "\\": "\\\\", "\n": "\\n", "\t": "\\t", "\r": "\\r"}


def to_toml(tree: dict[str, Any]) -> str:
    """TOML text of ``tree``: plain keys first, then a section for each table of the first two levels."""
    return "\n".join(_section(tree, ())) + "\n"


def _section(table: dict[str, Any], path: tuple[str, ...]) -> list[str]:
    # Three levels as sections ([wall.upper.body]); whatever lies deeper, histories above all, reads better inline.
    split = {key for key, value in table.items() if isinstance(value, dict) and _is_section((*path, key))}
    out = [f"{_key(key)} = {_value(value)}" for key, value in table.items() if key not in split]
    if path and (out or not split):
        out = ["", f"[{'.'.join(map(_key, path))}]", *out]
    for key, value in table.items():
        if key in split:
            out += _section(value, (*path, key))
    return out


def _is_section(path: tuple[str, ...]) -> bool:
    return len(path) == 1 or (path[0] == "wall" and len(path) == 2) or (path[0] == "wall" and path[2:] == ("body",))


def _key(name: str) -> str:
    return name if _BARE.fullmatch(name) else _string(name)


def _string(text: str) -> str:
    return '"' + "".join(_escape(sign) for sign in text) + '"'


def _escape(sign: str) -> str:
    if sign in _ESCAPES:
        return _ESCAPES[sign]
    return f"\\u{ord(sign):04X}" if ord(sign) < 32 or ord(sign) == 127 else sign


def _value(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return _string(value)
    if isinstance(value, int):
        return str(value)
    if isinstance(value, float):
        return repr(value)
    if isinstance(value, dict):
        inner = ", ".join(f"{_key(key)} = {_value(item)}" for key, item in value.items())
        return f"{{ {inner} }}" if inner else "{}"
    if isinstance(value, list | tuple):
        return f"[{', '.join(map(_value, value))}]"
    raise TypeError(f"{type(value).__name__} has no TOML form")
