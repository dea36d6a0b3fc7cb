"""Read-only views that make the keys of a summary attributes."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from difflib import get_close_matches
from typing import Any


def nearest(name: str, known: Iterable[str]) -> str:
    """The end of a message about an unknown ``name``: the nearest known one, or all of them."""
    names = [str(item) for item in known]
    close = get_close_matches(name, names, n=1, cutoff=0.5)
    if close:
        return f"; did you mean {close[0]!r}?"
    return f"; there are: {', '.join(sorted(names))}" if names else ""


class View(Mapping[str, Any]):
    """A part of the summary: ``part["time"]`` and ``part.time`` are the same number."""

    __slots__ = ("_name", "_part")

    def __init__(self, part: Mapping[str, Any], name: str):
        self._part = part
        self._name = name

    def __getitem__(self, key: str) -> Any:
        try:
            return view(self._part[key], f"{self._name}.{key}")
        except KeyError:
            raise KeyError(f"{self._name} has no {key!r}{nearest(str(key), self._part)}") from None

    def __getattr__(self, key: str) -> Any:
        if key.startswith("_"):
            raise AttributeError(key)
        try:
            return self[key]
        except KeyError as error:
            raise AttributeError(error.args[0]) from None

    def __iter__(self) -> Iterator[str]:
        return iter(self._part)

    def __len__(self) -> int:
        return len(self._part)

    def __dir__(self) -> list[str]:
        return [*super().__dir__(), *(str(key) for key in self._part)]

    def __repr__(self) -> str:
        return f"{self._name}: " + ", ".join(f"{key}={value!r}" for key, value in self._part.items())

    def __reduce__(self) -> tuple[Any, ...]:
        return View, (dict(self._part), self._name)


def view(value: Any, name: str) -> Any:
    """``value`` as it is read: mappings as views, lists as tuples of such, anything else unchanged."""
    if isinstance(value, Mapping):
        return View(value, name)
    if isinstance(value, list):
        return tuple(view(item, f"{name}[{i}]") for i, item in enumerate(value))
    return value
