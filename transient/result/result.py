"""A finished answer: variables with dimensions and units, the summary, and the case that made it."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np

from transient.result.view import nearest, view

if TYPE_CHECKING:
    from collections.abc import Sequence

    import xarray
    from matplotlib.axes import Axes


class ResultError(ValueError):
    """A result that cannot be written, read or shown as asked; the message is one plain sentence."""


@dataclass(frozen=True, eq=False)
class Variable:
    """One stored quantity: ``data`` with the names of its dimensions, its SI unit ("1" for none) and a title."""

    dims: tuple[str, ...]
    data: np.ndarray
    units: str
    long_name: str


@dataclass(frozen=True, eq=False)
class Result:
    """What a run leaves behind and a result file holds.

    ``variables`` by name, the dimension scales (``time``, ``profile_time``, ``position``, ``wall``) among them;
    ``summary`` the contract's JSON object; ``case_text`` the whole case as TOML; ``attributes`` further root
    attributes of the file (``title``, ``program``, ``created``).

    Variables and parts of the summary are attributes as well: ``result.wall_stress`` is an array in SI,
    ``result.settling.time`` and ``result.walls["upper"].peak_stress`` are numbers of the summary.
    """

    variables: dict[str, Variable]
    summary: dict[str, Any]
    case_text: str
    attributes: dict[str, Any] = field(default_factory=dict)

    @property
    def title(self) -> str:
        """The case's title, or an empty text."""
        return str(self.attributes.get("title") or self.summary.get("title") or "")

    def __getattr__(self, name: str) -> Any:
        """Array of the variable, or view of the part of the summary, of that name."""
        if name.startswith("_") or name in self.__dataclass_fields__:
            # Asked for by copy and pickle before the fields exist, and by probing notebooks.
            raise AttributeError(name)
        if name in self.variables:
            return self.variables[name].data
        if name in self.summary:
            return view(self.summary[name], name)
        raise AttributeError(f"a result has no {name!r}{nearest(name, [*self.variables, *self.summary])}")

    def __dir__(self) -> list[str]:
        return [*super().__dir__(), *(name for name in [*self.variables, *self.summary] if name.isidentifier())]

    def to_xarray(self) -> xarray.Dataset:
        """The variables as an ``xarray.Dataset`` with coordinates, units and attributes.

        Raises ResultError where xarray is not installed.
        """
        try:
            import xarray
        except ImportError:
            raise ResultError('to_xarray needs the package xarray: pip install "transient[xarray]"') from None
        parts = {
            name: (v.dims, v.data, {"units": v.units, "long_name": v.long_name}) for name, v in self.variables.items()
        }
        scales = {name: part for name, part in parts.items() if part[0] == (name,)}
        rest = {name: part for name, part in parts.items() if name not in scales}
        return xarray.Dataset(rest, scales, {"title": self.title, **self.attributes, "case": self.case_text})

    def plot(self, quantity: str | None = None, over: str | None = None, axes: Axes | None = None) -> Axes:
        """``quantity`` on matplotlib ``axes`` (default: new ones), which are returned: see ``transient.result.plot``.

        Raises ResultError for what cannot be plotted.
        """
        from transient.result.plot import plot

        return plot(self, quantity, over, axes)

    def time_lines(self, laid: Sequence[float], seen: float) -> np.ndarray:
        """Displacement (k, N) m at ``seen`` (s) of particles laid across the gap at ``laid`` (k,) s, over ``position``.

        Raises ResultError where the file holds no travel, or for times outside the run.
        """
        from transient.result.lines import time_lines

        return time_lines(self, laid, seen)

    def __repr__(self) -> str:
        from transient.result.display import plain

        return plain(self)

    def _repr_html_(self) -> str:
        from transient.result.display import html

        return html(self)


