"""How the walls move and what moves them: speed, position, loads of drive and film apart, power and work."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from transient.result.result import Result
from transient.result.scale import scale
from transient.sheet.histories import by_wall, wall_names
from transient.sheet.labels import Board
from transient.sheet.span import Span, span
from transient.sheet.stress import finish
from transient.sheet.style import INK, STROKE, extent, margins, name_axis, need, page, rows, told, zero_line

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# An infinite film load is shown up to this many times its median: the rest is the spike itself.
MEDIANS = 6.0
# Points per interval of rows at which powers are drawn.
PARTS = 8
NOTES = {
    "drive": "drive: outside load, weight included",
    "film": "film: fluid on the wall",
    "pressure": "pressure: on the face that displaces fluid",
}
PRESCRIBED = {**NOTES, "drive": "drive: what the film asks for, the wall's own inertia left out"}


def motion(result: Result) -> Figure:
    """The figure.  Raises ResultError where the file holds no wall speed."""
    need(result, "motion", "time", "wall", "wall_speed")
    shared = span(result, [*result.wall_speed.T])
    loads = _loads(result)
    panels = [_speed] + [_position] * ("wall_position" in result.variables)
    panels += [_load_panel, _power_panel, _work_panel] if loads else []
    notes = NOTES if _bodies(result) else PRESCRIBED
    said = [notes[kind] for kind in dict.fromkeys(kind for kind, _, _ in loads)]
    heading = ["Motion of the walls" + " and what moves them" * bool(loads), "; ".join(said)]
    heading = [line for line in heading if line]
    figure = page(result.title, 1.75 + 1.4 * len(panels), "\n".join(heading))
    axes = rows(figure, [1.3] + [1.0] * (len(panels) - 1), top=0.47 + 0.15 * len(heading), bottom=0.72)
    for panel, draw in zip(axes, panels, strict=True):
        draw(panel, result, shared)
    finish(figure, axes, result, shared)
    return figure


def _speed(axes: Axes, result: Result, shared: Span) -> None:
    """Speed of every wall; of bodies the terminal speed and when it has been reached."""
    board = by_wall(axes, result, "wall_speed", shared)
    unit = result.variables["wall_speed"].units
    for column, name in enumerate(wall_names(result)):
        body = _bodies(result).get(name)
        if body is None:
            continue
        terminal, when = body.get("terminal_speed"), body.get("speed_settling_time")
        if terminal:
            axes.axhline(terminal * board.factor, color=INK[column], lw=0.8, ls=(0, (1, 2)), zorder=1, gid="terminal")
        if when is None or not 0.0 < when <= result.time[-1]:
            continue
        x = shared.place(when)
        y = float(np.interp(when, result.time, result.wall_speed[:, column])) * board.factor
        axes.plot(x, y, "D", mfc="white", mec=INK[column], mew=1.2, ms=4.5, zorder=5, clip_on=False, gid="settled")
        toward = f"towards {told(terminal, unit)}\n" if terminal else ""
        board.beside(x, y, f"{toward}settled at {told(when, 's')}", color=INK[column])


def _position(axes: Axes, result: Result, shared: Span) -> None:
    """Displacement of every wall; how far a body coasts."""
    board = by_wall(axes, result, "wall_position", shared)
    unit = result.variables["wall_position"].units
    for column, name in enumerate(wall_names(result)):
        coast = (_bodies(result).get(name) or {}).get("coast_down")
        if not coast or coast.get("distance") is None:
            continue
        when = coast["begins"] + coast["time"]
        x = shared.place(when)
        y = float(np.interp(when, result.time, result.wall_position[:, column])) * board.factor
        axes.plot(x, y, "D", mfc="white", mec=INK[column], mew=1.2, ms=4.5, zorder=5, clip_on=False, gid="coasted")
        text = f"coasted {told(coast['distance'], unit)}\nin {told(coast['time'], 's')}"
        board.beside(x, y, text, color=INK[column])


def _load_panel(axes: Axes, result: Result, shared: Span) -> None:
    unit = result.variables[_film_name(result)].units
    curves = [(label, column, data) for label, column, data in _named(result, _loads(result))]
    _draw(axes, shared, result.time, curves, "torque" if unit == "N*m" else "force", unit)


def _power_panel(axes: Axes, result: Result, shared: Span) -> None:
    """Power put in by the drive, and by film and pressure into the body (mostly negative: taken out)."""
    curves = [(label, column, _power(result, column, data)) for label, column, data in _named(result, _loads(result))]
    _draw(axes, shared, _within(result.time), curves, "power", "W")


def _work_panel(axes: Axes, result: Result, shared: Span) -> None:
    """Running integrals of the powers; drive and the others differ by what the body, a spring or a damper takes."""
    time, curves = _within(result.time), []
    for label, column, data in _named(result, _loads(result)):
        finite = np.isfinite(data)
        power = _power(result, column, np.interp(result.time, result.time[finite], data[finite]))
        work = np.concatenate([[0.0], np.cumsum(0.5 * np.diff(time) * (power[1:] + power[:-1]))])
        curves.append((label, column, work))
    _draw(axes, shared, time, curves, "work", "J")


def _power(result: Result, column: int, load: np.ndarray) -> np.ndarray:
    """Load times speed where both are straight between the rows and their product is not."""
    return _within(load) * _within(result.wall_speed[:, column])


def _within(values: np.ndarray) -> np.ndarray:
    """Values (n,) with points added on the straight lines between neighbours."""
    inner = values[:-1, None] + np.diff(values)[:, None] * np.arange(PARTS) / PARTS
    return np.append(inner.ravel(), values[-1])


def _draw(
    axes: Axes, shared: Span, time: np.ndarray, curves: list[tuple[str, int, np.ndarray]], words: str, unit: str
) -> None:
    """Curves (label, column of the wall's ink, values), each kind with its stroke, named at their right ends."""
    low, high = margins(*extent(np.zeros(1), *(_without_spikes(data) for _, _, data in curves)))
    chosen = scale(max(abs(low), abs(high)), unit)
    shared.dress(axes, last=False)
    axes.set_ylim(low * chosen.factor, high * chosen.factor)
    board = Board(axes, chosen.factor)
    x, ends = shared.shown(time), []
    strokes = dict(zip(NOTES, STROKE, strict=False))
    for label, column, data in curves:
        y = data * chosen.factor
        kind = label.split()[-1]
        # a drive has its wall's ink, film and pressure have inks that no wall has
        ink = INK[column] if kind == "drive" else INK[2 + (column + (kind == "pressure")) % 2]
        board.curve(x, y, color=ink, ls=strokes[kind], gid=f"{words} {label}")
        finite = y[np.isfinite(y)]
        ends.append((float(finite[-1]) if len(finite) else 0.0, label, {"color": ink}))
    board.at_ends(ends)
    name_axis(axes, words, chosen.unit)
    zero_line(axes)


def _without_spikes(data: np.ndarray) -> np.ndarray:
    """``data``, clipped to a multiple of its median where it is infinite at some instant."""
    finite = np.isfinite(data)
    if finite.all() or not finite.any():
        return data
    cap = MEDIANS * float(np.median(np.abs(data[finite])))
    return np.clip(data[finite], -cap, cap)


def _loads(result: Result) -> list[tuple[str, int, np.ndarray]]:
    """(kind, column of the wall, load (n,)) of every wall with a body; without bodies, of every wall that moves."""
    film = _film_name(result)
    if film not in result.variables:
        return []
    names = wall_names(result)
    columns = [i for i, name in enumerate(names) if name in _bodies(result)]
    columns = columns or [i for i in range(len(names)) if result.wall_speed[:, i].any()]
    out = []
    for i in columns:
        stress = result.variables[film].data[:, i]
        drive = result.drive_load[:, i] if "drive_load" in result.variables else -stress
        out += [("drive", i, drive), ("film", i, stress)]
        if "pressure_load" in result.variables and result.pressure_load[:, i].any():
            out.append(("pressure", i, result.pressure_load[:, i]))
    return out


def _named(result: Result, loads: list[tuple[str, int, np.ndarray]]) -> list[tuple[str, int, np.ndarray]]:
    """The same with the wall's name before the kind where several walls are shown."""
    several = len({column for _, column, _ in loads}) > 1
    names = wall_names(result)
    return [(f"{names[column]} {kind}" if several else kind, column, data) for kind, column, data in loads]


def _film_name(result: Result) -> str:
    return "wall_torque" if "wall_torque" in result.variables else "wall_force"


def _bodies(result: Result) -> dict[str, Any]:
    return result.summary.get("bodies") or {}
