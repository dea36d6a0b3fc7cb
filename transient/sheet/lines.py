"""Time lines: lines of particles laid across the gap at given instants, as they have moved."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from transient.result.lines import time_lines
from transient.result.result import Result
from transient.result.scale import scale
from transient.sheet.labels import Board
from transient.sheet.profiles import across_words, between, draw_walls, has_axis, instants, shade, time_labels
from transient.sheet.style import FAINT, WIDTH, extent, margins, need, page, told

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

CURVES = 5  # in each of two narrow panels


def lines(result: Result, laid: Sequence[float] = (), seen: float | None = None) -> Figure:
    """One line laid at the start at several instants, and lines laid one after the other as seen at the end.

    With ``laid`` (s) only lines laid at those instants, as seen at ``seen`` (default: the last profile).
    Raises ResultError where the file holds no travel, or for times outside the run.
    """
    need(result, "lines", "profile_time", "position", "velocity", "travel")
    end = float(result.profile_time[-1]) if seen is None else float(seen)
    if laid or seen is not None:
        times = list(laid) or [float(t) for t in _laid(result, end)]
        figure = page(result.title, 4.3, f"Lines laid across the gap at the times on them, seen at {told(end, 's')}")
        axes = figure.add_axes((0.1, 0.115, 0.86, 0.745))
        _panel(axes, result, time_lines(result, times, end), times, "displacement since laid")
        return figure
    figure = page(result.title, 4.3, "Time lines: particles laid across the gap, as they have moved")
    wide = 2.62 / WIDTH
    left, right = (figure.add_axes((x, 0.115, wide, 0.69)) for x in (0.1, 0.985 - wide))
    first = float(result.profile_time[0])
    shown = result.profile_time[instants(result.travel, result.position, CURVES)]
    seen_at = [float(t) for t in shown if t > first]
    moved = np.concatenate([time_lines(result, [first], t) for t in seen_at] or [np.zeros((0, len(result.position)))])
    _panel(left, result, moved, seen_at, "displacement")
    laid_at = [float(t) for t in _laid(result, end)]
    _panel(right, result, time_lines(result, laid_at, end), laid_at, "displacement")
    right.set_ylabel("")
    right.tick_params(labelleft=False)
    left.set_title(f"laid at {told(first, 's')}, seen at the times on the lines", loc="left", size=8)
    right.set_title(f"laid at the times on the lines, seen at {told(end, 's')}", loc="left", size=8)
    return figure


def _laid(result: Result, seen: float) -> np.ndarray:
    """Instants of laying (s) that give lines that can be told apart when seen."""
    kept = np.flatnonzero(result.profile_time <= seen)
    moved = result.travel[kept[-1]] - result.travel[kept]
    rows = instants(moved[::-1], result.position, CURVES)[::-1]
    chosen = result.profile_time[kept][len(kept) - 1 - rows]
    return np.unique(chosen[chosen < seen])


def _panel(axes: Axes, result: Result, moved: np.ndarray, times: Sequence[float], words: str) -> None:
    """Lines (k, N), each named by its time; the laying line at zero."""
    y = result.position
    fine = np.union1d(y, np.linspace(y[0], y[-1], 201))
    low, high = margins(*extent(moved, np.zeros(1)), 0.05)
    way, across = scale(max(abs(low), abs(high)), "m"), scale(float(y[-1]), "m")
    axes.set_xlim(low * way.factor, high * way.factor)
    draw_walls(axes, result, across.factor)
    axes.axvline(0.0, color=FAINT, lw=0.8, zorder=0)
    board = Board(axes)
    for i, line in enumerate(moved):
        if not np.isfinite(line).all():
            continue
        x = between(y, line, fine, mirrored=has_axis(result)) * way.factor
        ink = shade(i, len(moved))
        axes.plot(x, fine * across.factor, color=ink, lw=1.3, gid=f"line {times[i]!r}")
        board.add_curve(x, fine * across.factor)
    for i, label in enumerate(time_labels(np.asarray(times))[: len(board.curves)]):
        board.on_curve(i, label, color=shade(i, len(moved)))
    axes.set_xlabel(f"{words} [{way.unit}]")
    axes.set_ylabel(f"{across_words(result)} [{across.unit}]")
