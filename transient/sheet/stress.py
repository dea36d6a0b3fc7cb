"""Wall stress over time with its peaks, the quasi-steady answer beside it and the drive below."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from transient.result.result import Result
from transient.sheet.histories import by_wall, drive, drives, grouped, wall_names
from transient.sheet.span import Span, span
from transient.sheet.style import INK, SOFT, extent, margins, need, page, rows, told

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from transient.sheet.labels import Board

BREAKS = "Dashed verticals and ticks along the top: the drive changes its course."
QUASI = "Dotted: quasi-steady hand formula."
# An unbounded stress is shown up to this many times its median, or this many times what it exceeds 5 % of the time.
# A peak below this share of the axis lies on the zero line for the eye.
WORTH_MARKING = 0.02
# A peak no further than this from the final value is the final value.
SAME_AS_FINAL = 1e-3
_MEDIANS, _RARES = 4.0, 1.5


def stress(result: Result) -> Figure:
    """The figure.  Raises ResultError where the file holds no wall stress."""
    need(result, "stress", "time", "wall", "wall_stress")
    shared = span(result, stress_signals(result))
    names = drives(result)
    figure = page(result.title, 3.6 + 1.1 * len(names), "Wall stress: traction of the fluid on the wall")
    axes = rows(figure, [2.6] + [1.0] * len(names), top=0.62, bottom=0.72)
    stress_panel(axes[0], result, shared)
    for panel, name in zip(axes[1:], names, strict=True):
        drive(panel, result, name, shared)
    finish(figure, axes, result, shared, quasi_note(result))
    return figure


def quasi_note(result: Result) -> str:
    """The sentence that explains the overlay, where there is one."""
    return QUASI if "quasi_steady_stress" in result.variables else ""


def finish(figure: Figure, axes: list[Axes], result: Result, shared: Span, notes: str = "") -> None:
    """Break points on all panels, the time label on the last, and the notes that explain what is drawn."""
    breaks = result.variables["drive_break"].data if "drive_break" in result.variables else np.zeros(0)
    marked = [shared.mark_breaks(panel, breaks) for panel in axes]
    shared.dress(axes[-1], last=True)
    figure.align_ylabels(axes)
    said = [notes] * bool(notes) + [BREAKS] * any(marked)
    if said:
        low = axes[-1].get_position().y0 - 0.62 / figure.get_figheight()
        figure.text(0.015, low, "  ".join(said), size=7.5, color=SOFT, va="bottom")


def stress_signals(result: Result) -> list[np.ndarray]:
    """What decides on the time axis: each wall's stress as shown, and the mean velocity."""
    low, high = stress_limits(result)
    signals = [np.clip(column, low, high) for column in result.wall_stress.T]
    if "mean_velocity" in result.variables:
        signals.append(result.mean_velocity)
    return signals


def stress_limits(result: Result) -> tuple[float, float]:
    """Limits (Pa) that hold every bounded stress whole, and of an unbounded one what is not the spike itself."""
    parts = [np.zeros(1)]
    even = np.linspace(result.time[0], result.time[-1], 400)
    for name, column in zip(wall_names(result), result.wall_stress.T, strict=True):
        finite = np.isfinite(column)
        if not is_unbounded(result, name, column):
            parts.append(column)
        elif finite.any():
            usual = np.abs(np.interp(even, result.time[finite], column[finite]))
            cap = max(_MEDIANS * np.median(usual), _RARES * np.percentile(usual, 95))
            parts.append(np.clip(column[finite], -cap, cap))
    if "quasi_steady_stress" in result.variables:
        parts.append(result.quasi_steady_stress)
    low, high = extent(*parts)
    return margins(low, high, 0.10)


def is_unbounded(result: Result, name: str, column: np.ndarray) -> bool:
    """Whether the wall's stress becomes infinite in the run."""
    return bool(_numbers(result, name).get("unbounded", not np.isfinite(column).all()))


def stress_panel(axes: Axes, result: Result, shared: Span) -> None:
    """Stress on every wall, named at its end, with peaks and the quasi-steady overlay."""
    board = by_wall(axes, result, "wall_stress", shared, stress_limits(result))
    x = shared.shown(result.time)
    if "quasi_steady_stress" in result.variables:
        for column, _ in grouped(result.quasi_steady_stress, wall_names(result)):
            y = result.quasi_steady_stress[:, column] * board.factor
            board.curve(x, y, color=INK[column], ls=(0, (1, 2)), lw=1.2, zorder=1.5, gid="quasi-steady")
    notes = [_peak(board, result, shared, *group) for group in grouped(result.wall_stress, wall_names(result))]
    found = [note for note in notes if note is not None]
    for x, y, _, _ in found:
        board.mark(x, y)  # all of them first, so that no text covers another's mark
    for x, y, text, ink in found:
        board.beside(x, y, text, color=ink)


def _peak(
    board: Board, result: Result, shared: Span, column: int, label: str
) -> tuple[float, float, str, str] | None:
    """A ring at the wall's largest stress, and (x, y, text, ink) of what is said there; None where it is next to
    nothing on this axis."""
    name = wall_names(result)[column]
    data = result.wall_stress[:, column]
    if is_unbounded(result, name, data):
        return _unbounded(board, result, shared, column, label)
    wall = _numbers(result, name)
    finite = np.flatnonzero(np.isfinite(data))
    if len(finite) == 0:
        return None
    top = int(finite[np.argmax(np.abs(data[finite]))])
    when, peak = wall.get("peak_time"), wall.get("peak_stress")
    if when is None or peak is None:
        when, peak = float(result.time[top]), float(data[top])
    text = f"{told(peak, 'Pa')} at {told(when, 's')}"
    if abs(peak - data[finite[-1]]) <= SAME_AS_FINAL * abs(peak):
        # The largest value of an approach from below has no time of its own.
        when, text = result.time[-1], f"{told(peak, 'Pa')}, no overshoot"
    x, y = shared.place(when), peak * board.factor
    low, high = board.axes.get_ylim()
    if abs(y) < WORTH_MARKING * (high - low):
        return None
    ink = INK[column]
    board.axes.plot(x, y, "o", mfc="white", mec=ink, mew=1.3, ms=5.5, zorder=5, clip_on=False, gid=f"peak {name}")
    return x, y, text, ink


def _unbounded(
    board: Board, result: Result, shared: Span, column: int, label: str
) -> tuple[float, float, str, str] | None:
    """An arrow head where the curve leaves the axes; what is said there tells when and how it grows without bound."""
    name = wall_names(result)[column]
    data = result.wall_stress[:, column]
    wall = _numbers(result, name)
    when = wall.get("peak_time")
    when = float(result.time[~np.isfinite(data)][0]) if when is None else when
    after = np.flatnonzero((result.time > when) & np.isfinite(data))
    if len(after) == 0:
        return None
    sign = np.sign(data[after[0]]) or 1.0
    low, high = board.axes.get_ylim()
    edge = high if sign > 0 else low
    inside = after[np.abs(data[after]) * board.factor <= abs(edge)]
    x = shared.place(result.time[inside[0] if len(inside) else after[0]])
    text = f"{label}: unbounded at {told(when, 's')}"
    exponent = wall.get("unbounded_exponent", 0.5)
    if wall.get("unbounded_coefficient") is not None and exponent == 0.5:
        text += f",\n|stress| ≈ K/√(t − {told(when, 's')})" if when > 0 else ",\n|stress| ≈ K/√t"
        text += f", K = {wall['unbounded_coefficient']:.3g} Pa·√s"
    ink = INK[column]
    board.axes.plot(x, edge, "^" if sign > 0 else "v", color=ink, ms=6, clip_on=False, gid=f"unbounded {name}")
    return x, edge, text, ink


def _numbers(result: Result, name: str) -> dict[str, Any]:
    return (result.summary.get("walls") or {}).get(name) or {}
