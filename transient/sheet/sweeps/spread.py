"""How far one headline number reaches: over one varied key, or, where all is chance, as its distribution."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from transient.result.result import Result, ResultError
from transient.result.scale import Scale, scale
from transient.sheet.labels import Board
from transient.sheet.style import INK, SOFT, extent, margins, page, told, zero_line
from transient.sheet.sweeps.columns import Key, by_group, drawn, dress, key_of, number, stepped, title, unit_of

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

LEVELS = (0.0, 5.0, 50.0, 95.0, 100.0)
MOST_POINTS = 20_000
PALE, PALER = "#9db4cb", "#d9e3ec"


def spread(result: Result, quantity: str | None = None, over: Sequence[str] = ()) -> Figure:
    """The figure of ``quantity`` (default: the first headline number) ``over`` one key.

    Over a key with steps (default: the first of them): least, greatest, median and where nine of ten cases lie; over a
    key drawn at random: a point a case; where nothing has steps: the distribution.
    Raises ResultError for unknown names.
    """
    name, values = number(result, quantity)
    steps = stepped(result)
    words = title(result, name)
    figure = page(result.title, 4.2, words[:1].upper() + words[1:])
    axes = figure.add_axes((0.13, 0.13, 0.73, 0.72))
    unit = scale(float(np.nanmax(np.abs(values), initial=0.0)), result.variables[name].units)
    label = f"{name.replace('_', ' ')} [{unit.unit or '1'}]"
    if len(over) > 1:
        raise ResultError("figure spread: takes one key; a map takes two")
    key = over[0] if over else (steps[0] if steps else None)
    if key is None:
        _distribution(axes, values, unit, result.variables[name].units, label)
    elif key in drawn(result):
        _points(axes, result, key, values, unit)
        axes.set_ylabel(label)
    else:
        _bands(axes, key_of(result, key), values, unit)
        axes.set_ylabel(label)
    return figure


def _bands(axes: Axes, key: Key, values: np.ndarray, unit: Scale) -> None:
    """Median line, a band for nine of ten cases, and one for all."""
    levels = by_group(values, key.place, len(key.values), lambda v: np.percentile(v, LEVELS)) * unit.factor
    x = key.shown
    if key.log:
        axes.set_xscale("log")
    many = bool(np.bincount(key.place).max() > 1)
    ends = [(levels[-1, 2], "median" if many else "", {"color": INK[0]})]
    if many:
        axes.fill_between(x, levels[:, 0], levels[:, 4], color=PALER, lw=0, gid="all")
        axes.fill_between(x, levels[:, 1], levels[:, 3], color=PALE, lw=0, gid="nine of ten")
        for column in (0, 4):
            axes.plot(x, levels[:, column], color=SOFT, lw=0.8, ls=(0, (4, 2)))
        names = ("least", "5 %", "median", "95 %", "greatest")
        ends = [(float(levels[-1, i]), names[i], {"color": INK[0] if i == 2 else SOFT}) for i in range(5)]
    axes.plot(x, levels[:, 2], "o-", color=INK[0], ms=3.5, mfc="white", gid="median")
    axes.set_ylim(*margins(*extent(levels)))
    _limits(axes, key)
    Board(axes).at_ends([end for end in ends if end[1] and np.isfinite(end[0])])
    zero_line(axes)
    axes.set_xlabel(key.title)


def _limits(axes: Axes, key: Key) -> None:
    if len(key.shown) > 1:
        axes.set_xlim(key.shown[0], key.shown[-1])
    if key.labels or key.log:
        dress(key, axes.xaxis)


def _points(axes: Axes, result: Result, key: str, values: np.ndarray, unit: Scale) -> None:
    """A point for each case over a key drawn at random."""
    along = result.variables[key]
    own = unit_of(along.data, along.units)
    every = -(-len(values) // MOST_POINTS)
    axes.plot(
        along.data[::every] * own.factor, values[::every] * unit.factor, "o", color=INK[0], ms=2.2, mfc="none",
        mew=0.6, gid="cases", rasterized=len(values) > 2000,
    )  # fmt: skip
    axes.set_xlabel(f"{key} [{own.unit or '1'}]")


def _distribution(axes: Axes, values: np.ndarray, unit: Scale, si: str, label: str) -> None:
    """Histogram with the median and the values that nine of ten cases lie between."""
    finite = values[np.isfinite(values)] * unit.factor
    if len(finite) == 0:
        raise ResultError("figure spread: no case of this sweep has this number")
    axes.hist(finite, bins=int(np.clip(np.sqrt(len(finite)), 8, 60)), color=PALE, ec="white", lw=0.4)
    top = axes.get_ylim()[1] * 1.25
    axes.set_ylim(0.0, top)
    board = Board(axes)
    for level, stroke in ((5.0, "--"), (50.0, "-"), (95.0, "--")):
        at = float(np.percentile(finite, level))
        axes.axvline(at, color=INK[0], lw=1.2, ls=stroke, gid=f"percentile {level:g}")
        name = "median" if level == 50.0 else f"{level:g} %"
        board.beside(at, 0.9 * top, f"{name}\n{told(at / unit.factor, si, 3)}", color=INK[0])
    axes.set_xlabel(label)
    axes.set_ylabel("cases [1]")

