"""Loads, power and energy of the liquid: what walls and pressure put in, what it keeps, and what becomes heat."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from transient.case.model import Case
from transient.result.result import Result, ResultError
from transient.result.scale import scale
from transient.sheet.histories import by_wall, wall_names
from transient.sheet.labels import Board
from transient.sheet.span import Span, span
from transient.sheet.stated import needed_case
from transient.sheet.stress import finish, stress_signals
from transient.sheet.style import (
    INK,
    STROKE,
    extent,
    margins,
    name_axis,
    need,
    page,
    rows,
    told,
    without_spikes,
    zero_line,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

SHAPES = ("plates", "pipe", "annulus_axial", "annulus_rotating")
SUBTITLE = "Energy of the liquid in all gaps; dissipated is what was put in less what is kinetic"
PRESSURE_INK, PRESSURE_STROKE = "#2b3238", (0, (3.2, 1.1))


@dataclass(frozen=True, eq=False)
class Account:
    """Energy of the liquid from the first stored profile on, in J, of plates without an area in J/m^2, of round gaps
    without a length in J/m.

    ``per`` is what follows the unit; ``power`` (n,) by giver, NaN where infinite; ``work`` (k,) their integrals,
    ``kinetic`` (k,) less that at first, and ``dissipated`` (k,) the rest, at the profiles' times.
    """

    per: str
    power: dict[str, np.ndarray]
    work: dict[str, np.ndarray]
    kinetic: np.ndarray
    dissipated: np.ndarray


def energy(result: Result) -> Figure:
    """The figure.  Raises ResultError where the file lacks the histories, or its case cannot be read."""
    need(result, "energy", "time", "wall", "wall_stress", "wall_speed", "mean_velocity", "profile_time", "velocity")
    account = account_of(result, needed_case(result, "energy"))
    if not account.work:
        raise ResultError("figure energy: nothing puts energy into the liquid in this run")
    shared = span(result, stress_signals(result))
    load = next((name for name in ("wall_force", "wall_torque") if name in result.variables), None)
    count = 2 + (load is not None)
    figure = page(result.title, 1.6 + 1.25 * count, SUBTITLE)
    axes = rows(figure, [1.0] * count, top=0.62, bottom=0.72)
    if load is not None:
        shown = [without_spikes(result.time, column) for column in result.variables[load].data.T]
        by_wall(axes[0], result, load, shared, margins(*extent(np.zeros(1), *shown)))
    _draw(axes[-2], result, shared, result.time, account.power, "power put in", "W", account.per)
    kept = result.profile_time
    curves = {**account.work, "kinetic": account.kinetic, "dissipated": account.dissipated}
    _draw(axes[-1], result, shared, kept, curves, _since(result), "J", account.per)
    finish(figure, axes, result, shared)
    return figure


def account_of(result: Result, case: Case) -> Account:
    """The liquid's energy.  Raises ResultError for a shape whose areas are not known here."""
    gap = case.gap
    if gap.shape.name not in SHAPES:
        raise ResultError(f"figure energy: there is none for the shape {gap.shape.name}")
    flat = gap.shape.metric == 0
    length, width = gap.sizes.get("length"), gap.sizes.get("width")
    if flat:
        known = length is not None and width is not None
        size, per = (length * width, "") if known else (1.0, "/m²")
    else:
        size, per = (length, "") if length is not None else (1.0, "/m")
    size = (size or 1.0) * (1 if per else gap.count)
    around = np.ones(2) if flat else 2.0 * math.pi * np.array([gap.ends.inner, gap.ends.outer])
    pairs: dict[str, tuple[np.ndarray, np.ndarray]] = {}  # of what is straight between rows: load and speed
    ends = {wall.name: end for end, wall in enumerate(case.walls) if wall is not None}
    for column, name in enumerate(wall_names(result)):
        lever = (gap.ends.inner, gap.ends.outer)[ends[name]] if gap.shape.rotating else 1.0
        speed = result.wall_speed[:, column] * (lever * around[ends[name]] * size)
        if np.nan_to_num(result.wall_stress[:, column] * speed).any():
            pairs[f"{name} wall"] = -result.wall_stress[:, column], speed
    across = gap.ends.gap if flat else math.pi * gap.ends.gap * (gap.ends.inner + gap.ends.outer)
    if not gap.shape.rotating and result.pressure_drop_per_length.any():
        pairs["pressure"] = result.pressure_drop_per_length, result.mean_velocity * (across * size)
    kept = result.profile_time
    power = {name: load * speed for name, (load, speed) in pairs.items()}
    work = {name: np.interp(kept, result.time, _work(result.time, *pair)) for name, pair in pairs.items()}
    work = {name: values - values[0] for name, values in work.items()}
    weight = 1.0 if flat else 2.0 * math.pi * result.position
    density = 0.5 * case.fluid.density * size * weight * result.velocity**2
    kinetic = np.trapezoid(density, result.position, axis=1)
    kinetic = kinetic - kinetic[0]
    return Account(per, power, work, kinetic, sum(work.values(), np.zeros(len(kept))) - kinetic)


def _since(result: Result) -> str:
    """What the energies count from."""
    first = float(result.profile_time[0])
    return "energy since the start" if first == 0.0 else f"energy since {told(first, 's')}"


def _work(time: np.ndarray, load: np.ndarray, speed: np.ndarray) -> np.ndarray:
    """Running integral (n,) of load times speed, both straight between rows; an infinite load falls with the root of
    the time, and over that first step its mean is twice its end."""
    step = np.diff(time)
    l0, l1, v0, v1 = load[:-1], load[1:], speed[:-1], speed[1:]
    part = (2.0 * (l0 * v0 + l1 * v1) + l0 * v1 + l1 * v0) / 6.0
    part = np.where(np.isfinite(l0), part, 2.0 * l1 * v1)
    part = np.where(np.isfinite(l1), part, l0 * v0)
    return np.concatenate([[0.0], np.cumsum(np.nan_to_num(step * part))])


def _draw(
    axes: Axes, result: Result, shared: Span, time: np.ndarray, curves: dict[str, np.ndarray], words: str, unit: str,
    per: str,
) -> None:  # fmt: skip
    """Curves named at their right ends, each with an ink and a stroke of its own."""
    low, high = margins(*extent(np.zeros(1), *(without_spikes(time, data) for data in curves.values())))
    chosen = scale(max(abs(low), abs(high)), unit)
    shared.dress(axes, last=False)
    axes.set_ylim(low * chosen.factor, high * chosen.factor)
    board, ends = Board(axes, chosen.factor), []
    x = shared.shown(time)
    for label, data in curves.items():
        ink, stroke = _look(label, wall_names(result))
        y = data * chosen.factor
        board.curve(x, y, color=ink, ls=stroke, gid=f"{words} {label}")
        finite = y[np.isfinite(y)]
        ends.append((float(finite[-1]) if len(finite) else 0.0, label, {"color": ink}))
    board.at_ends(ends)
    name_axis(axes, words, f"{chosen.unit}{per}")
    zero_line(axes)


def _look(label: str, names: list[str]) -> tuple[str, object]:
    """Ink and stroke of a curve: a wall's own, or those of pressure, heat and motion."""
    for i, name in enumerate(names):
        if label == f"{name} wall":
            return INK[i], STROKE[i]
    own = {"dissipated": (INK[2], STROKE[2]), "kinetic": (INK[3], STROKE[3])}
    return own.get(label, (PRESSURE_INK, PRESSURE_STROKE))
