"""The profile as a moving picture: one file that a browser shows without network or scripts (SVG animation)."""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import dataclass
from html import escape
from pathlib import Path

import numpy as np

from transient.result.lines import travelled
from transient.result.result import Result, ResultError
from transient.result.scale import Scale, scale
from transient.result.whole import whole
from transient.sheet.histories import grouped, wall_names
from transient.sheet.labels import spread
from transient.sheet.profiles import across_words, has_axis
from transient.sheet.span import Span, span
from transient.sheet.stress import stress_limits, stress_signals
from transient.sheet.style import INK, MINUS, SOFT, extent, margins, need, told
from transient.sheet.ticks import decades, ticks

FRAMES, SECONDS = 110, 12.0
POINTS = 49  # of a drawn profile
WIDE, TALL = 860, 660
# Pixels: gap and history, each (left, top, right, bottom); thickness of a wall; distance of the marks on it.
GAP, HISTORY, THICK, MARK = (86, 96, 788, 372), (86, 446, 730, 600), 16, 36
MOST_WAY = 2400.0  # pixels that the marks of a wall move at most in a round
DASH = ("", "9 4", "12 4 3 4", "3 3")


@dataclass(frozen=True, eq=False)
class Frames:
    """``time`` (f,) s at even parts of the picture's round; ``velocity`` (f, p) m/s over ``position`` (p,) m;
    ``way`` (f, w) m that each wall has moved; ``clock``: how the time runs."""

    time: np.ndarray
    position: np.ndarray
    velocity: np.ndarray
    way: np.ndarray
    clock: Span


def write_moving(result: Result, path: str | os.PathLike[str]) -> None:
    """Writes the moving picture to a path that ends in .html or .svg, whole or not at all.

    Raises ResultError for another ending, or where the file holds no profiles or histories.
    """
    kind = Path(path).suffix.lower()
    if kind not in (".html", ".svg"):
        raise ResultError(f"{path}: a moving picture ends in .html or .svg")
    drawing = moving(result)
    if kind == ".html":
        title = escape(result.title or "Moving profile")
        head = f'<!doctype html>\n<html lang="en"><head><meta charset="utf-8"><title>{title}</title></head>'
        drawing = f'{head}\n<body style="margin:0 auto;max-width:{WIDE}px">\n{drawing}\n</body></html>\n'
    with whole(path) as draft:
        draft.write_text(drawing, encoding="utf-8")


def moving(result: Result) -> str:
    """The picture as SVG text: the profile between its walls above, the wall stress with a moving mark below."""
    if "case" in result.variables:
        raise ResultError("a sweep has no moving picture; run the case of interest")
    need(result, "moving", "time", "wall", "wall_stress", "profile_time", "position", "velocity", "travel")
    if not result.profile_time[-1] > result.profile_time[0]:
        raise ResultError("figure moving: needs profiles at two times at least, and this file holds those of one")
    frames = _frames(result)
    body = [*_heading(result, frames), *_gap(result, frames), *_history(result, frames)]
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {WIDE} {TALL}" width="100%" role="img" '
        f'aria-label="{escape(result.title, quote=True)}" font-family="DejaVu Sans, Verdana, sans-serif" '
        f'font-size="13">\n<rect width="{WIDE}" height="{TALL}" fill="white"/>\n' + "\n".join(body) + "\n</svg>"
    )


def _frames(result: Result) -> Frames:
    clock = span(result, stress_signals(result))
    first, last = max(clock.start, float(result.profile_time[0])), min(clock.end, float(result.profile_time[-1]))
    time = np.geomspace(first, last, FRAMES) if clock.log else np.linspace(first, last, FRAMES)
    time[-1] = last
    y = result.position
    even = np.linspace(y[0], y[-1], POINTS)
    shown = np.union1d(even, [y[1], y[-2]])  # a layer at a wall may be thinner than an even part
    rows = np.stack([np.interp(shown, y, profile) for profile in result.velocity])
    velocity = np.stack([np.interp(time, result.profile_time, column) for column in rows.T], axis=1)
    ends = [-1] if has_axis(result) else [0, -1]
    return Frames(time, shown, velocity, travelled(result, time)[:, ends], clock)


def _heading(result: Result, frames: Frames) -> list[str]:
    """Title, and a strip of times of which one at a time is seen."""
    slow = SECONDS / float(frames.time[-1] - frames.time[0])
    if frames.clock.log:
        pace = f"time runs logarithmically from {told(float(frames.time[0]), 's', 3)}"
    else:
        pace = f"{told(1.0 / slow, 's', 3)} of the run in a second of the picture"
    # one look for all frames: a unit that suits the whole run
    unit = scale(float(frames.time[-1]), "s")
    times = [told(float(t), "s", 3) if frames.clock.log else f"{t * unit.factor:.1f} {unit.unit}" for t in frames.time]
    strip = [f'<text y="{24 * i}">t = {time}</text>' for i, time in enumerate(times)]
    places = ";".join(f"0 {-24 * i}" for i in range(len(strip)))
    return [
        f'<text x="16" y="30" font-size="18" font-weight="bold">{escape(result.title)}</text>',
        f'<text x="16" y="52" fill="{SOFT}">Velocity across the gap; {escape(pace)}</text>',
        '<clipPath id="clock"><rect x="640" y="58" width="200" height="23"/></clipPath>',
        '<g clip-path="url(#clock)"><g transform="translate(660 76)" font-size="17" font-weight="bold"><g>',
        *strip,
        f'<animateTransform attributeName="transform" type="translate" calcMode="discrete" values="{places}" '
        f"{_round()}/></g></g></g>",
    ]


def _gap(result: Result, frames: Frames) -> list[str]:
    """The profile between its walls, whose marks move with them."""
    left, top, right, bottom = GAP
    low, high = margins(*extent(frames.velocity, np.zeros(1)), 0.05)
    unit, across = scale(max(abs(low), abs(high)), "m/s"), scale(float(frames.position[-1]), "m")
    x = _axis(low, high, left, right)
    y = _axis(float(frames.position[0]), float(frames.position[-1]), bottom, top)
    out = [f'<line x1="{x(0.0):.1f}" x2="{x(0.0):.1f}" y1="{top}" y2="{bottom}" stroke="#c9ced3"/>']
    for value in ticks(low * unit.factor, high * unit.factor):
        at = x(value / unit.factor)
        out.append(_tick(at, bottom + THICK, _plain(value)))
    out.append(_words(0.5 * (left + right), bottom + THICK + 38, f"velocity [{unit.unit}]", "middle"))
    for value in ticks(float(frames.position[0]) * across.factor, float(frames.position[-1]) * across.factor):
        out.append(_words(left - 10, y(value / across.factor) + 4, _plain(value), "end"))
    middle = 0.5 * (top + bottom)
    out.append(
        f'<text transform="translate(24 {middle:.0f}) rotate(-90)" text-anchor="middle">{across_words(result)} '
        f"[{across.unit}]</text>"
    )
    names = wall_names(result)
    faces = [(top, -1)] if has_axis(result) else [(bottom, 1), (top, -1)]
    for column, (edge, side) in enumerate(faces):
        out += _wall(names[column], frames.way[:, column], edge, side, column)
    if has_axis(result):
        out.append(_line(left, right, bottom, bottom, SOFT, "14 4 3 4"))
    heights = [y(p) for p in frames.position]
    shapes = [_path([x(u) for u in row], heights) for row in frames.velocity]
    area = [f"M{x(0.0):.1f} {heights[0]:.1f}L{shape[1:]}L{x(0.0):.1f} {heights[-1]:.1f}Z" for shape in shapes]
    out.append(f'<path fill="{INK[0]}" fill-opacity="0.10" d="{area[-1]}">{_shape(area)}</path>')
    out.append(f'<path fill="none" stroke="{INK[0]}" stroke-width="2.4" d="{shapes[-1]}">{_shape(shapes)}</path>')
    return out


def _wall(name: str, way: np.ndarray, edge: float, side: int, column: int) -> list[str]:
    """A wall with marks that move as it does, in a scale of their own."""
    left, _, right, _ = GAP
    top = edge if side > 0 else edge - THICK
    largest = float(np.abs(way).max())
    pixels = way * (min(MOST_WAY, 1200.0) / largest) if largest > 0.0 else np.zeros(len(way))
    first, last = left - max(float(pixels.max()), 0.0), right - min(float(pixels.min()), 0.0)
    marks = "".join(
        f"M{at:.0f} {top + THICK}l10 -{THICK}" for at in np.arange(first - first % MARK, last + MARK, MARK)
    )
    places = ";".join(f"{p:.1f} 0" for p in pixels)
    move = f'<animateTransform attributeName="transform" type="translate" values="{places}" {_round()}/>'
    move = move if largest > 0.0 else ""
    return [
        f'<clipPath id="wall{column}"><rect x="{left}" y="{top}" width="{right - left}" height="{THICK}"/></clipPath>',
        f'<g clip-path="url(#wall{column})"><path d="{marks}" stroke="#8d969e" stroke-width="1.5">{move}</path></g>',
        f'<line x1="{left}" x2="{right}" y1="{edge}" y2="{edge}" stroke="#1d252c" stroke-width="1.6"/>',
        _words(right + 4, top + 13, escape(name), "start", SOFT),
    ]


def _history(result: Result, frames: Frames) -> list[str]:
    """Wall stress over the run's time, with a mark that moves along."""
    left, top, right, bottom = HISTORY
    low, high = stress_limits(result)
    unit = scale(max(abs(low), abs(high)), "Pa")
    y = _axis(low, high, bottom, top)
    start, end = float(frames.time[0]), float(frames.time[-1])
    log = frames.clock.log
    place = _axis(np.log(start), np.log(end), left, right) if log else _axis(start, end, left, right)

    def x(time: float) -> float:
        return place(float(np.log(max(time, start)))) if log else place(time)

    out = [
        f'<clipPath id="history"><rect x="{left}" y="{top}" width="{right - left}" height="{bottom - top}"/></clipPath>'
    ]
    out.append(f'<path d="M{left} {top}V{bottom}H{right}" fill="none" stroke="{SOFT}"/>')
    for value in ticks(low * unit.factor, high * unit.factor):
        at = y(value / unit.factor)
        out.append(_words(left - 8, at + 4, _plain(value), "end"))
        out.append(f'<line x1="{left - 4}" x2="{left}" y1="{at:.1f}" y2="{at:.1f}" stroke="{SOFT}"/>')
    out += _times(frames, x, bottom)
    out.append(
        f'<text transform="translate(24 {0.5 * (top + bottom):.0f}) rotate(-90)" text-anchor="middle">wall stress '
        f"[{unit.unit}]</text>"
    )
    inside = result.time >= start
    ends = []
    for column, label in grouped(result.wall_stress, wall_names(result)):
        curve, end_at = _curve(result.time[inside], result.wall_stress[inside, column], frames, x, y, column)
        out += curve
        ends.append((end_at, label, INK[column]))
    heights = spread(np.array([at for at, *_ in ends]), 16.0, top, bottom)
    for at, (_, label, ink) in zip(heights, ends, strict=True):
        out.append(_words(right + 10, at + 4, escape(label), "start", ink))
    places = ";".join(f"{x(float(t)):.1f}" for t in frames.time)
    moves = "".join(f'<animate attributeName="{end}" values="{places}" {_round()}/>' for end in ("x1", "x2"))
    return [*out, _line(right, right, top, bottom, "#1d252c", "2 3", moves)]


def _times(frames: Frames, x: Callable[[float], float], bottom: float) -> list[str]:
    start, end = float(frames.time[0]), float(frames.time[-1])
    if frames.clock.log:
        marks = [(t, told(t, "s", 3)) for t in decades(start, end)]
        name = "time, logarithmic"
    else:
        unit: Scale = scale(end, "s")
        marks = [(v / unit.factor, _plain(v)) for v in ticks(start * unit.factor, end * unit.factor)]
        name = f"time [{unit.unit}]"
    out = [_tick(x(t), bottom, words) for t, words in marks]
    return [*out, _words(0.5 * (HISTORY[0] + HISTORY[2]), bottom + 38, name, "middle")]


def _curve(
    time: np.ndarray, stress: np.ndarray, frames: Frames, x: Callable[[float], float], y: Callable[[float], float],
    column: int,
) -> tuple[list[str], float]:  # fmt: skip
    """One wall's stress and a dot that runs along it; where it ends."""
    _, top, right, bottom = HISTORY
    finite = np.isfinite(stress)
    t, s = time[finite], stress[finite]
    kept = np.unique(np.concatenate([np.linspace(0, len(t) - 1, 600).astype(int), [np.abs(s).argmax()]]))
    shape = _path([x(float(v)) for v in t[kept]], [float(np.clip(y(v), -2e3, 4e3)) for v in s[kept]])
    at = [float(np.clip(y(v), top - 12, bottom + 12)) for v in np.interp(frames.time, t, s)]
    ink = INK[column]
    moves = "".join(
        f'<animate attributeName="{name}" values="{";".join(f"{v:.1f}" for v in values)}" {_round()}/>'
        for name, values in (("cx", [x(float(v)) for v in frames.time]), ("cy", at))
    )
    drawn = [
        f'<path clip-path="url(#history)" d="{shape}" fill="none" stroke="{ink}" stroke-width="1.8" '
        f'stroke-dasharray="{DASH[column]}"/>',
        f'<circle r="4.5" fill="white" stroke="{ink}" stroke-width="2" cx="{right}" cy="{at[-1]:.1f}">{moves}</circle>',
    ]
    return drawn, at[-1]


def _line(x1: float, x2: float, y1: float, y2: float, ink: str, dash: str, moves: str = "") -> str:
    """A broken line, which may move."""
    return f'<line x1="{x1}" x2="{x2}" y1="{y1}" y2="{y2}" stroke="{ink}" stroke-dasharray="{dash}">{moves}</line>'


def _axis(low: float, high: float, first: float, last: float) -> Callable[[float], float]:
    """From values to pixels."""
    width = (high - low) or 1.0
    return lambda value: first + (last - first) * (value - low) / width


def _path(x: list[float], y: list[float]) -> str:
    return "M" + "L".join(f"{a:.1f} {b:.1f}" for a, b in zip(x, y, strict=True))


def _shape(shapes: list[str]) -> str:
    return f'<animate attributeName="d" values="{";".join(shapes)}" {_round()}/>'


def _round() -> str:
    return f'dur="{SECONDS:g}s" repeatCount="indefinite"'


def _tick(x: float, y: float, words: str) -> str:
    mark = f'<line x1="{x:.1f}" x2="{x:.1f}" y1="{y}" y2="{y + 4}" stroke="{SOFT}"/>'
    return mark + _words(x, y + 18, words, "middle")


def _plain(value: float) -> str:
    return f"{value:g}".replace("-", MINUS)


def _words(x: float, y: float, words: str, anchor: str, ink: str = "#1d252c") -> str:
    return f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}" fill="{ink}">{words}</text>'
