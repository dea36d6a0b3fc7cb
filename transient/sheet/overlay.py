"""One quantity of a result beside the same of another result or of a measurement, with the differences stated."""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from transient.result.result import Result, ResultError
from transient.result.scale import scale
from transient.result.store import read
from transient.result.trace import Difference, Trace, difference, names, trace_of
from transient.sheet.histories import WORDS
from transient.sheet.labels import Board
from transient.sheet.measured import measured
from transient.sheet.span import Span, span
from transient.sheet.stress import BREAKS
from transient.sheet.style import (
    INK,
    SOFT,
    STROKE,
    drawing,
    extent,
    margins,
    name_axis,
    page,
    rows,
    told,
    without_spikes,
    zero_line,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# A point for each sample of a measurement, up to so many; more are a line.
POINTS = 400
# Letters of a name beside the axes, and of a line above them.
SHORT, LETTERS = 11, 108


def overlay(
    result: Result,
    other: Result | str | os.PathLike[str],
    quantity: str | None = None,
    column: str | None = None,
    shift: float = 0.0,
    labels: tuple[str, str] | None = None,
) -> Figure:
    """``quantity`` of ``result`` and of ``other``, another result or a measured CSV file, and their difference below.

    ``quantity`` as ``transient table`` names it, such as ``wall_stress upper`` (default: the stress on the last
    wall); ``column`` of the CSV file and ``shift`` (s) of its times, see ``measured``.  ``labels`` for the two.
    Raises ResultError in one line.
    """
    first, second = traces(result, other, quantity, column, shift)
    if labels:
        first, second = (_named(trace, label) for trace, label in zip((first, second), labels, strict=True))
    stated = difference(first, second)
    with drawing():
        return _figure(result, first, second, stated)


def traces(
    result: Result,
    other: Result | str | os.PathLike[str],
    quantity: str | None = None,
    column: str | None = None,
    shift: float = 0.0,
) -> tuple[Trace, Trace]:
    """The two histories that ``overlay`` draws; ``result.trace.difference`` states how they differ."""
    name = quantity or _usual(result)
    first = trace_of(result, name)
    if isinstance(other, Result):
        second = trace_of(other, first.name)
    elif Path(other).suffix.lower() == ".h5":
        second = trace_of(read(other), first.name, Path(other).stem)
    else:
        second = measured(other, first, column, shift)
    if isinstance(other, Result) or Path(other).suffix.lower() == ".h5":
        second = replace(second, time=second.time + shift)
    if first.label == second.label:
        first, second = _named(first, "first"), _named(second, "second")
    return first, second


def says(stated: Difference, unit: str) -> str:
    """The difference in a sentence."""
    if stated.largest is None or stated.when is None or stated.rms is None:
        return "No largest difference is stated: one of the two becomes infinite in the time compared"
    of = f", {100.0 * abs(stated.largest) / stated.size:.2g} % of the largest" if stated.size > 0.0 else ""
    return (
        f"Largest difference {told(stated.largest, unit)} at {told(stated.when, 's')}{of}; root mean square "
        f"{told(stated.rms, unit)}"
    )


def _top(stated: Difference, which: int, unit: str) -> str:
    """The largest value of one of the two, and when."""
    value, when = stated.peak[which], stated.peak_time[which]
    return "unbounded" if value is None or when is None else f"{told(value, unit)} at {told(when, 's')}"


def _usual(result: Result) -> str:
    known = names(result)
    for start in ("wall_stress ", "mean_velocity"):
        found = [name for name in known if name.startswith(start)]
        if found:
            return found[-1]
    raise ResultError("the result holds no histories to compare")


def _quantity(trace: Trace) -> str:
    """Such as ``wall stress, upper``."""
    name, _, wall = trace.name.partition(" ")
    return WORDS.get(name, trace.words) + (f", {wall}" if wall else "")


def _named(trace: Trace, label: str) -> Trace:
    return replace(trace, label=label)


def _figure(result: Result, first: Trace, second: Trace, stated: Difference) -> Figure:
    kinds = ("line", "points" if second.sampled else "dashed")
    both = list(zip((first, second), kinds, strict=True))
    ends = [trace.label if len(trace.label) <= SHORT else kind for trace, kind in both]
    facts = [
        f"{_quantity(first)}: {first.label} ({kinds[0]}), {second.label} ({kinds[1]})",
        says(stated, first.unit),
        "Largest: " + ", ".join(f"{_top(stated, i, first.unit)} ({kind})" for i, kind in enumerate(kinds)),
    ]
    facts = [line if len(line) <= LETTERS else f"{line[: LETTERS - 1]}…" for line in facts]
    figure = page(result.title, 5.2, "\n".join(facts))
    top, below = rows(figure, [2.2, 1.0], top=0.95, bottom=0.6)
    shared = _span(result, first, second)
    shown = [without_spikes(trace.time, trace.value) for trace in (first, second)]
    low, high = margins(*extent(*shown))
    unit = scale(max(abs(low), abs(high)), first.unit)
    shared.dress(top, last=False)
    top.set_ylim(low * unit.factor, high * unit.factor)
    board, names_at = Board(top, unit.factor), []
    for i, trace in enumerate((first, second)):
        x, y = shared.shown(trace.time), trace.value * unit.factor
        few = trace.sampled and len(trace.time) <= POINTS
        style = {"ls": "none", "marker": "o", "ms": 2.6, "mfc": "white", "mew": 0.8} if few else {"ls": STROKE[i]}
        board.curve(x, y, color=INK[i], gid=f"trace {i}", **style)
        names_at.append((float(y[np.isfinite(y)][-1]), ends[i], {"color": INK[i]}))
    board.at_ends(names_at)
    name_axis(top, _quantity(first).split(",")[0], unit.unit)
    zero_line(top)
    _apart(below, shared, first, second, stated)
    breaks = result.variables["drive_break"].data if "drive_break" in result.variables else np.zeros(0)
    marked = [shared.mark_breaks(axes, breaks) for axes in (top, below)]
    if any(marked):
        figure.text(0.015, 0.012, BREAKS, size=7.5, color=SOFT, va="bottom")
    shared.dress(below, last=True)
    figure.align_ylabels([top, below])
    return figure


def _span(result: Result, first: Trace, second: Trace) -> Span:
    """The result's own kind of axis, over the time of both."""
    usual = span(result, [first.value])
    end = max(float(first.time[-1]), float(second.time[-1]))
    return Span(usual.start, end, usual.log, scale(end, "s"))


def _apart(axes: Axes, shared: Span, first: Trace, second: Trace, stated: Difference) -> None:
    """The difference over the time that both cover."""
    time, apart = stated.time, stated.apart
    # the largest of an unbounded difference stands for what is infinite
    spike = stated.largest is None and np.abs(apart) == np.abs(apart).max()
    seen = without_spikes(time, np.where(spike, np.nan, apart))
    low, high = margins(*extent(seen, np.zeros(1)))
    unit = scale(max(abs(low), abs(high)), first.unit)
    shared.dress(axes, last=False)
    axes.set_ylim(low * unit.factor, high * unit.factor)
    Board(axes).curve(shared.shown(time), apart * unit.factor, color=INK[3], ls=STROKE[0], lw=1.2, gid="difference")
    if stated.when is not None and stated.largest is not None:
        at = shared.place(stated.when), stated.largest * unit.factor
        axes.plot(*at, "o", mfc="white", mec=INK[3], ms=4.5, zorder=5)
    name_axis(axes, "difference", unit.unit)
    zero_line(axes)
