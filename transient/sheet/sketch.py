"""The gap as a drawing, not to scale: walls, what moves and presses, directions, and the sense of a positive stress."""

from __future__ import annotations

from textwrap import wrap
from typing import TYPE_CHECKING, Any

import numpy as np

from transient.case.derived import horizon
from transient.case.model import Case
from transient.drive.pieces import Drive
from transient.result.result import Result, ResultError
from transient.sheet.drives import drive_words, shortened
from transient.sheet.stated import needed_case
from transient.sheet.strokes import (
    BLACK,
    LONG,
    SMALL,
    THICK,
    arrow,
    band,
    centre_line,
    dimension,
    frame,
    sense,
    straight_limits,
)
from transient.sheet.style import INK, SOFT, WALL, need, page, told

if TYPE_CHECKING:
    from collections.abc import Callable

    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

ROD = 0.42  # radius of the inner wall where the outer one's is 1
INCHES = 2.9
LETTERS = 40  # of a text beside a wall


def sketch(result: Result) -> Figure:
    """The figure.  Raises ResultError where the file's case cannot be read, or for a shape without a drawing."""
    need(result, "sketch", "position", "velocity", "profile_time")
    case = needed_case(result, "sketch")
    name = case.gap.shape.name
    if name not in DRAWINGS:
        raise ResultError(f"figure sketch: there is no drawing for the shape {name}")
    figure = page(result.title, INCHES, subtitle(result))
    axes = figure.add_axes((0.0, 0.0, 1.0, 0.86))
    axes.set_axis_off()
    axes.set_aspect("equal")
    DRAWINGS[name](axes, case, result)
    return figure


def subtitle(result: Result) -> str:
    """What the drawing shows, and when its profile is."""
    when = float(result.profile_time[_shown(result)])
    return f"The gap, not to scale; u: velocity after {told(when, 's')}; τ > 0: the sense of a positive wall stress"


def _plates(axes: Axes, case: Case, result: Result) -> None:
    lower, upper = case.walls
    band(axes, 0.0, -THICK, lower.shear_free)
    band(axes, 1.0, 1.0 + THICK, upper.shear_free)
    dimension(axes, LONG + 0.16, 0.0, 1.0, f"height {_typed(case, 'height')}")
    _wall(axes, case, lower.name, -THICK, -1.0)
    _wall(axes, case, upper.name, 1.0 + THICK, 1.0)
    for wall, edge, inward, ink in ((lower, 0.0, 1.0, INK[0]), (upper, 1.0, -1.0, INK[1])):
        if not wall.shear_free:
            sense(axes, edge, inward, ink)
    _profile(axes, result, 0.0, 1.0, False)
    frame(axes, 0.0, "y")
    _push(axes, case, 0.5)
    straight_limits(axes, -0.62, 1.62)


def _pipe(axes: Axes, case: Case, result: Result) -> None:
    high = 0.75
    for side in (-1.0, 1.0):
        band(axes, side * high, side * (high + THICK))
    centre_line(axes)
    word = "diameter" if "diameter" in case.gap.sizes else "radius"
    dimension(axes, LONG + 0.16, -high if word == "diameter" else 0.0, high, f"{word} {_typed(case, word)}")
    _wall(axes, case, case.gap.shape.walls[1], high + THICK, 1.0)
    sense(axes, high, -1.0, INK[0])
    _profile(axes, result, 0.0, high, True)
    frame(axes, 0.0, "r")
    _push(axes, case, 0.33)
    straight_limits(axes, -1.35, 1.2)


def _axial(axes: Axes, case: Case, result: Result) -> None:
    inner, outer = case.walls
    for side in (-1.0, 1.0):
        band(axes, side, side * (1.0 + THICK), outer.shear_free)
    band(axes, -ROD, ROD, inner.shear_free)
    centre_line(axes)
    given = list(case.gap.sizes.items())
    sizes = ", ".join(f"{key.replace('_', ' ')} {_typed(case, key)}" for key, _ in given if key != "length")
    dimension(axes, LONG + 0.16, ROD, 1.0, "gap")
    axes.text(LONG + 0.55, -0.72, "\n".join(wrap(sizes, LETTERS)), size=SMALL, va="center", color=BLACK)
    _wall(axes, case, inner.name, 0.0, 0.0)
    _wall(axes, case, outer.name, 1.0 + THICK, 1.0)
    for wall, edge, inward, ink in ((inner, ROD, 1.0, INK[0]), (outer, 1.0, -1.0, INK[1])):
        if not wall.shear_free:
            sense(axes, edge, inward, ink)
    _profile(axes, result, ROD, 1.0, True)
    frame(axes, 0.0, "r")
    _push(axes, case, 0.5 * (ROD + 1.0))
    straight_limits(axes, -1.5, 1.62)


def _rotating(axes: Axes, case: Case, result: Result) -> None:
    """The section across the axis; positive rotation runs against the clock."""
    from matplotlib.patches import Annulus, Circle

    inner, outer = case.walls
    low = 0.55
    usual: dict[str, Any] = {"fc": "white", "ec": WALL, "hatch": "/////", "lw": 0}
    axes.add_patch(Circle((0.0, 0.0), low, **usual))
    axes.add_patch(Annulus((0.0, 0.0), 1.0 + THICK, THICK, **usual))
    for radius in (low, 1.0, 1.0 + THICK):
        axes.add_patch(Circle((0.0, 0.0), radius, fill=False, ec=BLACK, lw=1.0))
    axes.plot([-0.06, 0.06], [0.0, 0.0], color=BLACK, lw=0.8)
    axes.plot([0.0, 0.0], [-0.06, 0.06], color=BLACK, lw=0.8)
    for wall, radius, start in ((inner, 0.3, 100), (outer, 1.0 + THICK + 0.16, 60)):
        _turn(axes, _direction(case, wall.name), radius, start)
    sizes = [f"{key.replace('_', ' ')} {_typed(case, key)}" for key in case.gap.sizes if key != "length"]
    lines = [*_said(case, outer.name), "", *_said(case, inner.name), "", *sizes]
    axes.text(1.95, 0.95, "\n".join(lines), size=SMALL, va="top", linespacing=1.25, color=BLACK)
    _tangential(axes, result, low)
    for radius, ink, degrees in ((low, INK[0], 8.0), (1.0, INK[1], -22.0)):
        angle = np.radians(degrees)
        out, way = np.array([np.cos(angle), np.sin(angle)]), np.array([-np.sin(angle), np.cos(angle)])
        at = (radius + (0.08 if radius == low else -0.08)) * out
        arrow(axes, at - 0.17 * way, at + 0.2 * way, ink, 1.6)
        axes.annotate(
            "τ > 0", at, (1.38, float(at[1]) - 0.05), size=SMALL, color=ink, va="center",
            arrowprops={"arrowstyle": "-", "color": ink, "lw": 0.6, "shrinkA": 1, "shrinkB": 2},
        )  # fmt: skip
    axes.text(-1.55, 1.25, "positive: against\nthe clock", size=SMALL, va="top", ha="right", color=SOFT)
    axes.set_xlim(-3.2, 4.8)
    axes.set_ylim(-1.45, 1.55)


def _turn(axes: Axes, direction: float, radius: float, start: float) -> None:
    """An arc with an arrow head in the sense in which a wall turns; none where it stands."""
    if direction == 0.0:
        return
    angles = np.radians(start + direction * np.linspace(-35.0, 35.0, 40))
    x, y = radius * np.cos(angles), radius * np.sin(angles)
    axes.plot(x[:-2], y[:-2], color=BLACK, lw=2.2, solid_capstyle="butt", gid="moves")
    arrow(axes, np.array([x[-4], y[-4]]), np.array([x[-1], y[-1]]), BLACK, 2.2)


def _tangential(axes: Axes, result: Result, low: float) -> None:
    """The last profile along a radius to the left, as tangential arrows."""
    y, u = _scaled(result)
    angle = np.radians(180.0)
    out, way = np.array([np.cos(angle), np.sin(angle)]), np.array([-np.sin(angle), np.cos(angle)])
    radius = low + (1.0 - low) * y
    ends = radius[:, None] * out + 0.5 * u[:, None] * way
    axes.plot(ends[:, 0], ends[:, 1], color=INK[2], lw=1.2, gid="profile")
    axes.plot(*np.column_stack([low * out, out]), color=INK[2], lw=0.7)
    for row in np.linspace(0, len(y) - 1, 7).astype(int)[1:]:
        if abs(u[row]) > 0.15:
            arrow(axes, radius[row] * out, ends[row], INK[2], 0.8)
    side = 0.12 if u[np.argmax(np.abs(u))] > 0 else -0.12
    axes.text(-0.78, side, "u", size=SMALL + 1, color=INK[2], ha="center", va="center", style="italic")


def _wall(axes: Axes, case: Case, name: str, back: float, side: float) -> None:
    """What a wall does: words beside it, an arrow on its back, and a box where a body rides on it."""
    from matplotlib.patches import Rectangle

    tree = (case.tree.get("wall") or {}).get(name) or {}
    height = back + side * 0.17
    if "body" in tree:
        body = tree["body"]
        axes.add_patch(Rectangle((0.95, min(back, back + side * 0.22)), 1.1, 0.22, fc="white", ec=BLACK, lw=1.1))
        middle = back + side * 0.11
        axes.text(1.5, middle, str(body.get("mass", "body")), ha="center", va="center", size=SMALL, color=BLACK)
    direction = _direction(case, name)
    if direction:
        x = (2.2, 2.8) if "body" in tree else (1.2, 1.9)
        at = height if side else 0.0
        start, end = x if direction > 0 else x[::-1]
        arrow(axes, np.array([start, at]), np.array([end, at]), BLACK, 2.2)
    axes.text(
        LONG + 0.55, back + side * 0.02, "\n".join(_said(case, name)), size=SMALL, linespacing=1.2, color=BLACK,
        va={1.0: "bottom", -1.0: "top", 0.0: "center"}[side],
    )  # fmt: skip


def _said(case: Case, name: str) -> list[str]:
    """Lines about one wall."""
    tree = (case.tree.get("wall") or {}).get(name) or {}
    text = "stands still"
    for key in ("speed", "displacement"):
        if key in tree:
            text = f"{key}: {drive_words(tree[key])}"
    if tree.get("shear_free"):
        text = "shear-free surface"
    if "body" in tree:
        loads = [key for key in ("force", "torque", "force_curve", "torque_curve", "incline") if key in tree["body"]]
        more = [key for key in ("damping", "stiffness", "dry_friction") if key in tree["body"]]
        first = drive_words(tree["body"][loads[0]]) if loads[:1] and loads[0] in ("force", "torque") else ""
        text = "a body, " + (f"{loads[0].replace('_', ' ')}: {first}" if first else f"driven by {' and '.join(loads)}")
        text += f"; with {' and '.join(more)}" if more else ""
        text = text.replace("driven by ;", "not driven;").replace("_", " ")
    if tree.get("slip_length"):
        text += f"; slip length {tree['slip_length']}"
    return wrap(f"{name}: {shortened(text, 2 * LETTERS)}", LETTERS)


def _direction(case: Case, name: str) -> float:
    """Sign of what moves a wall at its largest: +1, -1, or 0 where nothing does."""
    wall = next((wall for wall in case.walls if wall is not None and wall.name == name), None)
    if wall is None:
        return 0.0
    if wall.body is not None:
        curve = 0.0 if wall.body.curve is None else wall.body.curve.values[0]
        return float(np.sign(_largest(wall.body.load, case) + curve + wall.body.mass * np.sin(wall.body.incline)))
    if wall.displacement is not None:
        return float(np.sign(_largest(wall.displacement.derivative(), case)))
    return 0.0 if wall.speed is None else float(np.sign(_largest(wall.speed, case)))


def _largest(drive: Drive, case: Case) -> float:
    """The drive's value of largest magnitude, by samples of each smooth piece."""
    until = 1.01 * horizon(case.problem()) + 1e-9  # beyond the last break, however early that is
    pieces = drive.pieces(until)
    ends = np.append(pieces.starts[1:], until)
    offset = (ends - pieces.starts)[:, None] * np.linspace(0.0, 1.0, 33)
    which = np.broadcast_to(np.arange(len(ends))[:, None], offset.shape)
    values = pieces.at(which.ravel(), offset.ravel())
    return float(values[np.argmax(np.abs(values))])


def _push(axes: Axes, case: Case, height: float) -> None:
    """The pressure as a broad arrow in the gap, with its words below the drawing; nothing where there is none."""
    tree = case.tree.get("pressure") or {}
    if not tree:
        return
    key, value = next(iter(tree.items()))
    words = "sealed, no net flow: G follows" if key == "sealed" else f"{key.replace('_', ' ')}, {drive_words(value)}"
    text = f"G: {shortened(words, 90)}"
    axes.text(0.115, 0.02, text, size=SMALL, color=BLACK, transform=axes.transAxes, gid="pressure")
    sign = 0.0 if case.pressure.drive is None else _largest(case.pressure.drive, case)
    if sign == 0.0:
        return
    ends = (0.8, 1.4) if sign > 0 else (1.4, 0.8)
    form = "simple,head_width=1.1,head_length=0.7,tail_width=0.45"
    style = {"arrowstyle": form, "fc": "white", "ec": BLACK, "lw": 0.9, "shrinkA": 0, "shrinkB": 0}
    axes.annotate("", (ends[1], height), (ends[0], height), arrowprops=style)
    axes.text(1.5, height, "G", size=SMALL + 1, va="center", style="italic", color=BLACK)


def _profile(axes: Axes, result: Result, low: float, high: float, mirrored: bool) -> None:
    """The last stored profile, from a base line in the gap."""
    y, u = _scaled(result)
    base = 1.95 if u[np.argmax(np.abs(u))] > 0.0 else 2.75
    parts = [(low + (high - low) * y, u)]
    if mirrored:
        parts.append((-(low + (high - low) * y), u))
    for height, value in parts:
        axes.plot(base + 0.8 * value, height, color=INK[2], lw=1.3, gid="profile")
        axes.plot([base, base], [height[0], height[-1]], color=INK[2], lw=0.7)
    y0, u0 = parts[0]
    for row in np.linspace(0, len(y0) - 1, 9).astype(int)[1:-1]:
        if abs(u0[row]) > 0.08:
            arrow(axes, np.array([base, y0[row]]), np.array([base + 0.8 * u0[row], y0[row]]), INK[2], 0.8)
    side = -1.0 if u0[np.argmax(np.abs(u0))] > 0 else 1.0
    axes.text(base + 0.06 * side, 0.5 * (low + high), "u", size=SMALL + 1, color=INK[2], va="center",
              ha="right" if side < 0 else "left", style="italic")  # fmt: skip


def _scaled(result: Result) -> tuple[np.ndarray, np.ndarray]:
    """Position from 0 to 1 across the gap, and the last profile that moves over its largest magnitude."""
    y = (result.position - result.position[0]) / (result.position[-1] - result.position[0])
    velocity = result.velocity[_shown(result)]
    return y, velocity / (float(np.abs(velocity).max()) or 1.0)


def _shown(result: Result) -> int:
    """The last stored profile, or the fastest where the run ends at rest."""
    sizes = np.abs(result.velocity).max(axis=1)
    return len(sizes) - 1 if sizes[-1] > 0.02 * sizes.max() else int(np.argmax(sizes))


def _typed(case: Case, key: str) -> str:
    return str((case.tree.get("gap") or {}).get(key, ""))


DRAWINGS: dict[str, Callable[[Axes, Case, Result], None]] = {
    "plates": _plates,
    "pipe": _pipe,
    "annulus_axial": _axial,
    "annulus_rotating": _rotating,
}
