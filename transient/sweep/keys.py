"""The keys that a sweep varies: what kind of value each takes, and a row's values as changes to the case."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

# Values of every varied key by its dotted name, (n,) each: see ``Varied.kind``.
Values = Mapping[str, np.ndarray]


@dataclass(frozen=True)
class Varied:
    """One varied key of the case file, by its dotted ``name`` ("gap.height", "wall.upper.speed.over").

    ``kind`` says what its array in ``Values`` holds: "quantity" SI values (float64, of ``dimension`` and ``unit``, "1"
    for a fraction or a bare number), "whole" whole numbers (int64), "choice" places in ``choices`` (int64), which are
    texts or whole tables as the case file has them.
    """

    name: str
    kind: str
    dimension: str = ""
    unit: str = "1"
    choices: tuple[Any, ...] = ()

    def typed(self, value: Any) -> Any:
        """One value of the array as a case file states it; a quantity reads back to the same float."""
        if self.kind == "choice":
            return self.choices[int(value)]
        if self.kind == "whole":
            return int(value)
        number = float(value)
        return number if self.unit == "1" else f"{number!r} {self.unit}"


def changes(keys: Sequence[Varied], values: Values, row: int) -> dict[str, Any]:
    """One row as changes for ``Case.replace``."""
    return {key.name: key.typed(values[key.name][row]) for key in keys}
