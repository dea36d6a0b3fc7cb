"""Strokes of the sketch: walls, arrows, dimensions and directions, in the drawing's own units."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from transient.sheet.style import SOFT, WALL

if TYPE_CHECKING:
    from matplotlib.axes import Axes

# A gap is about 1 high, the section LONG long, walls THICK thick.
LONG, THICK = 3.0, 0.14
BLACK = "#1d252c"
SMALL = 7.5


def band(axes: Axes, inside: float, outside: float, free: bool = False) -> None:
    """A wall from its wetted face to its back, hatched; a ``free`` surface is a broken line."""
    from matplotlib.patches import Rectangle

    low, high = sorted((inside, outside))
    faces = {inside, outside} if high - low > 2 * THICK else {inside}  # a rod is wetted on both sides
    if not free:
        axes.add_patch(Rectangle((0.0, low), LONG, high - low, fc="white", ec=WALL, hatch="/////", lw=0))
    for edge in faces:
        axes.plot(
            [0.0, LONG], [edge, edge], color=BLACK, lw=1.1, ls=(0, (5, 3)) if free else "-",
            gid="free" if free else "face",
        )  # fmt: skip


def centre_line(axes: Axes) -> None:
    axes.plot([0.0, LONG + 0.1], [0.0, 0.0], color=SOFT, lw=0.8, ls=(0, (10, 3, 2, 3)))


def sense(axes: Axes, at: float, inward: float, ink: str) -> None:
    """A positive stress on a wall: a traction along +x at its face."""
    y = at + 0.09 * inward
    arrow(axes, np.array([0.12, y]), np.array([0.52, y]), ink, 1.6)
    axes.text(0.58, y + 0.02 * inward, "τ > 0", size=SMALL, color=ink, va="center")


def frame(axes: Axes, origin: float, across: str) -> None:
    """The directions that count positive."""
    at = np.array([-0.62, origin])
    for way in ((0.42, 0.0), (0.0, 0.42)):
        arrow(axes, at, at + np.array(way), BLACK, 1.0)
    axes.text(at[0] + 0.46, at[1], "x", size=SMALL + 1, va="center", style="italic")
    axes.text(at[0], at[1] + 0.47, across, size=SMALL + 1, ha="center", style="italic")


def dimension(axes: Axes, x: float, low: float, high: float, words: str) -> None:
    """A dimension line with its size."""
    style = {"arrowstyle": "<->", "color": SOFT, "lw": 0.8, "shrinkA": 0, "shrinkB": 0}
    axes.annotate("", (x, low), (x, high), arrowprops=style)
    for y in (low, high):
        axes.plot([x - 0.14, x + 0.08], [y, y], color=SOFT, lw=0.6)
    axes.text(x + 0.1, 0.5 * (low + high), words, size=SMALL, va="center", color=BLACK)


def arrow(axes: Axes, start: np.ndarray, end: np.ndarray, ink: str, width: float) -> None:
    style = {"arrowstyle": "-|>", "color": ink, "lw": width, "shrinkA": 0, "shrinkB": 0}
    style["mutation_scale"] = 6 + 2 * width
    axes.annotate("", tuple(end), tuple(start), arrowprops=style)


def straight_limits(axes: Axes, low: float, high: float) -> None:
    axes.set_xlim(-0.8, 6.2)
    axes.set_ylim(low, high)
