"""How deep the motion has reached into the gap over time, from each wall."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from transient.result.result import Result, ResultError
from transient.result.scale import scale
from transient.sheet.histories import wall_names
from transient.sheet.labels import Board
from transient.sheet.span import span
from transient.sheet.stress import finish
from transient.sheet.style import INK, STROKE, need, page, rows

if TYPE_CHECKING:
    from matplotlib.figure import Figure


def reach(result: Result) -> Figure:
    """The figure: depth from each wall whose motion spreads, drawn in the gap.

    Raises ResultError where the file holds no depth, or no wall from which any motion spreads.
    """
    need(result, "reach", "time", "wall", "position", "reach")
    depth = result.reach
    moving = [i for i in range(depth.shape[1]) if np.nanmax(depth[:, i], initial=0.0) > 0.0]
    if not moving:
        raise ResultError("figure reach: no motion spreads from a wall in this run")
    inner, outer = float(result.position[0]), float(result.position[-1])
    shared = span(result, [depth[:, i] for i in moving])
    across = scale(outer, "m")
    figure = page(result.title, 3.6, "How deep the motion has reached into the gap (1 % depth)")
    (axes,) = rows(figure, [1.0], top=0.62, bottom=0.72)
    shared.dress(axes, last=True)
    room = 0.04 * (outer - inner)
    axes.set_ylim((inner - room) * across.factor, (outer + room) * across.factor)
    x = shared.shown(result.time)
    board = Board(axes, across.factor)
    ends = []
    for i in moving:
        # Of two walls the first is the lower or inner one; a single wall is a bore, outside of the fluid.
        low = i == 0 and depth.shape[1] > 1
        y = (inner + depth[:, i] if low else outer - depth[:, i]) * across.factor
        board.curve(x, y, color=INK[i], ls=STROKE[i], gid=f"reach {wall_names(result)[i]}")
        ends.append((float(y[np.isfinite(y)][-1]), f"from {wall_names(result)[i]}", {"color": INK[i]}))
    board.at_ends(ends)
    for edge in (inner, outer):
        axes.axhline(edge * across.factor, color="#2b3238", lw=1.0, zorder=0.6)
    axes.set_ylabel(f"position in the gap [{across.unit}]")
    finish(figure, [axes], result, shared)
    return figure
