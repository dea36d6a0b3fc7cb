"""The rows of a sweep as numbers: sizes, properties and drives in SI, and in the units of the lanes."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np

from transient.gap.problem import Problem
from transient.march import lanes_layout as layout
from transient.march.lanes_grid import grid_table, unit_problem
from transient.march.lanes_round import round_tables
from transient.march.regime import slowest_decay
from transient.sweep.keys import Values
from transient.sweep.lanes_bodies import LIGHTEST, Bodies, Level, loaded
from transient.sweep.lanes_bodies import slowest as slowest_of
from transient.sweep.lanes_drives import DriveRows
from transient.sweep.lanes_form import Form, Geometry

LEVELS = 3


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
    inner: np.ndarray  # inner radius as a share of the gap
    units: list[Problem]  # unit gaps
    unit_of: np.ndarray  # the rows' places in ``units``
    alike: bool  # all in one unit gap but for their inner radii
    scale: np.ndarray  # [n, 3], lane units per SI unit of each input
    bodies: Bodies | None
    flowing: bool  # the third input is the mean velocity, and the push a result


def batch_of(form: Form, values: Values, rows: int) -> tuple[Batch, np.ndarray]:
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
    alike = form.radii_vary and not any(wall.slip_length for wall in problem.walls)
    units, unit_of = ([unit_problem(problem)], np.zeros(rows, int)) if alike else _units(problem, inner, gap)
    count = form.number("gap.count", values, rows)
    count = np.full(rows, float(problem.count)) if count is None else count
    bodies = _bodies(form, values, geometry, count, rows)
    scale = np.ones((rows, 3))
    if problem.flow is None:
        scale[:, 2] = push
    if bodies is not None:
        scale[:, bodies.side] = bodies.scale
        bad |= ~(bodies.inertia >= LIGHTEST) | ~np.isfinite(bodies.inertia * bodies.drag * bodies.scale)
        safe = np.where(bad, 1.0, bodies.inertia), np.where(bad, 0.0, bodies.drag)
        bodies = replace(bodies, inertia=safe[0], drag=safe[1])
        slowest = slowest_of(units[0], np.where(inner > 0.0, inner, 1.0), alike, bodies)
    elif alike:
        slowest = _slowest_round(units[0], inner)
    else:
        slowest = np.array([_slowest(*key_of(unit)) for unit in units])[unit_of]
    within = form.number("run.settle_within", values, rows)
    within = np.full(rows, problem.settle_within) if within is None else within
    until = form.number("run.duration", values, rows)
    if until is None:
        until = _automatic(problem, drives, slowest * time, within)
    final = np.stack([np.broadcast_to(drive.end, (rows,)) for drive in drives], axis=1)
    before = np.stack([np.broadcast_to(drive.before, (rows,)) for drive in drives], axis=1)
    if problem.start == "rest":
        before = np.zeros((rows, 3))
    final = final * scale
    bad |= ~np.isfinite(until) | ~(until > 0.0) | ~np.isfinite(final).all(axis=1) | ~np.isfinite(slowest)
    bad |= ~np.isfinite(time) | ~(time > 0.0)
    batch = Batch(
        geometry, density, viscosity, time, np.where(bad, 1.0, until), within,
        count, drives, before, final, slowest, inner, units, unit_of, alike, scale, bodies,
        problem.flow is not None,
    )  # fmt: skip
    return batch, ~bad


def _bodies(form: Form, values: Values, geometry: Geometry, count: np.ndarray, rows: int) -> Bodies | None:
    with np.errstate(all="ignore"):  # rows that are no case
        return form.bodies(values, geometry, count, rows)


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


def key_of(unit: Problem) -> tuple:
    """What a unit gap's grids and slowest decay depend on."""
    walls = ((wall.kind, wall.slip_length) for wall in unit.walls)
    return _Held(unit), unit.flow is None, unit.metric, unit.inner, *walls


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


RADII = np.geomspace(1e-3, 1e5, 600)  # inner radii, as shares of the gap, between which decays are interpolated


def _slowest_round(unit: Problem, inner: np.ndarray) -> np.ndarray:
    """Slowest time constants (n,) of annuli of any inner radius; nan beyond the radii looked at."""
    known = _decays(*key_of(replace(unit, inner=0.0, outer=0.0)))
    return np.interp(np.log(inner), np.log(RADII), known, left=np.nan, right=np.nan)


@lru_cache(maxsize=16)
def _decays(unit: _Held, *key: object) -> np.ndarray:
    own = unit.problem
    return np.array([slowest_decay(replace(own, inner=float(r), outer=float(r) + 1.0)) for r in RADII])


@lru_cache(maxsize=4096)
def tables(cells: int, layers: tuple[float, float], unit: _Held, *key: object) -> list[tuple[np.ndarray, np.ndarray]]:
    """A unit gap's (nodes, ends) on every level, as in ``lanes_grid``."""
    return [grid_table(unit.problem, cells * 2**level, layers) for level in range(LEVELS)]


@dataclass(frozen=True, eq=False)
class Grids:
    """Of each level (nodes [G, NODE_FIELDS, k, 2], ends [G, END_FIELDS, 2]), and the rows' places among the G, (n,)."""

    levels: list[Level]
    of: np.ndarray
    held: Level  # the finest level with every wall's speed given, see ``held_of``
    held_of: np.ndarray


def grids_of(batch: Batch, rows: np.ndarray, cells: int, layers: tuple[float, float]) -> Grids:
    """The grids of some rows; ``cells`` those of the base level."""
    levels, of = _held_grids(batch, rows, cells, layers)
    if batch.flowing:
        return Grids([_flowing(level) for level in levels], of, levels[-1], of)
    if batch.bodies is None:
        return Grids(levels, of, levels[-1], of)
    bodies = batch.bodies.taken(rows)
    return Grids([loaded(level, of, bodies) for level in levels], np.arange(len(rows)), levels[-1], of)


def _flowing(level: Level) -> Level:
    """A level whose third input is the mean velocity: its steady states per unit of that instead of the push."""
    table = level[0].copy()
    steady = table[:, layout.STEADY :]
    mean = (steady * table[:, layout.WEIGHT, None]).sum(axis=(2, 3))  # [G, 3]
    steady[:, 2] /= mean[:, 2, None, None]
    for wall in (0, 1):
        steady[:, wall] -= mean[:, wall, None, None] * steady[:, 2]
    return table, level[1]


def _held_grids(
    batch: Batch, rows: np.ndarray, cells: int, layers: tuple[float, float]
) -> tuple[list[Level], np.ndarray]:
    """The same with every wall's speed given."""
    if batch.alike:
        levels = [round_tables(batch.units[0], batch.inner[rows], cells * 2**level, layers) for level in range(LEVELS)]
        return levels, np.arange(len(rows))
    if len(batch.units) == 1:
        found = tables(cells, layers, *key_of(batch.units[0]))
        return [(table[None], ends[None]) for table, ends in found], np.zeros(len(rows), int)
    places, of = np.unique(batch.unit_of[rows], return_inverse=True)
    found = [tables(cells, layers, *key_of(batch.units[i])) for i in places]
    stacked = [tuple(np.stack([one[level][part] for one in found]) for part in (0, 1)) for level in range(LEVELS)]
    return stacked, of  # type: ignore[return-value]
