"""[vary]: one key's range or list as an axis of the grid."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from transient.case.model import CaseError
from transient.sweep.facts import Facts
from transient.sweep.keys import Varied
from transient.sweep.stated import RANGE, Stated, table_of
from transient.units import QuantityError, quantity, si_unit, typed

EXAMPLE = '{ from = "0.4 mm", to = "1.2 mm", count = 5 } or { values = ["0.4 mm", "0.8 mm"] }'
SPACINGS = ("lin", "log")
MOST_COUNT = 10**9  # an axis is held in memory

Reads = Callable[[str, Any], bool]


@dataclass(frozen=True, eq=False)
class Axis:
    """Values that go together: each of ``keys`` has an array (m,) in ``values``, and ``size`` is m.

    ``faults``: what is wrong with places that are no case at all.
    """

    keys: tuple[Varied, ...]
    values: tuple[np.ndarray, ...]
    faults: dict[int, str] = field(default_factory=dict)

    @property
    def size(self) -> int:
        """How many places it has."""
        return len(self.values[0])


@dataclass(frozen=True)
class Range:
    """A key's range as typed: ``listed`` values, or from ``first`` to ``last`` in ``count`` steps."""

    listed: tuple[Any, ...] | None
    first: Any = None
    last: Any = None
    count: int = 0
    spacing: str = "lin"

    @property
    def candidates(self) -> tuple[Any, ...]:
        """Values as typed, from which the case tells what kind of key it is."""
        return (self.first, self.last) if self.listed is None else self.listed

    @property
    def size(self) -> int:
        """How many values it has."""
        return self.count if self.listed is None else len(self.listed)


def read_range(stated: Stated, key: str, spec: Any) -> Range:
    """A key's range from its specification, a table or a plain list; raises ``CaseError``."""
    if isinstance(spec, list | tuple | np.ndarray):
        spec = {"values": list(spec)}
    table = table_of(stated, key, spec, RANGE, EXAMPLE)
    if "values" in table:
        return _listed(stated, key, table)
    for name in ("from", "to", "count"):
        if name not in table:
            raise stated.refuse(key, f"{name} is missing; a range is needed, such as {EXAMPLE}")
    count, spacing = table["count"], table.get("spacing", "lin")
    if isinstance(count, bool) or not isinstance(count, int) or not 1 <= count <= MOST_COUNT:
        raise stated.refuse(key, f"{typed(count)} makes no grid; a whole number from 1 is needed, such as 5", "count")
    if spacing not in SPACINGS:
        raise stated.refuse(key, f'{typed(spacing)} is not known here; "lin" or "log" is needed', "spacing")
    return Range(None, table["from"], table["to"], count, spacing)


def _listed(stated: Stated, key: str, table: dict[str, Any]) -> Range:
    beside = next((name for name in table if name != "values"), None)
    if beside:
        raise stated.refuse(key, f"{beside} is given beside values; a range or a list is needed, not both", beside)
    values = table["values"]
    if not isinstance(values, list | tuple | np.ndarray) or not len(values):
        need = 'a list is needed, such as ["0.4 mm", "0.8 mm"]'
        raise stated.refuse(key, f"{typed(values)} is no grid; {need}", "values")
    return Range(tuple(v.item() if isinstance(v, np.generic) else v for v in values))


def axis(stated: Stated, key: str, given: Range, facts: Facts, reads: Reads) -> Axis:
    """The axis of a key whose kind is known; ``reads(key, value)`` tries a value as typed.  Raises ``CaseError``."""
    if given.listed is not None:
        varied, values = listed(stated, key, given.listed, facts, reads)
    else:
        varied, values = _spread(stated, key, given, facts, reads)
    return Axis((varied,), (values,))


def listed(
    stated: Stated, key: str, items: Sequence[Any], facts: Facts, reads: Reads
) -> tuple[Varied, np.ndarray]:
    """A list of typed values as (varied key, array)."""
    whole = facts.kind == "whole" and all(isinstance(item, int) and not isinstance(item, bool) for item in items)
    if whole:
        return Varied(key, "whole"), np.array(items, np.int64)
    if facts.kind == "choice":
        return choice(key, items)
    dimension = facts.dimension or "fraction"
    out = np.empty(len(items))
    for i, item in enumerate(items):
        try:
            out[i] = quantity(item, dimension)
        except QuantityError as error:
            # "auto" among times, a table among speeds: then the key is one of choices.
            if reads(key, item):
                return choice(key, items)
            raise stated.refuse(key, str(error), "values", i) from None
    return Varied(key, "quantity", dimension, si_unit(dimension)), out


def choice(key: str, items: Sequence[Any]) -> tuple[Varied, np.ndarray]:
    """Texts and tables by their place among the different ones."""
    different: list[Any] = []
    places = np.empty(len(items), np.int64)
    for i, item in enumerate(items):
        if item not in different:
            different.append(item)
        places[i] = different.index(item)
    return Varied(key, "choice", choices=tuple(different)), places


def _spread(stated: Stated, key: str, given: Range, facts: Facts, reads: Reads) -> tuple[Varied, np.ndarray]:
    if facts.kind == "choice":
        raise stated.refuse(key, 'takes no range; a list is needed, such as { values = ["rest", "steady"] }')
    dimension = facts.dimension or "fraction"
    ends = []
    for name, value in (("from", given.first), ("to", given.last)):
        try:
            ends.append(quantity(value, dimension))
        except QuantityError as error:
            raise stated.refuse(key, str(error), name) from None
    low, high = ends
    if given.spacing == "log" and (low == 0.0 or high == 0.0 or (low < 0.0) != (high < 0.0)):
        raise stated.refuse(key, "a log spacing needs ends above zero; lin is needed here", "spacing")
    values = (np.geomspace if given.spacing == "log" else np.linspace)(low, high, given.count)
    if facts.kind == "whole":
        if np.all(values == np.rint(values)):
            return Varied(key, "whole"), values.astype(np.int64)
        odd = float(values[values != np.rint(values)][0])
        if not reads(key, odd):
            need = "a count that falls on whole numbers is needed"
            raise stated.refuse(key, f"{odd:.6g} would be one of its values and is no whole number; {need}", "count")
    return Varied(key, "quantity", dimension, si_unit(dimension)), values


__all__ = ["Axis", "CaseError", "Range", "axis", "choice", "listed", "read_range"]
