"""One headline number over two varied keys: the worst of the cases that share both."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from transient.result.result import Result, ResultError
from transient.result.scale import scale
from transient.sheet.style import MINUS, page
from transient.sheet.sweeps.columns import Key, dress, key_of, number, stepped, title, worst
from transient.sheet.ticks import steps, ticks

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Up to so many cells carry their number; more carry contours.
NUMBERED = 60
DECADE = 10.0
DRAWN = 2000  # cells drawn one by one; more are a picture
SHADES = "cividis"  # even in lightness, so that it prints in grey and is read by the colour-blind
BAD = ("outside", "failed")


def map(result: Result, quantity: str | None = None, over: Sequence[str] = ()) -> Figure:
    """The figure of ``quantity`` (default: the first headline number) ``over`` two keys (default: the first two).

    Raises ResultError where fewer than two keys have steps, or for unknown names.
    """
    name, values = number(result, quantity)
    keys = list(over) or stepped(result)[:2]
    if len(keys) != 2:
        raise ResultError("figure map: needs two keys with steps in [vary]; spread shows one")
    along, up = (key_of(result, key) for key in keys)
    groups = along.place + len(along.values) * up.place
    cells = worst(values, groups, len(along.values) * len(up.values)).reshape(len(up.values), -1)
    marked = _marked(result, groups, cells.shape)
    most = int(np.bincount(groups, minlength=cells.size).max())
    told = f"{title(result, name)}; each cell the largest of {most} cases" if most > 1 else title(result, name)
    figure = page(result.title, 4.4, told[:1].upper() + told[1:])
    axes = figure.add_axes((0.13, 0.13, 0.70, 0.71))
    _cells(figure, axes, along, up, cells, result.variables[name].units)
    _marks(axes, along, up, marked, cells)
    for key, axis in ((along, axes.xaxis), (up, axes.yaxis)):
        dress(key, axis)
    axes.set_xlabel(along.title)
    axes.set_ylabel(up.title)
    return figure


def _marked(result: Result, groups: np.ndarray, shape: tuple[int, ...]) -> np.ndarray:
    """Cells with an answer that is not to be relied on."""
    out = np.zeros(shape[0] * shape[1], bool)
    if "verdict" in result.variables:
        out[groups[np.isin(result.variables["verdict"].data, BAD)]] = True
    return out.reshape(shape)


def _edges(key: Key) -> np.ndarray:
    """Borders (k + 1,) of the cells around the values, on the axis."""
    x = np.log(key.shown) if key.log else key.shown
    middle = 0.5 * (x[1:] + x[:-1])
    step = np.diff(x) if len(x) > 1 else np.array([1.0])
    edges = np.concatenate([[x[0] - 0.5 * step[0]], middle, [x[-1] + 0.5 * step[-1]]])
    return np.exp(edges) if key.log else edges


def _cells(figure: Figure, axes: Axes, along: Key, up: Key, cells: np.ndarray, si: str) -> None:
    unit = scale(float(np.nanmax(np.abs(cells), initial=0.0)), si)
    shown = np.ma.masked_invalid(cells * unit.factor)
    for key, set_scale in ((along, axes.set_xscale), (up, axes.set_yscale)):
        if key.log:
            set_scale("log")
    axes.set_facecolor("white")
    # of negative numbers the largest magnitude is the darkest
    shades = SHADES if shown.count() and float(shown.max()) <= 0.0 else f"{SHADES}_r"
    colours = axes.pcolormesh(
        _edges(along), _edges(up), shown, cmap=shades, norm=_norm(shown), rasterized=cells.size > DRAWN, gid="map"
    )
    bar = figure.colorbar(colours, cax=figure.add_axes((0.86, 0.13, 0.025, 0.71)))
    if _norm(shown) is not None:
        places = steps(float(shown.min()), float(shown.max()))
        bar.set_ticks(places, labels=[f"{place:g}" for place in places])
        bar.minorticks_off()
    bar.set_label(f"[{unit.unit or '1'}]", rotation=0, labelpad=14)
    if cells.size <= NUMBERED:
        _numbers(axes, along, up, shown, colours)
    elif min(cells.shape) >= 3 and shown.count() and np.ma.ptp(shown) > 0.0:
        _contours(axes, along, up, shown)


def _norm(shown: np.ma.MaskedArray):
    """Logarithmic shades where positive values span more than a decade; else None."""
    from matplotlib.colors import LogNorm

    if not shown.count() or float(shown.min()) <= 0.0 or float(shown.max()) < DECADE * float(shown.min()):
        return None
    return LogNorm(float(shown.min()), float(shown.max()))


def _contours(axes: Axes, along: Key, up: Key, shown: np.ma.MaskedArray) -> None:
    """Lines of equal value, named on them; white around the black is seen on any shade."""
    from matplotlib.patheffects import withStroke

    low, high = float(shown.min()), float(shown.max())
    levels = steps(low, high) if _norm(shown) is not None else ticks(low, high, 7)
    levels = [level for level in levels if low < level < high]
    if not levels:
        return
    around = [withStroke(linewidth=2.0, foreground="white")]
    lines = axes.contour(along.shown, up.shown, shown, levels, colors="black", linewidths=0.7, linestyles="solid")
    lines.set_path_effects([withStroke(linewidth=1.6, foreground="white")])
    for text in axes.clabel(lines, fontsize=7.5, fmt=lambda value: f"{value:.4g}".replace("-", MINUS)):
        text.set_path_effects(around)


def _numbers(axes: Axes, along: Key, up: Key, shown: np.ma.MaskedArray, colours) -> None:
    """Each cell's number, light on dark."""
    size = 8.0 if shown.shape[1] <= 6 else 6.6
    for i, y in enumerate(up.shown):
        for j, x in enumerate(along.shown):
            if shown.mask is not np.ma.nomask and shown.mask[i, j]:
                continue
            red, green, blue, _ = colours.to_rgba(float(shown[i, j]))
            ink = "white" if 0.3 * red + 0.59 * green + 0.11 * blue < 0.5 else "black"
            text = f"{float(shown[i, j]):.3g}".replace("-", MINUS)
            axes.text(x, y, text, ha="center", va="center", size=size, color=ink, gid="cell")


def _marks(axes: Axes, along: Key, up: Key, marked: np.ndarray, cells: np.ndarray) -> None:
    """Crosses on what is not to be relied on, hatching where no case was solved; both said below the axes."""
    x, y = np.meshgrid(along.shown, up.shown)
    notes = []
    if marked.any():
        axes.plot(x[marked], y[marked], "x", color="#c4201d", ms=6, mew=1.4, gid="unreliable")
        notes.append("crosses: outside the model, or a self-check failed")
    if np.isnan(cells).any():
        axes.patch.set(hatch="////", edgecolor="#c9ced3")
        notes.append("hatched: no case solved")
    if notes:
        axes.figure.text(0.015, 0.012, "; ".join(notes).capitalize() + ".", size=7.5, color="#5c6670", va="bottom")
