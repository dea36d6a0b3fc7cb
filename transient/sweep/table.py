"""A sweep's result as it is read: one row a case."""

from __future__ import annotations

import os

import numpy as np

from transient.result import store
from transient.result.result import Result, ResultError

KIND = "sweep"


class Table(Result):
    """The rows of a sweep: a ``Result`` whose variables have the dimension ``case``.

    A varied key has its own name: ``table["gap.height"]``, ``table.peak_stress_upper`` are arrays in SI.
    """

    def __getitem__(self, name: str) -> np.ndarray:
        """Array of a column or a varied key; raises ``KeyError``."""
        try:
            return self.variables[name].data
        except KeyError:
            from transient.result.view import nearest

            raise KeyError(f"the table has no {name!r}{nearest(name, self.variables)}") from None

    def __len__(self) -> int:
        return len(self.variables["case"].data)

    def history(self, case: int) -> tuple[np.ndarray, dict[str, np.ndarray]]:
        """(time (n,) s, stress (n,) Pa by wall) of a row whose history was kept; raises ``ResultError``."""
        if "history_rows" not in self.variables:
            raise ResultError("the sweep kept no histories; state histories = true in [keep]")
        ends = np.cumsum(self["history_rows"])
        part = slice(int(ends[case] - self["history_rows"][case]), int(ends[case]))
        prefix = "history_stress_"
        walls = {name.removeprefix(prefix): name for name in self.variables if name.startswith(prefix)}
        return self["history_time"][part], {wall: self[name][part] for wall, name in walls.items()}

    def __repr__(self) -> str:
        from transient.sweep.words import heading, lines

        return "\n".join([heading(self.summary), *(f"  {line}" for line in lines(self.summary))])

    def _repr_html_(self) -> str:
        from html import escape

        return f"<pre>{escape(repr(self))}</pre>"


def read(path: str | os.PathLike[str]) -> Result:
    """The result in a file: a ``Table`` where it is a sweep's.  Raises ``ResultError``."""
    found = store.read(path)
    if found.attributes.get("kind") != KIND:
        return found
    return Table(found.variables, found.summary, found.case_text, found.attributes)
