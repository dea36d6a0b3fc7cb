"""Which cases a sweep solves: the grid of [vary] and listed rows, times the samples of [scatter]."""

from __future__ import annotations

from dataclasses import dataclass
from math import prod
from typing import Any

import numpy as np

from transient.sweep.axes import Axis
from transient.sweep.chunk import Frame
from transient.sweep.keys import Values
from transient.sweep.scatter import Scatter


@dataclass(frozen=True, eq=False)
class Plan:
    """``rows`` cases: every combination of the places of ``axes`` (the last one fastest), ``scatter`` at each.

    ``stated`` tells one sweep from another: plain values of all that decides its numbers.
    """

    title: str
    frame: Frame
    axes: tuple[Axis, ...]
    scatter: Scatter | None
    stated: dict[str, Any]
    chunk: int

    @property
    def samples(self) -> int:
        """Cases at each combination."""
        return 1 if self.scatter is None else self.scatter.samples

    @property
    def combinations(self) -> int:
        """Combinations of the axes' places."""
        return prod(one.size for one in self.axes)

    @property
    def rows(self) -> int:
        """Number of cases."""
        return self.combinations * self.samples

    @property
    def chunks(self) -> int:
        """Number of chunks."""
        return -(-self.rows // self.chunk)

    def span(self, chunk: int) -> tuple[int, int]:
        """First row of a chunk, and the one behind its last."""
        return chunk * self.chunk, min((chunk + 1) * self.chunk, self.rows)

    def values(self, first: int, behind: int) -> Values:
        """The varied keys' values in rows ``first`` to ``behind`` - 1."""
        return self.values_of(np.arange(first, behind))

    def values_of(self, rows: np.ndarray) -> Values:
        """The varied keys' values in the given rows (n,)."""
        combination = rows // self.samples
        places = np.unravel_index(combination, [one.size for one in self.axes]) if self.axes else ()
        out = {
            key.name: column[place]
            for one, place in zip(self.axes, places, strict=True)
            for key, column in zip(one.keys, one.values, strict=True)
        }
        if self.scatter is not None:
            drawn = self.scatter.values(rows)
            out |= {key.name: column for key, column in zip(self.scatter.keys, drawn, strict=True)}
        return out

    def faults(self, first: int, behind: int) -> dict[int, str]:
        """What is wrong with rows that are no case at all, by their place among ``first`` to ``behind`` - 1."""
        if not any(one.faults for one in self.axes):
            return {}
        combination = np.arange(first, behind) // self.samples
        places = np.unravel_index(combination, [one.size for one in self.axes])
        return {
            int(row): one.faults[place]
            for one, where in zip(self.axes, places, strict=True)
            for place in one.faults
            for row in np.flatnonzero(where == place)
        }
