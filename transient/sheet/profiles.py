"""Velocity across the gap at instants chosen so that the curves can be told apart, each named by its time."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from transient.result.result import Result
from transient.result.scale import scale
from transient.sheet.akima import akima
from transient.sheet.labels import Board
from transient.sheet.style import FAINT, INK, SOFT, WALL, extent, margins, need, page, told

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Curves in one picture; two of them are told apart if this share of all that is swept lies between them.
CURVES, APART = 7, 0.04
# A motion longer than this many times what it sweeps goes to and fro: its last cycle is shown, about twice that.
ENDLESS, CYCLE = 4.0, 2.0
# Shade of the first and of the last curve (0 the ink itself, 1 white): the latest is the darkest.
_SHADES = (0.42, 0.0)


def profiles(result: Result) -> Figure:
    """The figure.  Raises ResultError where the file holds no velocity profiles."""
    need(result, "profiles", "profile_time", "position", "velocity")
    figure = page(result.title, 4.3, subtitle(result))
    axes = figure.add_axes((0.1, 0.115, 0.86, 0.745))
    profiles_panel(axes, result)
    return figure


def subtitle(result: Result) -> str:
    """What the picture shows, in a line."""
    chosen = instants(result.velocity, result.position)
    since = result.profile_time[chosen[0]]
    words = "Velocity across the gap; the labels are times since the start"
    return words + (f" (the last cycle, from {told(since, 's')})" if _endless(result.velocity, result.position) else "")


def instants(velocity: np.ndarray, position: np.ndarray, curves: int = CURVES) -> np.ndarray:
    """Rows of ``velocity`` (k, N) over ``position`` (N,) to show, in order, ``curves`` + 1 at most: equal parts of
    the way that the profile goes, without doubles, the last one always among them.

    The distance of two profiles is the mean of their difference over the gap, which is the area between the curves.
    """
    way = np.concatenate([[0.0], np.cumsum(_apart(velocity[1:], velocity[:-1], position))])
    width = _width(velocity, position)
    last = len(velocity) - 1
    first = int(np.searchsorted(way, way[-1] - CYCLE * width)) if way[-1] > ENDLESS * width else 0
    rows = np.clip(np.searchsorted(way, np.linspace(way[first], way[-1], curves + 1)), first, last)
    kept = [last]
    rest = np.zeros_like(velocity[0])
    for row in np.unique(rows)[::-1]:
        others = np.stack([rest, *(velocity[other] for other in kept)])
        if _apart(velocity[row], others, position).min() > APART * width:
            kept.append(int(row))
    return np.array(kept[::-1])


def _apart(one: np.ndarray, other: np.ndarray, position: np.ndarray) -> np.ndarray:
    """Mean over the gap of |one - other|; profiles along the last axis."""
    return np.trapezoid(np.abs(one - other), position, axis=-1) / (position[-1] - position[0])


def _width(velocity: np.ndarray, position: np.ndarray) -> float:
    """Mean over the gap of the range that the velocity covers; 1 where nothing moves."""
    return float(_apart(velocity.max(axis=0), velocity.min(axis=0), position)) or 1.0


def _endless(velocity: np.ndarray, position: np.ndarray) -> bool:
    way = _apart(velocity[1:], velocity[:-1], position).sum()
    return bool(way > ENDLESS * _width(velocity, position))


def profiles_panel(axes: Axes, result: Result) -> None:
    """Velocity to the right, position upwards between the walls."""
    chosen = instants(result.velocity, result.position)
    y = result.position
    # Between the stored points the profile is smooth; drawn straight, it would seem to have corners.
    fine = np.union1d(y, np.linspace(y[0], y[-1], 201))
    shown = result.velocity[chosen]
    low, high = margins(*extent(shown, np.zeros(1)), 0.05)
    speed = scale(max(abs(low), abs(high)), "m/s")
    across = scale(float(y[-1]), "m")
    axes.set_xlim(low * speed.factor, high * speed.factor)
    draw_walls(axes, result, across.factor)
    axes.axvline(0.0, color=FAINT, lw=0.8, zorder=0)
    board = Board(axes)
    for i, (row, velocity) in enumerate(zip(chosen, shown, strict=True)):
        x = between(y, velocity, fine, mirrored=has_axis(result)) * speed.factor
        last = row == chosen[-1]
        axes.plot(
            x, fine * across.factor, color=shade(i, len(chosen)), lw=2.0 if last else 1.2,
            gid=f"profile {float(result.profile_time[row])!r}",
        )  # fmt: skip
        board.add_curve(x, fine * across.factor)
    for i, label in enumerate(time_labels(result.profile_time[chosen])):
        board.on_curve(i, label, color=shade(i, len(chosen)))
    axes.set_xlabel(f"velocity [{speed.unit}]   (positive: {_positive(result)})")
    axes.set_ylabel(f"{across_words(result)} [{across.unit}]")


def time_labels(times: np.ndarray) -> list[str]:
    """Short texts for instants (s) with as few digits as keep them apart."""
    for digits in range(3, 9):
        texts = [told(float(time), "s", digits) for time in times]
        if len(set(texts)) == len(texts):
            break
    return texts


def shade(number: int, count: int) -> tuple[float, float, float]:
    """Between a light and a dark tone of the first ink, by the number of a curve among ``count``."""
    from matplotlib.colors import to_rgb

    rank = number / max(count - 1, 1)
    light = _SHADES[0] + (_SHADES[1] - _SHADES[0]) * rank
    ink = np.array(to_rgb(INK[0]))
    tone = ink + (1 - ink) * light
    return tuple(float(v) for v in tone)


def between(y: np.ndarray, velocity: np.ndarray, fine: np.ndarray, mirrored: bool) -> np.ndarray:
    """Velocity (n,) at positions ``fine`` from that at ``y`` (N,), without overshoot at a steep wall layer.

    ``mirrored``: the profile goes on beyond y[0] as in a mirror.
    """
    if mirrored:
        y = np.concatenate([2 * y[0] - y[:0:-1], y])
        velocity = np.concatenate([velocity[:0:-1], velocity])
    return akima(y, velocity, fine)


def has_axis(result: Result) -> bool:
    """Whether the gap ends in a pipe's axis, where there is no wall."""
    return "wall" in result.variables and len(result.variables["wall"].data) == 1


def draw_walls(axes: Axes, result: Result, factor: float) -> None:
    """Hatched strips where walls are; a centre line where a pipe's axis is."""
    y0, y1 = float(result.position[0]) * factor, float(result.position[-1]) * factor
    thick = 0.06 * (y1 - y0)
    axes.set_ylim(y0 - 1.15 * thick, y1 + 1.15 * thick)
    names = [str(name) for name in result.variables["wall"].data] if "wall" in result.variables else []
    ends = [(y1, y1 + thick, names[-1] if names else "")]
    if has_axis(result):
        axes.axhline(y0, color=SOFT, lw=0.8, ls=(0, (10, 3, 2, 3)), zorder=0)
        place = axes.get_yaxis_transform()
        axes.text(0.98, y0, "axis", transform=place, ha="right", va="top", size=7.5, color=SOFT)
    else:
        ends.append((y0, y0 - thick, names[0] if names else ""))
    for edge, outside, name in ends:
        axes.axhspan(min(edge, outside), max(edge, outside), fc="white", ec=WALL, hatch="/////", lw=0, zorder=0.5)
        axes.axhline(edge, color="#2b3238", lw=1.0, zorder=0.6)
        axes.text(
            0.98, (edge + outside) / 2, name, transform=axes.get_yaxis_transform(), ha="right", va="center", size=7,
            color="#2b3238", bbox={"fc": "white", "ec": "none", "pad": 0.2}, zorder=0.7,
        )  # fmt: skip


def _positive(result: Result) -> str:
    turning = "wall_speed" in result.variables and result.variables["wall_speed"].units == "rad/s"
    return "in the sense of positive rotation" if turning else "along +x"


def across_words(result: Result) -> str:
    return "height" if result.position[0] == 0.0 and len(result.variables["wall"].data) > 1 else "radius"
