"""What all figures share: page sizes, inks and strokes that survive a black and white printer, axes and marks."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from textwrap import wrap
from typing import TYPE_CHECKING, Any

import numpy as np

from transient.result.result import Result, ResultError
from transient.result.scale import quantity

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Text width of an A4 page with usual margins, and a page filled, in inches.
WIDTH, PAGE = 6.5, 9.4

# Mean width of a letter of an axis label, inches.
_LETTER = 0.068

# Inks told apart by lightness as well as by hue, each with a stroke of its own.
INK = ("#16406b", "#c4601d", "#2b8a78", "#7b3f80")
STROKE: tuple[Any, ...] = ("-", (0, (5, 1.8)), (0, (7, 1.6, 1.4, 1.6)), (0, (1.4, 1.4)))
MINUS = "\N{MINUS SIGN}"
SOFT, FAINT, WALL = "#5c6670", "#c9ced3", "#8d969e"

# An infinite value is shown up to this many times its median, or what it exceeds 5 % of the time.
_MEDIANS, _RARES = 4.0, 1.5

_SETTINGS = {
    "font.size": 8.5,
    "axes.titlesize": 9,
    "axes.labelsize": 8,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.edgecolor": SOFT,
    "axes.linewidth": 0.7,
    "axes.unicode_minus": True,
    "xtick.labelsize": 8,
    "ytick.labelsize": 8,
    "xtick.color": "#2b3238",
    "ytick.color": "#2b3238",
    "lines.linewidth": 1.5,
    "lines.solid_capstyle": "round",
    "hatch.linewidth": 0.6,
    "svg.hashsalt": "transient",
    "figure.dpi": 100,
}


@contextmanager
def drawing() -> Iterator[None]:
    """Our settings while a figure is made or saved, whatever a user's own matplotlib settings are."""
    import matplotlib

    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(_SETTINGS)
        yield


def page(title: str, height: float, subtitle: str = "") -> Figure:
    """An empty figure of A4 text width and ``height`` inches with its heading."""
    from matplotlib.figure import Figure

    figure = Figure(figsize=(WIDTH, height))
    # A title is a user's text: nothing in it is a formula.
    figure.text(0.015, 1 - 0.09 / height, title, ha="left", va="top", weight="bold", size=10, parse_math=False)
    if subtitle:
        figure.text(0.015, 1 - 0.29 / height, subtitle, ha="left", va="top", color=SOFT, parse_math=False)
    return figure


def rows(figure: Figure, heights: list[float], top: float, bottom: float = 0.48) -> list[Axes]:
    """Axes below each other with the given heights (shares); ``top`` and ``bottom`` margins in inches."""
    total = figure.get_figheight()
    grid = figure.add_gridspec(
        len(heights), 1, height_ratios=heights, left=0.98 / WIDTH, right=1 - 0.82 / WIDTH,
        top=1 - top / total, bottom=bottom / total, hspace=0.14,
    )  # fmt: skip
    return [figure.add_subplot(grid[i]) for i in range(len(heights))]


def told(value: float, unit: str, digits: int = 4) -> str:
    """A quantity as figures print it: with the minus sign of the axes."""
    return quantity(value, unit, digits).replace("-", MINUS)


def name_axis(axes: Axes, words: str, unit: str) -> None:
    """Label of the vertical axis, in as many lines as the height of the axes asks for."""
    tall = axes.get_position().height * axes.figure.get_figheight()
    letters = max(int(tall / _LETTER), 8)
    axes.set_ylabel("\n".join(wrap(f"{words} [{unit}]", letters, break_long_words=False)))


def need(result: Result, figure: str, *names: str) -> None:
    """Raises ResultError where the result lacks a variable that the figure shows."""
    for name in names:
        if name not in result.variables:
            raise ResultError(f"figure {figure}: this file holds no {name}, which the figure shows")


def margins(low: float, high: float, share: float = 0.08) -> tuple[float, float]:
    """Limits with room around [low, high], opened up where both are equal."""
    if not high > low:
        room = abs(high) * 0.5 or 1.0
        return low - room, high + room
    room = share * (high - low)
    return low - room, high + room


def zero_line(axes: Axes) -> None:
    """A thin line at zero where the values have both signs."""
    low, high = axes.get_ylim()
    if low < 0 < high:
        axes.axhline(0.0, color=FAINT, lw=0.7, zorder=0)


def extent(*arrays: np.ndarray) -> tuple[float, float]:
    """(smallest, largest) finite value of all arrays; (0, 0) where there is none."""
    values = np.concatenate([np.ravel(array) for array in arrays])
    values = values[np.isfinite(values)]
    return (float(values.min()), float(values.max())) if len(values) else (0.0, 0.0)


def without_spikes(time: np.ndarray, values: np.ndarray) -> np.ndarray:
    """``values`` without the spike of one that becomes infinite."""
    finite = np.isfinite(values)
    if finite.all() or not finite.any():
        return values[finite]
    usual = np.abs(np.interp(np.linspace(time[0], time[-1], 400), time[finite], values[finite]))
    cap = max(_MEDIANS * float(np.median(usual)), _RARES * float(np.percentile(usual, 95)))
    return np.clip(values[finite], -cap, cap)
