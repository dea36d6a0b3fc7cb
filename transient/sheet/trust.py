"""How far the numbers can be trusted: stated errors and self-checks beside what is allowed."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from transient.result.result import Result, ResultError
from transient.sheet.histories import grouped, wall_names
from transient.sheet.labels import Board
from transient.sheet.span import span
from transient.sheet.stress import finish, stress_signals
from transient.sheet.style import FAINT, INK, SOFT, STROKE, WIDTH, page

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Shares of what is allowed below which a bar begins.
LEAST = 1e-6
DEEPEST = 1e-7  # of what is asked: smaller errors lie on the axis
ROW, TOP, BETWEEN, HISTORY = 0.2, 0.62, 0.75, 1.7
KINDS = {"exact": "difference to the exact series", "estimate": "difference between refinements"}


def trust(result: Result) -> Figure:
    """The figure.  Raises ResultError where the file states neither errors nor checks."""
    bars = [*_errors(result.summary), *_checks(result.summary)]
    if not bars:
        raise ResultError("figure trust: this file states neither errors nor checks")
    history = "wall_stress_error" in result.variables
    tall = TOP + ROW * len(bars) + 0.55 + (HISTORY + BETWEEN if history else 0.0)
    kind = next((wall.get("error_kind") for wall in (result.summary.get("walls") or {}).values()), None)
    told = KINDS.get(str(kind), "stated errors")
    figure = page(result.title, tall, f"Stated errors ({told}) and self-checks, as shares of what is allowed")
    low = (0.55 + (HISTORY + BETWEEN if history else 0.0)) / tall
    _bars(figure.add_axes((2.3 / WIDTH, low, 3.6 / WIDTH, ROW * len(bars) / tall)), bars)
    if history:
        below = figure.add_axes((0.98 / WIDTH, 0.72 / tall, 1 - 1.8 / WIDTH, (HISTORY - 0.17) / tall))
        _history(figure, below, result)
    return figure


def _bars(axes: Axes, bars: list[tuple[str, float, bool]]) -> None:
    """A bar per number on a logarithmic axis; what is allowed is the line at 1."""
    from matplotlib.ticker import FuncFormatter, LogLocator

    largest = max([share for _, share, _ in bars] + [1.0])
    axes.set_xscale("log")
    axes.set_xlim(LEAST, 3.0 * largest)
    axes.set_ylim(len(bars) - 0.5, -0.5)
    for row, (_, share, met) in enumerate(bars):
        ink = INK[0] if met else INK[1]
        axes.barh(row, max(share, LEAST * 1.15), left=0.0, height=0.58, color=ink if met else "white", ec=ink,
                  hatch=None if met else "////", gid=f"share {share!r}")  # fmt: skip
        text = _power(share) if share >= LEAST else f"< {_power(LEAST)}"
        axes.text(1.01, row, text, transform=axes.get_yaxis_transform(), va="center", size=7.5, color=ink)
    axes.axvline(1.0, color="#1d252c", lw=1.0, gid="allowed")
    axes.set_yticks(range(len(bars)), [name for name, _, _ in bars])
    axes.tick_params(axis="y", length=0)
    axes.xaxis.set_major_locator(LogLocator(10.0, numticks=9))
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: _power(value)))
    axes.grid(axis="x", color=FAINT, lw=0.5)
    axes.set_axisbelow(True)
    axes.set_xlabel("share of what is allowed (1: the limit)")


def _power(value: float) -> str:
    """Two digits; a small number as a power of ten."""
    if value >= 1e-3:
        return f"{value:.2g}"
    mantissa, exponent = f"{value:.1e}".split("e")
    raised = str(int(exponent)).translate(str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹"))
    return f"10{raised}" if mantissa == "1.0" else f"{mantissa}·10{raised}"


def _errors(summary: dict[str, Any]) -> list[tuple[str, float, bool]]:
    """(name, error over what is allowed, met) of the headline numbers with an error."""
    asked = (summary.get("accuracy") or {}).get("asked")
    if not asked:
        return []
    settling = summary.get("settling") or {}
    found = [("settling time", settling.get("time"), settling.get("error"))]
    for name, wall in (summary.get("walls") or {}).items():
        found.append((f"peak stress, {name}", wall.get("peak_stress"), wall.get("peak_stress_error")))
    flow = summary.get("flow") or {}
    found.append(("largest mean velocity", flow.get("peak_mean_velocity"), flow.get("peak_mean_velocity_error")))
    for name, body in (summary.get("bodies") or {}).items():
        found.append((f"peak speed, {name}", body.get("peak_speed"), body.get("peak_speed_error")))
    shares = [(name, error / abs(value) / asked) for name, value, error in found if value and error is not None]
    return [(name, share, share <= 1.0) for name, share in shares]


def _checks(summary: dict[str, Any]) -> list[tuple[str, float, bool]]:
    """The same of the self-checks."""
    return [
        (check["name"], abs(check["value"]) / check["limit"], check["status"] == "pass")
        for check in summary.get("checks") or []
        if check.get("kind") == "numerics" and check.get("value") is not None and check.get("limit")
    ]


def _history(figure: Figure, axes: Axes, result: Result) -> None:
    """Bound of the stress's error over time, as a share of each wall's largest stress."""
    shared = span(result, stress_signals(result))
    error = result.variables["wall_stress_error"].data
    names, ends = wall_names(result), []
    x = shared.shown(result.time)
    size = np.nanmax(np.abs(result.wall_stress), axis=0, initial=0.0)
    shares = error / np.where(size > 0.0, size, 1.0)
    asked = (result.summary.get("accuracy") or {}).get("asked")
    axes.set_yscale("log")
    top = max([float(np.nanmax(shares)), asked or 0.0])
    if top > 0.0:
        axes.set_ylim(top * DEEPEST, 2.5 * top)
    board = Board(axes, size=7.5)
    for column, label in grouped(shares, names):
        y = np.maximum(shares[:, column], top * DEEPEST)
        board.curve(x, y, color=INK[column], ls=STROKE[column], lw=1.3, gid=f"error {label}")
        ends.append((float(y[-1]), label, {"color": INK[column]}))
    if asked:
        axes.axhline(asked, color="#1d252c", lw=1.0, gid="asked")
        ends.append((asked, "asked", {"color": SOFT}))
    board.at_ends(ends)
    axes.set_ylabel("error of the stress over\nits wall's largest [1]")
    finish(figure, [axes], result, shared)
