"""Mean velocity (and flow rate, on the right) over time with what drives it."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from transient.result.result import Result
from transient.result.scale import scale
from transient.sheet.histories import drive, drives, single
from transient.sheet.span import Span, span
from transient.sheet.stress import finish
from transient.sheet.style import INK, SOFT, need, page, rows, told

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure


def flow(result: Result) -> Figure:
    """The figure.  Raises ResultError where the file holds no mean velocity."""
    need(result, "flow", "time", "mean_velocity")
    shared = span(result, [result.mean_velocity])
    names = drives(result)
    figure = page(result.title, 3.1 + 1.1 * len(names), "Flow through the gap")
    axes = rows(figure, [2.1] + [1.0] * len(names), top=0.62, bottom=0.72)
    flow_panel(axes[0], result, shared)
    for panel, name in zip(axes[1:], names, strict=True):
        drive(panel, result, name, shared)
    finish(figure, axes, result, shared)
    return figure


def flow_panel(axes: Axes, result: Result, shared: Span) -> None:
    """Mean velocity with the time at which it has settled; its flow rate as a second scale of the same curve."""
    board = single(axes, result, "mean_velocity", shared)
    _second_scale(axes, result, board.factor)
    settling = result.summary.get("settling") or {}
    when = settling.get("flow")
    if when is None or not result.time[0] <= when <= result.time[-1]:
        return
    x = shared.place(when)
    y = float(np.interp(when, result.time, result.mean_velocity)) * board.factor
    axes.plot(x, y, "D", mfc="white", mec=INK[0], mew=1.2, ms=4.5, zorder=5, clip_on=False, gid="settled")
    within = f" within {100 * settling['within']:g} %" if settling.get("within") else ""
    board.beside(x, y, f"settled{within}\nat {told(when, 's')}", color=INK[0])


def _second_scale(axes: Axes, result: Result, factor: float) -> None:
    """The flow rate is the mean velocity times one area, so the curve serves both."""
    if "flow_rate" not in result.variables:
        return
    top = int(np.argmax(np.abs(result.mean_velocity)))
    mean, rate = float(result.mean_velocity[top]), float(result.flow_rate[top])
    if mean == 0.0 or rate == 0.0:
        return
    unit = scale(rate, result.variables["flow_rate"].units)
    ratio = rate / mean * unit.factor / factor
    other = axes.secondary_yaxis("right", functions=(lambda v: v * ratio, lambda v: v / ratio))
    other.set_ylabel(f"flow rate [{unit.unit}]")
    other.spines["right"].set_visible(True)
    other.spines["right"].set_color(SOFT)
