"""From the answers of the lanes to the columns of a sweep, for the rows whose errors meet the accuracy."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from transient.gap.problem import Problem
from transient.sweep import lanes_headline as headline
from transient.sweep.columns import SOLVED, Columns
from transient.sweep.lanes_batch import Batch
from transient.sweep.lanes_validity import Seen, verdicts

HARDLY, FINAL_SHARE = 1e-6, 0.01  # as in ``trust.demand``


@dataclass(frozen=True, eq=False)
class Done:
    """Answers of an attempt in lane units: ``numbers`` [n, QUANTITIES, NUMBERS] and ``seen`` [n, SEEN] as in
    ``lanes_headline``; ``jump`` [n, P, 3], ``start`` [n, P] of the pieces; ``rise`` (n,), see ``rise_times``."""

    numbers: np.ndarray
    seen: np.ndarray
    jump: np.ndarray
    start: np.ndarray
    rise: np.ndarray

    def of(self, quantity: int, number: int) -> np.ndarray:
        """One number of one quantity, (n,)."""
        return self.numbers[:, quantity, number]


def infinite_stress(problem: Problem, jump: np.ndarray) -> np.ndarray:
    """Whether each wall's stress is infinite at each piece's start, [n, P, 2]."""
    held = np.array([wall.kind == "moving" and wall.slip_length == 0.0 and wall.body is None for wall in problem.walls])
    return (jump[:, :, :2] != 0.0) & held


def write(
    problem: Problem, batch: Batch, rows: np.ndarray, done: Done, first: int, out: Columns, names: set[str]
) -> np.ndarray:
    """Put the answers that meet the accuracy into ``out``; returns which do (n,)."""
    geometry = batch.geometry
    time, gap = batch.time[rows], geometry.gap[rows]
    codes, message, sure = verdicts(problem, _seen(problem, batch, rows, done))
    met = sure & np.isfinite(done.of(headline.MEAN_FLOW, headline.END)) & _met(problem, done)
    to = first + rows[met]

    def put(name: str, value: np.ndarray) -> None:
        if name in names:
            out[name][to] = value[met]

    out["status"][to], out["verdict"][to], out["message"][to] = SOLVED, codes[met], message[met]
    put("settling_time", done.of(headline.DEVIATION, headline.SETTLE) * time)
    put("settling_error", done.of(headline.DEVIATION, headline.SETTLE_ERROR) * time)
    put("settling_time_flow", done.of(headline.MEAN_FLOW, headline.SETTLE) * time)
    mean = gap if problem.rotating else np.ones_like(gap)
    peak, end = (done.of(headline.MEAN_FLOW, number) * mean for number in (headline.PEAK, headline.END))
    put("peak_mean_velocity", peak)
    put("final_mean_velocity", end)
    put("final_mean_velocity_error", done.of(headline.MEAN_FLOW, headline.END_ERROR) * mean)
    if geometry.section is not None:
        section = np.broadcast_to(geometry.section, batch.time.shape)[rows] * batch.count[rows]
        put("peak_flow_rate", peak * section)
        put("final_flow_rate", end * section)
    drop = batch.viscosity[rows] / gap**2
    put("peak_drop_per_length", done.of(headline.PRESSURE, headline.PEAK) * drop)
    put("final_drop_per_length", done.of(headline.PRESSURE, headline.END) * drop)
    for side, wall in enumerate(problem.walls):
        if wall.kind != "axis":
            for name, value in _wall(problem, batch, rows, done, side):
                put(f"{name}_{wall.name}", value)
    return met


def _wall(
    problem: Problem, batch: Batch, rows: np.ndarray, done: Done, side: int
) -> Iterator[tuple[str, np.ndarray]]:
    """One wall's columns in SI."""
    geometry, time = batch.geometry, batch.time[rows]
    stress = batch.viscosity[rows] / (1.0 if problem.rotating else geometry.gap[rows])
    lever = geometry.radii[side][rows] if problem.rotating else np.ones_like(time)
    infinite = infinite_stress(problem, done.jump)[:, :, side]
    size = np.abs(done.jump[:, :, side]) * infinite
    largest, row = size.argmax(axis=1), np.arange(len(rows))
    unbounded = infinite.any(axis=1)
    coefficient = np.sqrt(batch.density[rows] * batch.viscosity[rows] / np.pi) * size[row, largest] * lever
    at = np.where(unbounded, done.start[row, largest], done.of(side, headline.PEAK_TIME))
    peak = done.of(side, headline.PEAK) * stress
    yield "peak_stress", peak
    yield "peak_stress_error", done.of(side, headline.PEAK_ERROR) * stress
    yield "peak_time", at * time
    yield "final_stress", done.of(side, headline.END) * stress
    yield "final_stress_error", done.of(side, headline.END_ERROR) * stress
    yield "final_speed", done.seen[:, headline.SPEED_LOWER + side]
    yield "unbounded_coefficient", np.where(unbounded, coefficient, np.nan)
    yield "settling_time_stress", done.of(side, headline.SETTLE) * time
    area = geometry.areas[side]
    if area is not None:
        load = np.broadcast_to(area, batch.time.shape)[rows] * batch.count[rows] * lever
        yield "peak_torque" if problem.rotating else "peak_force", peak * load


def _seen(problem: Problem, batch: Batch, rows: np.ndarray, done: Done) -> Seen:
    """What the validity checks look at."""
    geometry, seen = batch.geometry, done.seen
    gap, time = geometry.gap[rows], batch.time[rows]
    scale = batch.viscosity[rows] / (1.0 if problem.rotating else gap**2)  # of the work per volume and time
    pushed = (np.broadcast_to(batch.drives[2].before, batch.time.shape) != 0.0) if problem.start == "steady" else False
    pressed = (done.of(headline.PRESSURE, headline.PEAK) != 0.0) | np.broadcast_to(pushed, batch.time.shape)[rows]

    def known(size: np.ndarray | None) -> np.ndarray | None:
        return None if size is None else np.broadcast_to(size, batch.time.shape)[rows]

    return Seen(
        gap, geometry.inner[rows], geometry.outer[rows], known(geometry.length), known(geometry.section),
        batch.density[rows], batch.viscosity[rows] / batch.density[rows], time, pressed,
        seen[:, headline.SPREAD], seen[:, headline.RELATIVE], seen[:, headline.TURN_LOWER : headline.TURN_UPPER + 1],
        seen[:, headline.SPUN_UP] > 0.5, seen[:, headline.WORK] * scale * time, seen[:, headline.POWER] * scale,
        done.rise * time,
    )  # fmt: skip


def _met(problem: Problem, done: Done) -> np.ndarray:
    """Whether every number's error is within the accuracy (n,), as ``trust.demand`` asks of a single run."""
    accuracy = problem.accuracy
    met = np.ones(len(done.numbers), bool)

    def ask(quantity: int, error: int, size: np.ndarray) -> None:
        nonlocal met
        off = done.of(quantity, error)
        with np.errstate(invalid="ignore"):
            met &= np.isnan(off) | (off <= accuracy * size) | (off == 0.0)

    for quantity in (headline.DEVIATION, headline.MEAN_FLOW, headline.LOWER, headline.UPPER):
        if quantity < 2 and problem.walls[quantity].kind != "moving":
            continue
        if quantity == headline.MEAN_FLOW and problem.flow is not None:
            continue  # the case's own
        ask(quantity, headline.SETTLE_ERROR, done.of(quantity, headline.SETTLE))
    largest = np.fmax(done.of(headline.LOWER, headline.LARGEST), done.of(headline.UPPER, headline.LARGEST))
    for side in (headline.LOWER, headline.UPPER):
        if problem.walls[side].kind != "moving":
            continue
        peak = np.fmax(done.of(side, headline.LARGEST), HARDLY * largest)
        ask(side, headline.PEAK_ERROR, peak)
        final = np.abs(done.of(side, headline.END))
        calm = done.of(side, headline.CALMED) > 0.5
        size = np.where(calm, np.fmax(final, FINAL_SHARE * peak), np.fmax(final, peak))
        ask(side, headline.END_ERROR, np.fmax(size, HARDLY * largest))
    if problem.flow is not None:  # the pressure is the result
        ask(headline.PRESSURE, headline.PEAK_ERROR, done.of(headline.PRESSURE, headline.LARGEST))
        ask(headline.PRESSURE, headline.END_ERROR, done.of(headline.PRESSURE, headline.LARGEST))
        return met
    fastest = done.of(headline.DEVIATION, headline.LARGEST)
    moving = np.fmax(np.abs(done.of(headline.MEAN_FLOW, headline.PEAK)), HARDLY * fastest)
    ask(headline.MEAN_FLOW, headline.PEAK_ERROR, moving)
    return met
