"""Many linear cases with prescribed walls or pressure, marched side by side in the lanes of the vector unit.

The march, its scheme and its three levels are in ``march.lanes``; the errors are those of refinement
(``lanes_headline``).  A row whose errors do not meet the accuracy is marched again, finer, and left open if that does
not help: then the next runner solves it alone.  Everything between the values and the columns is arithmetic on arrays
over the rows or compiled.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np

from transient.case.model import Case
from transient.gap.problem import Problem
from transient.march import lanes
from transient.march.lanes_grid import grid_table, unit_problem
from transient.march.lanes_inputs import FOLLOW, GROWTH, PIECE_FIELDS, START, join, rise_times
from transient.march.regime import slowest_decay
from transient.sweep import lanes_headline as headline
from transient.sweep.columns import FAILED, SOLVED, Column, Columns, blank
from transient.sweep.keys import Values, Varied
from transient.sweep.lanes_drives import DriveRows
from transient.sweep.lanes_form import Form, Geometry
from transient.sweep.lanes_validity import Seen, verdicts

LEVELS = 3
CELLS = 0.40  # growth of the base level's cells, at accuracy 1e-3
FEWEST = 8
THINNEST = 14  # layers thinner than 2^-14 of the gap are left to the march of single cases
MOST_ROWS = 8000
KEPT = 25_000  # rows kept at a time
TOGETHER = 256  # cases whose rows are kept at a time: about what the second cache holds
NUMBERS = 400_000  # pieces' numbers kept at a time
REFINEMENTS = (1.0, 2.0)


def takes(base: Case, keys: Sequence[Varied]) -> bool:
    """Whether rows of this form can be marched here: linear, walls' speeds or pressure prescribed, a steady end."""
    return Form(base, keys).fits


def solve(base: Case, keys: Sequence[Varied], values: Values, columns: Sequence[Column]) -> Columns:
    """Columns of all rows; ``values`` (n,) each in SI.  Rows without a trusted answer are left open."""
    form = Form(base, keys)
    rows = len(next(iter(values.values()))) if values else 1
    out = blank(columns, rows)
    chunk = max(WIDTH_LEAST, min(rows, NUMBERS // 24))
    for first in range(0, rows, chunk):
        part = slice(first, min(first + chunk, rows))
        own = {name: np.asarray(array)[part] for name, array in values.items()}
        _solve(form, own, part, out, {column.name for column in columns})
    return out


WIDTH_LEAST = 1024


@dataclass(frozen=True, eq=False)
class Batch:
    """Rows in SI and in lane units; (n,) each unless said otherwise."""

    geometry: Geometry
    density: np.ndarray
    viscosity: np.ndarray
    time: np.ndarray  # diffusion time, s
    until: np.ndarray  # s
    within: np.ndarray
    count: np.ndarray  # gaps in parallel
    drives: tuple[DriveRows, DriveRows, DriveRows]
    before: np.ndarray  # [n, 3], lane units
    final: np.ndarray  # [n, 3], lane units
    slowest: np.ndarray  # in diffusion times
    units: list[Problem]  # unit gaps
    unit_of: np.ndarray  # the rows' places in ``units``


def _solve(form: Form, values: Values, part: slice, out: Columns, names: set[str]) -> None:
    rows = len(next(iter(values.values()))) if values else 1
    batch, good = _batch(form, values, rows)
    waiting = np.flatnonzero(good)
    for refine in REFINEMENTS:
        if len(waiting) == 0:
            return
        done = _attempt(form, batch, waiting, refine)
        met = _write(form, batch, waiting, done, part.start, out, names)
        waiting = waiting[~met]


def _batch(form: Form, values: Values, rows: int) -> tuple[Batch, np.ndarray]:
    """The rows' numbers, and which of them can be marched."""
    problem = form.problem
    bad = form.refused(values, rows)
    geometry = form.geometry(values, rows)
    density, viscosity = form.fluid(values, rows)
    bad |= geometry.bad | ~(density > 0.0) | ~(viscosity > 0.0)
    drives = tuple(form.drive(which, values, geometry, rows) for which in range(3))
    for drive in drives:
        bad |= drive.bad
    gap = np.where(bad, 1.0, geometry.gap)
    inner = np.where(bad, problem.inner / problem.gap, geometry.inner / gap)
    time = np.where(bad, 1.0, gap**2 * density / np.where(bad, 1.0, viscosity))
    push = gap**2 / np.where(bad, 1.0, viscosity)
    units, unit_of = _units(problem, inner, gap)
    slowest = np.array([_slowest(*_key(unit)) for unit in units])[unit_of]
    within = form.number("run.settle_within", values, rows)
    within = np.full(rows, problem.settle_within) if within is None else within
    count = form.number("gap.count", values, rows)
    until = form.number("run.duration", values, rows)
    if until is None:
        until = _automatic(problem, drives, slowest * time, within)
    final = np.stack([np.broadcast_to(drive.end, (rows,)) for drive in drives], axis=1)
    before = np.stack([np.broadcast_to(drive.before, (rows,)) for drive in drives], axis=1)
    if problem.start == "rest":
        before = np.zeros((rows, 3))
    final = final.copy()
    final[:, 2] *= push
    bad |= ~np.isfinite(until) | ~(until > 0.0) | ~np.isfinite(final).all(axis=1) | ~np.isfinite(slowest)
    bad |= ~np.isfinite(time) | ~(time > 0.0)
    batch = Batch(
        geometry, density, viscosity, time, np.where(bad, 1.0, until), within,
        np.full(rows, float(problem.count)) if count is None else count, drives, before, final, slowest, units,
        unit_of,
    )  # fmt: skip
    return batch, ~bad


def _automatic(problem: Problem, drives: tuple[DriveRows, ...], fluid: np.ndarray, within: np.ndarray) -> np.ndarray:
    """Lengths (n,) s of runs that last until settled and a margin, as in ``march.regime``."""
    last = np.max([np.broadcast_to(drive.last, fluid.shape) for drive in drives], axis=0)
    lag = np.max([np.broadcast_to(drive.lag, fluid.shape) for drive in drives], axis=0)
    least = 0.1 * np.minimum(within, min(problem.accuracy, 0.01))
    return last + np.maximum(np.log(4.0 / least) * (fluid + lag), 0.1 * last)


def _units(problem: Problem, inner: np.ndarray, gap: np.ndarray) -> tuple[list[Problem], np.ndarray]:
    """The different unit gaps among the rows, and each row's place among them."""
    slips = [wall.slip_length for wall in problem.walls]
    if problem.metric == 0 or problem.walls[0].kind == "axis":
        inner = np.zeros_like(inner)
    key = np.stack([inner, *(slip / gap for slip in slips)], axis=1)
    if (key == key[0]).all():
        place, first = np.zeros(len(gap), int), np.zeros(1, int)
    else:
        _, first, place = np.unique(key, axis=0, return_index=True, return_inverse=True)
        place = place.ravel()
    return [_unit(problem, *key[i]) for i in first], place


def _unit(problem: Problem, inner: float, lower_slip: float, upper_slip: float) -> Problem:
    unit = unit_problem(problem)
    walls = tuple(
        replace(wall, slip_length=float(slip)) for wall, slip in zip(unit.walls, (lower_slip, upper_slip), strict=True)
    )
    return replace(unit, inner=float(inner), outer=float(inner) + 1.0, walls=(walls[0], walls[1]))


def _key(unit: Problem) -> tuple:
    """What a unit gap's grids and slowest decay depend on."""
    return _Held(unit), unit.metric, unit.inner, *((wall.kind, wall.slip_length) for wall in unit.walls)


class _Held:
    """A problem carried along a key without being part of it."""

    def __init__(self, problem: Problem):
        self.problem = problem

    def __eq__(self, other: object) -> bool:
        return isinstance(other, _Held)

    def __hash__(self) -> int:
        return 0


@lru_cache(maxsize=4096)
def _slowest(unit: _Held, *key: object) -> float:
    return slowest_decay(unit.problem)


@lru_cache(maxsize=4096)
def _tables(cells: int, layers: tuple[float, float], unit: _Held, *key: object) -> list[tuple[np.ndarray, np.ndarray]]:
    return [grid_table(unit.problem, cells * 2**level, layers) for level in range(LEVELS)]


@dataclass(frozen=True, eq=False)
class Done:
    """Answers of an attempt: ``numbers`` [n, headline.NUMBERS] in lane units, ``jump`` [n, P, 3], ``pieces`` (n,),
    ``start`` [n, P], ``facts`` [n, FACTS], ``largest_row`` ..."""

    numbers: np.ndarray
    jump: np.ndarray
    start: np.ndarray
    pieces: np.ndarray
    rise: np.ndarray


def _attempt(form: Form, batch: Batch, rows: np.ndarray, refine: float) -> Done:
    problem = form.problem
    fine = (min(problem.accuracy, 0.02) / 1e-3) ** 0.25 / refine
    most = sum(drive.starts.shape[1] for drive in batch.drives)
    n = len(rows)
    pieces = np.zeros(n, np.int64)
    part_of = np.zeros((n, most, PIECE_FIELDS))
    poly, wave = np.zeros((n, most, 3, 4)), np.zeros((n, most, 3, 4))
    jump, layer = np.zeros((n, most, 3)), np.zeros((n, 2))
    before = batch.before[rows].copy()
    starts, own_poly, own_wave = _together(batch.drives, rows)
    push = batch.geometry.gap[rows] ** 2 / batch.viscosity[rows]
    join(
        starts, own_poly, own_wave, before, batch.until[rows], batch.time[rows], push, np.full(n, fine),
        pieces, part_of, poly, wave, jump, layer,
    )  # fmt: skip
    waving = bool(np.any(wave[:, :, :, :2]))
    numbers = np.zeros((n, lanes.CASE_FIELDS))
    slowest = batch.slowest[rows]
    least = 0.1 * np.minimum(batch.within[rows], min(problem.accuracy, 0.01))
    numbers[:, lanes.LONGEST] = FOLLOW * fine * slowest
    numbers[:, lanes.CALM] = np.log(1.0 / least) * slowest
    numbers[:, lanes.GROWTH] = GROWTH * fine
    infinite = _infinite(problem, jump)
    out = np.full((n, headline.NUMBERS), np.nan)
    order, borders, layers = _groups(problem, batch, rows, layer)
    for first, stop, (low, high) in zip(borders[:-1], borders[1:], layers, strict=True):
        if max(low, high) > THINNEST:
            continue
        group = order[first:stop]
        cells = _cells(2.0**-low, 2.0**-high, fine)
        places, grid = np.unique(batch.unit_of[rows[group]], return_inverse=True)
        tables = [_tables(cells, (2.0**-low, 2.0**-high), *_key(batch.units[i])) for i in places]
        together = int(np.clip(KEPT // _most_rows(pieces[group]), lanes.HALF, TOGETHER))
        for begin in range(0, len(group), together):
            some = slice(begin, begin + together)
            of = group[some]
            facts = _facts(problem, batch, rows[of], grid[some], tables, places)
            out[of] = _march(
                problem, tables, grid[some], numbers[of], pieces[of], part_of[of], poly[of], wave[of], jump[of],
                before[of], batch.final[rows[of]], waving, infinite[of], facts,
            )  # fmt: skip
    rise = np.full(n, np.inf)
    if problem.length is not None and (poly[:, :, 2].any() or wave[:, :, 2, :2].any()):
        rise_times(pieces, part_of, poly, wave, jump, rise)
    return Done(out, jump, part_of[:, :, START], pieces, rise)


def _most_rows(pieces: np.ndarray) -> int:
    """Room for the rows of cases of so many pieces (n,)."""
    return int(min(MOST_ROWS, 60 + 24 * pieces.max(initial=1)))


def _together(
    drives: tuple[DriveRows, DriveRows, DriveRows], rows: np.ndarray
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The three drives' pieces in common arrays, [n or 1, 3, P(, 4)]; those that one does not have never begin."""
    alike = all(drive.starts.shape[0] == 1 for drive in drives)
    n = 1 if alike else len(rows)
    most = max(drive.starts.shape[1] for drive in drives)
    starts = np.full((n, 3, most), np.inf)
    poly, wave = np.zeros((n, 3, most, 4)), np.zeros((n, 3, most, 4))
    for which, drive in enumerate(drives):
        own = slice(None) if drive.starts.shape[0] == 1 else rows
        count = drive.starts.shape[1]
        starts[:, which, :count] = drive.starts[own]
        poly[:, which, :count] = drive.poly[own]
        wave[:, which, :count] = drive.wave[own]
    return starts, poly, wave


def _infinite(problem: Problem, jump: np.ndarray) -> np.ndarray:
    """Whether each wall's stress is infinite at each piece's start, [n, P, 2]."""
    held = np.array([wall.kind == "moving" and wall.slip_length == 0.0 for wall in problem.walls])
    return (jump[:, :, :2] != 0.0) & held


def _groups(
    problem: Problem, batch: Batch, rows: np.ndarray, layer: np.ndarray
) -> tuple[np.ndarray, np.ndarray, list[tuple[int, int]]]:
    """Rows of equal layers together: their order, borders in it, and each group's layers as powers of a half."""
    halvings = np.empty((len(rows), 2), np.int64)
    for end, radius in enumerate((batch.geometry.inner[rows], batch.geometry.outer[rows])):
        limit = np.ones(len(rows))
        if problem.metric and problem.walls[end].kind != "axis":
            limit = 0.5 * radius / batch.geometry.gap[rows]
        moving = problem.walls[end].kind == "moving"
        finest = np.minimum(layer[:, end] if moving else 1.0, np.minimum(limit, 1.0))
        with np.errstate(divide="ignore"):
            halvings[:, end] = np.clip(np.ceil(-np.log2(finest) - 1e-9), 0, THINNEST + 1).astype(int)
    key = halvings[:, 0] * 64 + halvings[:, 1]
    order = np.argsort(key, kind="stable")
    borders = np.flatnonzero(np.diff(key[order], prepend=-1))
    layers = [(int(k) // 64, int(k) % 64) for k in key[order][borders]]
    return order, np.append(borders, len(rows)), layers


def _cells(low: float, high: float, fine: float) -> int:
    """Cells of the base level, an even number."""
    along = np.log1p(1.0 / low) + np.log1p(1.0 / high)
    return max(FEWEST, 2 * int(np.ceil(0.5 * along / (CELLS * fine))))


@dataclass(frozen=True, eq=False)
class Facts:
    """What rows end in, exact on any grid: ``ends`` [n, FACTS]; ``calm`` [n, 3, 3] steady stresses of both walls and
    mean per unit input; ``reach`` [n, 2] of a wall's stress times speed in the work per volume; ``middle`` (n,) what a
    mean speed is divided by to compare it with wall speeds."""

    ends: np.ndarray
    calm: np.ndarray
    reach: np.ndarray
    middle: np.ndarray


def _facts(
    problem: Problem, batch: Batch, rows: np.ndarray, grid: np.ndarray, tables: list, places: np.ndarray
) -> Facts:
    facts, n = np.zeros((len(rows), headline.FACTS)), len(rows)
    calm, reach, middle = np.zeros((n, 3, 3)), np.zeros((n, 2)), np.ones(n)
    facts[:, headline.LEVEL] = batch.within[rows]
    final = batch.final[rows]
    for place, levels in enumerate(tables):
        own = np.flatnonzero(grid == place) if len(tables) > 1 else slice(None)
        table, ends = levels[-1]
        steady = table[lanes.STEADY :]  # [3, node, side]
        known = _calm(steady, table, ends)
        unit = batch.units[places[place]]
        calm[own] = known
        power = 2 if unit.rotating else unit.metric
        volume = 0.5 * (unit.inner + unit.outer) if unit.metric else 1.0
        reach[own] = np.array([unit.inner**power, unit.outer**power]) / volume
        middle[own] = 0.5 * (unit.inner + unit.outer) if unit.rotating else 1.0
        facts[own, headline.CALM_LOWER : headline.CALM_MEAN + 1] = final[own] @ known.T
        facts[own, headline.CALM_SPEED] = _largest(final[own], steady, table)
    return Facts(facts, calm, reach, middle)


def _calm(steady: np.ndarray, table: np.ndarray, ends: np.ndarray) -> np.ndarray:
    """Steady stresses of both walls, and the mean, that one unit of each input makes, [3, 3]."""
    out = np.zeros((3, 3))
    for side in (0, 1):
        beside = steady[:, 1 if ends[lanes.HELD, side] else 0, side]
        wall = np.eye(3)[side] if ends[lanes.FLUX, side] else np.zeros(3)
        balance = ends[lanes.FLUX, side] * (beside - wall)
        balance[2] += ends[lanes.CELL, side]
        out[side] = balance * ends[lanes.RADIUS, side]
    out[2] = (steady * table[lanes.WEIGHT]).sum(axis=(1, 2))
    return out


def _largest(final: np.ndarray, steady: np.ndarray, table: np.ndarray) -> np.ndarray:
    """Largest |w| (n,) over the gap of the steady ends, by the parabola around the largest node."""
    half = steady.shape[1] - 1
    basis = np.concatenate([steady[:, :, 0], steady[:, half - 1 :: -1, 1]], axis=1)
    lever = np.concatenate([table[lanes.LEVER, :, 0], table[lanes.LEVER, half - 1 :: -1, 1]])
    step = np.concatenate([table[lanes.BEFORE, 1:, 0], table[lanes.BEFORE, :0:-1, 1]])
    profile = np.abs(final @ (basis * lever))
    top = profile.argmax(axis=1)
    row = np.arange(len(top))
    inner = np.clip(top, 1, profile.shape[1] - 2)
    here = profile[row, inner]
    low, high = step[inner - 1], step[inner]
    rise, fall = (here - profile[row, inner - 1]) / low, (here - profile[row, inner + 1]) / high
    slope = (rise * high - fall * low) / (low + high)
    bend = rise + fall
    inside = (top == inner) & (rise >= 0.0) & (fall >= 0.0) & (bend > 0.0)
    more = np.where(inside, slope**2 * (low + high) / (4.0 * np.where(bend > 0.0, bend, 1.0)), 0.0)
    return profile[row, top] + more


def _march(
    problem: Problem, tables: list, grid: np.ndarray, numbers: np.ndarray, pieces: np.ndarray, part_of: np.ndarray,
    poly: np.ndarray, wave: np.ndarray, jump: np.ndarray, before: np.ndarray, final: np.ndarray, waving: bool,
    infinite: np.ndarray, facts: Facts,
) -> np.ndarray:  # fmt: skip
    """Headline numbers [n, NUMBERS] of cases on grids of the same number of nodes."""
    n = len(grid)
    most = _most_rows(pieces)
    levels = []
    row_piece, row_offset = np.zeros((n, most), np.int64), np.zeros((n, most))
    count = np.zeros(n, np.int64)
    for level in range(LEVELS):
        table = np.stack([one[level][0] for one in tables])
        ends = np.stack([one[level][1] for one in tables])
        rows = np.empty((n, most, lanes.FIELDS))
        lanes.march(
            table, ends, grid, numbers, pieces, part_of, poly, wave, jump, before, final, 2**level, waving,
            rows, row_piece, row_offset, count,
        )  # fmt: skip
        levels.append(rows)
    out = np.empty((n, headline.NUMBERS))
    free = np.array([wall.kind != "moving" for wall in problem.walls])
    held = np.array([{"moving": 1, "shear_free": 0, "axis": -1}[wall.kind] for wall in problem.walls])
    headline.read(
        *levels, row_piece, row_offset, count, part_of[:, :, START].copy(), infinite, facts.ends, free, held,
        facts.calm, facts.reach, facts.middle, out,
    )  # fmt: skip
    return out


def _write(
    form: Form, batch: Batch, rows: np.ndarray, done: Done, first: int, out: Columns, names: set[str]
) -> np.ndarray:
    """Put the answers that meet the accuracy into ``out``; returns which do (n,)."""
    problem, geometry = form.problem, batch.geometry
    found = done.numbers
    met = np.isfinite(found[:, headline.MEAN_END])
    time, gap = batch.time[rows], geometry.gap[rows]
    stress = batch.viscosity[rows] / (1.0 if problem.rotating else gap)
    met &= _met(problem, found, done)
    codes, message, sure = verdicts(problem, _seen(problem, batch, rows, done))
    met &= sure
    to = first + rows[met]

    def put(name: str, value: np.ndarray) -> None:
        if name in names:
            out[name][to] = value[met]

    put("settling_time", found[:, headline.SETTLE] * time)
    put("settling_error", found[:, headline.SETTLE_ERROR] * time)
    put("settling_time_flow", found[:, headline.SETTLE_MEAN] * time)
    mean = gap if problem.rotating else np.ones_like(gap)
    peak, end = found[:, headline.MEAN_PEAK] * mean, found[:, headline.MEAN_END] * mean
    put("peak_mean_velocity", peak)
    put("final_mean_velocity", end)
    put("final_mean_velocity_error", found[:, headline.MEAN_END_ERROR] * mean)
    if geometry.section is not None:
        section = np.broadcast_to(geometry.section, batch.time.shape)[rows] * batch.count[rows]
        put("peak_flow_rate", peak * section)
        put("final_flow_rate", end * section)
    drop = batch.viscosity[rows] / gap**2
    put("peak_drop_per_length", found[:, headline.PUSH_PEAK] * drop)
    put("final_drop_per_length", found[:, headline.PUSH_END] * drop)
    for side, wall in enumerate(problem.walls):
        if wall.kind != "axis":
            _write_wall(form, batch, rows, done, side, wall.name, stress, time, put)
    out["status"][to], out["verdict"][to], out["message"][to] = SOLVED, codes[met], message[met]
    return met


def _seen(problem: Problem, batch: Batch, rows: np.ndarray, done: Done) -> Seen:
    """What the validity checks look at."""
    geometry, found = batch.geometry, done.numbers
    gap, time = geometry.gap[rows], batch.time[rows]
    scale = batch.viscosity[rows] / (1.0 if problem.rotating else gap**2)  # of the work per volume and time
    pushed = (np.broadcast_to(batch.drives[2].before, batch.time.shape) != 0.0) if problem.start == "steady" else False
    pressed = (found[:, headline.PUSH_PEAK] != 0.0) | np.broadcast_to(pushed, batch.time.shape)[rows]

    def known(size: np.ndarray | None) -> np.ndarray | None:
        return None if size is None else np.broadcast_to(size, batch.time.shape)[rows]

    return Seen(
        gap, geometry.inner[rows], geometry.outer[rows], known(geometry.length), known(geometry.section),
        batch.density[rows], batch.viscosity[rows] / batch.density[rows], time, pressed,
        found[:, headline.SPREAD], found[:, headline.RELATIVE],
        found[:, headline.TURN_LOWER : headline.TURN_UPPER + 1], found[:, headline.SPUN_UP] > 0.5,
        found[:, headline.WORK] * scale * time,
        found[:, headline.POWER] * scale, done.rise * time,
    )  # fmt: skip


def _write_wall(form, batch, rows, done, side, name, stress, time, put) -> None:
    problem, geometry = form.problem, batch.geometry
    found = done.numbers[:, headline.WALL + side * headline.WALL_FIELDS :]
    peak = found[:, headline.PEAK] * stress
    lever = geometry.radii[side][rows] if problem.rotating else np.ones_like(time)
    infinite = _infinite(problem, done.jump)[:, :, side]
    size = np.abs(done.jump[:, :, side]) * infinite
    largest = size.argmax(axis=1)
    row = np.arange(len(rows))
    unbounded = infinite.any(axis=1)
    coefficient = np.sqrt(batch.density[rows] * batch.viscosity[rows] / np.pi) * size[row, largest] * lever
    at = np.where(unbounded, done.start[row, largest], found[:, headline.PEAK_TIME])
    put(f"peak_stress_{name}", peak)
    put(f"peak_stress_error_{name}", found[:, headline.PEAK_ERROR] * stress)
    put(f"peak_time_{name}", at * time)
    put(f"final_stress_{name}", found[:, headline.END] * stress)
    put(f"final_stress_error_{name}", found[:, headline.END_ERROR] * stress)
    put(f"final_speed_{name}", found[:, headline.SPEED_END])
    put(f"unbounded_coefficient_{name}", np.where(unbounded, coefficient, np.nan))
    put(f"settling_time_stress_{name}", found[:, headline.SETTLE_WALL] * time)
    area = geometry.areas[side]
    if area is not None:
        load = np.broadcast_to(area, batch.time.shape)[rows] * batch.count[rows] * lever
        put(f"peak_torque_{name}" if problem.rotating else f"peak_force_{name}", peak * load)


HARDLY, FINAL_SHARE = 1e-6, 0.01  # as in ``trust.demand``


def _met(problem: Problem, found: np.ndarray, done: Done) -> np.ndarray:
    """Whether every number's error is within the accuracy (n,), as ``trust.demand`` asks of a single run."""
    accuracy = problem.accuracy
    met = np.ones(len(found), bool)

    def ask(error: np.ndarray, allowed: np.ndarray) -> None:
        nonlocal met
        with np.errstate(invalid="ignore"):
            met &= np.isnan(error) | (error <= allowed) | (error == 0.0)

    for time, error in ((headline.SETTLE, headline.SETTLE_ERROR), (headline.SETTLE_MEAN, headline.SETTLE_MEAN_ERROR)):
        ask(found[:, error], accuracy * found[:, time])
    walls = [found[:, headline.WALL + side * headline.WALL_FIELDS :] for side in (0, 1)]
    largest = np.fmax(walls[0][:, headline.LARGEST], walls[1][:, headline.LARGEST])
    for side, wall in enumerate(walls):
        if problem.walls[side].kind != "moving":
            continue
        peak = np.fmax(wall[:, headline.LARGEST], HARDLY * largest)
        ask(wall[:, headline.PEAK_ERROR], accuracy * peak)
        ask(wall[:, headline.SETTLE_WALL_ERROR], accuracy * wall[:, headline.SETTLE_WALL])
        final = np.abs(wall[:, headline.END])
        size = np.where(wall[:, headline.CALMED] > 0.5, np.fmax(final, FINAL_SHARE * peak), np.fmax(final, peak))
        ask(wall[:, headline.END_ERROR], accuracy * np.fmax(size, HARDLY * largest))
    moving = np.abs(found[:, headline.MEAN_PEAK])
    ask(found[:, headline.MEAN_PEAK_ERROR], accuracy * np.fmax(moving, HARDLY * found[:, headline.FASTEST]))
    return met


__all__ = ["FAILED", "solve", "takes"]
