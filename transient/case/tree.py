"""The tree of plain values that a case file is."""

from __future__ import annotations

from typing import Any


def copied(value: Any) -> Any:
    """A copy that shares no table and no list with ``value``; long lists of numbers are copied as one."""
    if isinstance(value, dict):
        return {key: copied(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        if any(isinstance(item, dict | list | tuple) for item in value):
            return [copied(item) for item in value]
        return list(value)
    return value
