"""Panels over time that several figures share: any history by wall, and any single history."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from transient.result.result import Result
from transient.result.scale import scale
from transient.sheet.labels import Board
from transient.sheet.span import Span
from transient.sheet.style import INK, STROKE, extent, margins, name_axis, zero_line

if TYPE_CHECKING:
    from matplotlib.axes import Axes

# Curves closer than this share of their size everywhere are one curve with two names.
SAME = 2e-3


def wall_names(result: Result) -> list[str]:
    """The walls in stored order."""
    return [str(name) for name in result.variables["wall"].data]


def grouped(curves: np.ndarray, names: list[str]) -> list[tuple[int, str]]:
    """(first column, joint name) of the distinct ones among the columns of ``curves`` (n, walls)."""
    low, high = extent(curves)
    size = max(abs(low), abs(high))
    groups: list[tuple[int, list[str]]] = []
    for i, name in enumerate(names):
        for first, members in groups:
            if np.array_equal(np.isfinite(curves[:, i]), np.isfinite(curves[:, first])):
                apart = extent(curves[:, i] - curves[:, first])
                if max(abs(apart[0]), abs(apart[1])) <= SAME * size:
                    members.append(name)
                    break
        else:
            groups.append((i, [name]))
    every = len(names) > 1 and len(groups) == 1
    return [(first, "both walls" if every else ", ".join(members)) for first, members in groups]


def by_wall(axes: Axes, result: Result, name: str, span: Span, limits: tuple[float, float] | None = None) -> Board:
    """Draws the (time, wall) variable ``name``: a stroke per wall, each named at its right end."""
    variable = result.variables[name]
    data = variable.data
    low, high = margins(*extent(data)) if limits is None else limits
    unit = scale(max(abs(low), abs(high)), variable.units)
    x = span.shown(result.time)
    span.dress(axes, last=False)
    axes.set_ylim(low * unit.factor, high * unit.factor)
    board = Board(axes, unit.factor)
    ends = []
    for column, label in grouped(data, wall_names(result)):
        y = data[:, column] * unit.factor
        board.curve(x, y, color=INK[column], ls=STROKE[column], label=label, gid=f"{name} {label}")
        ends.append((float(y[np.isfinite(y)][-1]) if np.isfinite(y).any() else 0.0, label, {"color": INK[column]}))
    board.at_ends(ends)
    name_axis(axes, WORDS.get(name, variable.long_name), unit.unit)
    zero_line(axes)
    return board


def single(axes: Axes, result: Result, name: str, span: Span) -> Board:
    """Draws the (time,) variable ``name``."""
    variable = result.variables[name]
    low, high = margins(*extent(variable.data, np.zeros(1)))
    unit = scale(max(abs(low), abs(high)), variable.units)
    x = span.shown(result.time)
    span.dress(axes, last=False)
    axes.set_ylim(low * unit.factor, high * unit.factor)
    y = variable.data * unit.factor
    board = Board(axes, unit.factor)
    board.curve(x, y, color=INK[0], ls=STROKE[0], gid=name)
    name_axis(axes, WORDS.get(name, variable.long_name), unit.unit)
    zero_line(axes)
    return board


def drives(result: Result) -> list[str]:
    """The variables that show what drives the flow: wall speeds if a wall moves, the pressure drop if there is one."""
    moving = _stirs(result, "wall_speed")
    pressed = _stirs(result, "pressure_drop_per_length")
    names = [name for name, on in (("wall_speed", moving), ("pressure_drop_per_length", pressed)) if on]
    return names or [name for name in ("wall_speed",) if name in result.variables]


def drive(axes: Axes, result: Result, name: str, span: Span) -> None:
    """The panel of one of ``drives``."""
    if name == "wall_speed":
        by_wall(axes, result, name, span)
    else:
        single(axes, result, name, span)


def _stirs(result: Result, name: str) -> bool:
    if name not in result.variables:
        return False
    low, high = extent(result.variables[name].data)
    return low != 0.0 or high != 0.0


WORDS = {
    "wall_stress": "wall stress",
    "wall_speed": "wall speed",
    "wall_position": "wall position",
    "pressure_drop_per_length": "pressure drop",
    "mean_velocity": "mean velocity",
    "flow_rate": "flow rate",
    "reach": "depth reached",
    "wall_force": "force on the wall",
    "wall_torque": "torque on the wall",
}
