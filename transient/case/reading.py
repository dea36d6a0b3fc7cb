"""One reading of a case: walks its tree, reads each value by its key, and remembers what was typed."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any, NamedTuple

from transient.case.keys import Key
from transient.case.later import later
from transient.case.lines import Path
from transient.case.source import CaseError, Source, dotted, nearest
from transient.case.tree import copied
from transient.units import DIMENSIONS, QuantityError, quantity, si_unit, typed


class Input(NamedTuple):
    """One input for the echo: its key, as typed, its SI value (None for texts and tables) and SI unit."""

    key: str
    typed: str
    value: float | None
    unit: str


class Reading:
    """The tree under way.  ``resolved`` is its copy in which table files become inline lists."""

    def __init__(self, tree: dict[str, Any], source: Source):
        self.tree = tree
        self.source = source
        self.resolved: dict[str, Any] = copied(tree)
        self.inputs: list[Input] = []
        self.not_yet: list[tuple[Path, str]] = []
        self.rotating = False
        self.steady = False

    def echo(self, path: Path, value: Any, si: float | None = None, unit: str = "") -> None:
        """Remember one input as typed."""
        self.inputs.append(Input(dotted(path), value if isinstance(value, str) else typed(value), si, unit))

    def section(self, path: Path, known: Iterable[str], tree: Any = None) -> Section:
        """The table at ``path`` (of the tree's first levels, or given), empty where it is left out."""
        here = tree
        if here is None:
            here = self.tree
            for part in path:
                here = here.get(part, {}) if isinstance(here, dict) else here
        return Section(self, path, here, tuple(known))

    def refuse_what_comes_later(self) -> None:
        """Refuse keys that were read and understood but cannot be solved yet."""
        for path, words in self.not_yet:
            raise self.source.refuse(path, words)


class Section:
    """One table: refuses unknown keys when opened, then reads values by key."""

    def __init__(self, reading: Reading, path: Path, tree: Any, known: tuple[str, ...]):
        self.reading, self.path, self.tree = reading, path, tree
        if not isinstance(tree, dict):
            raise reading.source.fault(path, tree, "is no table", f"a table with keys such as {known[0]} is needed")
        for name in tree:
            if name not in known:
                words = later(dotted((*path, name)))
                raise self.refuse(name, words or f"unknown key; {nearest(name, known)}")

    def __contains__(self, name: str) -> bool:
        return name in self.tree

    def refuse(self, name: str, message: str) -> CaseError:
        """A refusal about one key of this table."""
        return self.reading.source.refuse((*self.path, name), message)

    def fault(self, name: str, fault: str, need: str) -> CaseError:
        """A refusal in the common form."""
        return self.reading.source.fault((*self.path, name), self.tree.get(name), fault, need)

    def missing(self, key: Key) -> CaseError:
        """A refusal of a table in which ``key`` is missing."""
        what = f"{DIMENSIONS[key.measure(self.reading.rotating)].words}" if key.dimension else "it"
        return self.refuse(key.name, f"is missing; {what} is needed, such as {key.example}")

    def given(self, names: Iterable[str]) -> list[str]:
        """Which of ``names`` are given, in that order."""
        return [name for name in names if name in self.tree]

    def read(self, key: Key) -> Any:
        """The value of one key in SI, or its default; raises ``CaseError``."""
        if key.name not in self.tree:
            if key.required:
                raise self.missing(key)
            return key.default
        value = _READERS[key.kind](self, key, self.tree[key.name])
        path = (*self.path, key.name)
        words = later(dotted(path))
        if words and value != key.default:
            self.reading.not_yet.append((path, words))
        return value


def _quantity(section: Section, key: Key, value: Any) -> float | str:
    path = (*section.path, key.name)
    if isinstance(value, str) and value in key.words:
        section.reading.echo(path, value)
        return value
    dimension = key.measure(section.reading.rotating)
    out = si_value(section.reading, path, value, dimension, key.least, key.words)
    if key.low is not None and key.high is not None and not _inside(out, key.low, key.high):
        raise section.fault(
            key.name, f"is not {_bounds(key)}", f"{DIMENSIONS[dimension].words} is needed, such as {key.example}"
        )
    return out


def _inside(value: float, low: float, high: float) -> bool:
    return low < value < high if low == 0.0 else low * (1 - 1e-12) <= value <= high * (1 + 1e-12)


def _bounds(key: Key) -> str:
    if key.low == 0.0:
        return f"above 0 % and below {100 * key.high:g} %"  # type: ignore[operator]
    return f"within {100 * key.low:g} % to {100 * key.high:g} %"  # type: ignore[operator]


def si_value(
    reading: Reading, path: Path, value: Any, dimension: str, least: str = "", words: tuple[str, ...] = ()
) -> float:
    """SI value of one typed quantity, its sign checked, and echoed; raises ``CaseError``."""
    try:
        out = quantity(value, dimension)
    except QuantityError as error:
        also = "".join(f' or "{word}"' for word in words)
        raise reading.source.refuse(path, str(error) + also) from None
    if (least == "positive" and out <= 0.0) or (least == "zero" and out < 0.0):
        bound = "above zero" if least == "positive" else "of zero or more"
        fault = "is not above zero" if least == "positive" else "is below zero"
        one = DIMENSIONS[dimension]
        raise reading.source.fault(path, value, fault, f'{one.words} {bound} is needed, such as "{one.example}"')
    unit = si_unit(dimension)
    reading.echo(path, value, out, "" if unit == "1" else unit)
    return out


def _text(section: Section, key: Key, value: Any) -> str:
    if not isinstance(value, str) or not value.strip() or "\x00" in value:
        raise section.fault(key.name, "is no text", f"a text is needed, such as {key.example}")
    return value


def _flag(section: Section, key: Key, value: Any) -> bool:
    if not isinstance(value, bool):
        raise section.fault(key.name, "is neither true nor false", "true or false is needed, without quotes")
    section.reading.echo((*section.path, key.name), value)
    return value


def _whole(section: Section, key: Key, value: Any) -> int:
    low, high = int(key.low or 0), int(key.high or 0)
    if isinstance(value, bool) or not isinstance(value, int) or not low <= value <= high:
        raise section.fault(
            key.name, f"is no whole number from {low} to {high}", f"one is needed, such as {key.example}"
        )
    section.reading.echo((*section.path, key.name), value, float(value))
    return value


def _choice(section: Section, key: Key, value: Any) -> str:
    if not isinstance(value, str) or value not in key.choices:
        listed = " or ".join(f'"{choice}"' for choice in key.choices)
        raise section.fault(key.name, "is not known here", f"{listed} is needed")
    section.reading.echo((*section.path, key.name), value)
    return value


def _times(section: Section, key: Key, value: Any) -> tuple[float, ...]:
    if not isinstance(value, list | tuple) or not value:
        raise section.fault(key.name, "is no list of quantities", f"a list is needed, such as {key.example}")
    path = (*section.path, key.name)
    return tuple(
        si_value(section.reading, (*path, i), item, key.measure(section.reading.rotating), key.least)
        for i, item in enumerate(value)
    )


def _table(section: Section, key: Key, value: Any) -> Any:
    if not isinstance(value, dict):
        raise section.fault(key.name, "is no table", "a table with keys of its own is needed")
    return value


_READERS = {
    "quantity": _quantity,
    "text": _text,
    "flag": _flag,
    "whole": _whole,
    "choice": _choice,
    "times": _times,
    "table": _table,
}
