"""One adaptive march on a base level, or the same steps halved on twice the cells."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from transient.gap.problem import LOWER, PRESSURE, UPPER, Inputs, Problem
from transient.gap.system import System, assemble, steady
from transient.march import kernel
from transient.march.coupled import equilibrium
from transient.march.links import links
from transient.march.plan import Features, Resolution

CHUNK_ROWS = 4096
PROFILE_BYTES = 16e6  # of the base level; longer runs keep every 2nd, 4th, ... profile
MOST_STEPS = 20_000_000


class SolveError(RuntimeError):
    """The march stopped; the message says when, where and the likely cause in one sentence."""


@dataclass(frozen=True, eq=False)
class Trace:
    """What the kernel recorded: ``piece``, ``offset`` (rows,), ``fields`` (rows, 11) and ``mark`` (rows,) as named
    in ``kernel``; ``profile_row`` (k,), ``profiles`` (k, 3, n) velocity, rate, travel of the unknowns; ``solves`` done;
    ``final`` (n,) velocities at the end, ``final_walls`` (3, 2) and friction's ``final_mode`` (2,) there."""

    system: System
    piece: np.ndarray
    offset: np.ndarray
    fields: np.ndarray
    mark: np.ndarray
    profile_row: np.ndarray
    profiles: np.ndarray
    profile_every: int
    solves: int
    final: np.ndarray
    final_walls: np.ndarray
    final_mode: np.ndarray

    @property
    def steps(self) -> int:
        """Steps recorded."""
        return len(self.piece) - int(self.piece[-1] - self.piece[0]) - 1


@dataclass(frozen=True, eq=False)
class Plan:
    """Ends of prescribed steps as offsets (S,), which of them end a piece, and how many make one recorded row."""

    offset: np.ndarray
    lands: np.ndarray
    record_every: int


NO_PLAN = Plan(np.empty(0), np.empty(0, bool), 1)


@dataclass(frozen=True, eq=False)
class State:
    """Velocities and their rates at the unknowns (n,), just before the first piece; of walls with bodies their
    ``speed`` and ``place`` (2,)."""

    velocity: np.ndarray
    rates: np.ndarray
    speed: np.ndarray = field(default_factory=lambda: np.zeros(2))
    place: np.ndarray = field(default_factory=lambda: np.zeros(2))
    gradient: float = 0.0


def initial_state(problem: Problem, system: System, inputs: Inputs) -> State:
    """Fluid at rest, or in the steady state of the inputs' values before t = 0; bodies as they are just after.

    Raises ``SolveError`` where there is no such state.
    """
    nothing = np.zeros(system.unknowns)
    bodies = [wall.body for wall in problem.walls]
    given = np.array([0.0 if b is None or b.initial_speed is None else b.initial_speed for b in bodies])
    place = np.array([0.0 if b is None else b.initial_displacement for b in bodies])
    if problem.start == "rest":
        return State(nothing + _displaced(problem, system, given), nothing, _shared(problem, system, given), place)
    if not problem.closed:
        return State(steady(system, inputs.before[:2], float(inputs.before[PRESSURE])), nothing)
    held = {end: float(given[end]) for end, b in enumerate(bodies) if b is not None and b.initial_speed is not None}
    found = equilibrium(problem, system, inputs.before, held)
    if found is None:
        raise SolveError("the start is to be steady, but the body has no equilibrium speed under its load before t = 0")
    free = [b is not None and end not in held and b.stiffness > 0.0 for end, b in enumerate(bodies)]
    return State(found.velocity, nothing, found.speeds, np.where(free, found.place, place), found.gradient)


def _shared(problem: Problem, system: System, speed: np.ndarray) -> np.ndarray:
    """Speeds (2,) at which bodies that start at ``speed`` have, with the wall's half cell, their own momentum only."""
    out = speed.copy()
    for end, wall in enumerate(problem.walls):
        if wall.body is not None and speed[end]:
            half = wall.body.grip / system.grid.stress_radius[end] * problem.density * system.end_volume[end]
            out[end] *= wall.body.mass / (wall.body.mass + half)
    return out


def _displaced(problem: Problem, system: System, speed: np.ndarray) -> float:
    """Velocity of all liquid at once where bodies that start at ``speed`` displace it through their own gap."""
    if problem.flow is None or not problem.section:
        return 0.0
    swept = sum(
        wall.body.displaced / (problem.section * problem.count) * speed[end]
        for end, wall in enumerate(problem.walls)
        if wall.body is not None
    )
    return -float(swept / system.grid.mean_weight.sum())


def march(
    problem: Problem,
    inputs: Inputs,
    until: float,
    found: Features,
    resolution: Resolution,
    *,
    plan: Plan = NO_PLAN,
    profile_every: int = 1,
    start: State | None = None,
) -> Trace:
    """March one problem over [0, until) on ``resolution``; with a ``plan`` by its steps, else adaptively.

    Raises ``SolveError`` where a value stops being finite or the run asks for more steps than can be kept.
    """
    system = assemble(problem, resolution.cells, resolution.layers)
    state = start if start is not None else initial_state(problem, system, inputs)
    run = _Run(problem, system, inputs, until, found, resolution, plan, profile_every, state)
    while run.status[0] != kernel.DONE:
        run.advance()
        if run.status[0] in (kernel.BROKEN, kernel.STALLED, kernel.BEYOND):
            raise SolveError(run.complaint())
        run.collect()
    return run.trace()


class _Run:
    """The kernel's arrays for a batch of one, and the records taken from it chunk by chunk."""

    def __init__(self, problem, system, inputs, until, found, resolution, plan, profile_every, start):
        self.problem, self.system, self.inputs, self.until, self.plan = problem, system, inputs, until, plan
        self.profile_every = profile_every
        n = system.unknowns
        self.jump = np.array([inputs.row(row).jumps(0) for row in (LOWER, UPPER, PRESSURE)]).T.copy()
        self.velocity = start.velocity.copy()
        self.rates = start.rates.copy()
        self.travel = np.zeros(n)
        self.wall = np.zeros((3, 2, 1))
        self.wall[0, :, 0], self.wall[2, :, 0] = start.speed, start.place
        self.gradient = np.zeros(1)
        self.mode = np.zeros((2, 1), np.int64)
        self.links = links(problem, system)
        self.cursor = np.zeros((5, 1), np.int64)
        self.state = np.zeros((4, 1))
        self.state[1] = resolution.first_step[0]
        self.status = np.zeros(1, np.int64)
        weights = system.grid.mean_weight
        self.weight = weights[system.first : system.first + n]
        lever = np.array([problem.inner, problem.outer]) if problem.rotating else np.ones(2)
        speed = found.speed / (lever.max() if problem.rotating else 1.0)
        flux_scale = found.stress * system.grid.stress_radius
        pieces = len(inputs.starts)
        self.gap = (
            system.storage[:, None], system.conductance[:, None], system.volume[:, None],
            system.end_conductance[:, None].copy(), np.ascontiguousarray(self.weight)[:, None], self.links.end_weight,
        )  # fmt: skip
        coupling = self.links
        self.coupling = (coupling.link, coupling.flow, coupling.curve_speed, coupling.curve_value)
        self.fixed = (
            *self.gap, *self.coupling, np.array([resolution.event_step]),
            inputs.starts, np.zeros(1, np.int64), np.full(1, pieces, np.int64), np.array([until]),
            inputs.poly, inputs.coeff, inputs.rate, self.jump,
            resolution.first_step, resolution.longest_step, resolution.calm_after,
            resolution.swift_step, resolution.swift_until,
            np.array([resolution.tolerance]), np.array([speed]), flux_scale[:, None].copy(),
            plan.offset, plan.lands, plan.record_every,
        )  # fmt: skip
        rows = CHUNK_ROWS if len(plan.offset) == 0 else min(CHUNK_ROWS, len(plan.offset) + 2 * pieces + 8)
        self.row_piece = np.empty((rows, 1), np.int64)
        self.row_offset = np.empty((rows, 1))
        self.rows = np.empty((rows, 1, kernel.FIELDS))
        self.row_mark = np.zeros((rows, 1), np.int64)
        self.profile_row = np.empty((rows, 1), np.int64)
        self.profiles = np.empty((rows, 1, 3, n))
        self.kept: list[tuple[np.ndarray, ...]] = []
        self.solves = 0
        self._first_row()

    def _first_row(self) -> None:
        """The row at t = 0+: the state as the inputs' jumps leave it."""
        self._enter()
        self.row_piece[0], self.row_offset[0] = 0, 0.0
        u, f = self.velocity, self.rates
        row = self.rows[0, 0]
        row[kernel.FIRST], row[kernel.LAST] = u[0], u[-1]
        row[kernel.MEAN], row[kernel.MEAN_RATE] = self.weight @ u, self.weight @ f
        row[kernel.WALLS : kernel.DROP] = self.wall.ravel()
        row[kernel.DROP] = self.gradient[0]
        self.profile_row[0] = 0
        self.profiles[0, 0] = u, f, self.travel
        self.cursor[2] = self.cursor[3] = 1

    def _enter(self) -> None:
        """Rates, wall motion and pressure at t = 0+."""
        system, inputs = self.system, self.inputs
        rows = [inputs.row(row) for row in (LOWER, UPPER, PRESSURE)]
        start = np.zeros(1, int), np.zeros(1)
        value, slope = (np.array([row.at(*start, order) for row in rows]) for order in (0, 1))
        if self.problem.closed:
            kernel.enter(
                *self.gap, *self.coupling, self.jump[:1, PRESSURE].copy(), value, slope,
                self.velocity[:, None], self.rates[:, None], self.wall, self.gradient, self.mode,
            )  # fmt: skip
            return
        self.rates += system.volume * self.jump[0, PRESSURE] / system.storage
        self.rates[0] += system.end_conductance[0] * self.jump[0, LOWER] / system.storage[0]
        self.rates[-1] += system.end_conductance[1] * self.jump[0, UPPER] / system.storage[-1]
        self.wall[0, :], self.wall[1, :] = value[:2], slope[:2]
        self.gradient[:] = value[2]

    def advance(self) -> None:
        self.status[0] = kernel.RUNNING
        march = kernel.march_closed if self.problem.closed else kernel.march_open
        self.solves += march(
            *self.fixed, self.profile_every,
            self.velocity[:, None], self.rates[:, None], self.travel[:, None], self.wall, self.gradient, self.mode,
            self.cursor, self.state,
            self.row_piece, self.row_offset, self.rows, self.row_mark, self.profile_row, self.profiles, self.status,
        )  # fmt: skip

    def collect(self) -> None:
        """Move the records out; thin the profiles where they grow too many."""
        rows, profiles = int(self.cursor[2, 0]), int(self.cursor[3, 0])
        base = int(self.cursor[4, 0])
        self.kept.append(
            (
                self.row_piece[:rows, 0].copy(),
                self.row_offset[:rows, 0].copy(),
                self.rows[:rows, 0].copy(),
                self.row_mark[:rows, 0].copy(),
                self.profile_row[:profiles, 0] + base,
                self.profiles[:profiles, 0].copy(),
            )
        )
        self.cursor[4] += rows
        self.cursor[2] = self.cursor[3] = 0
        if base + rows > MOST_STEPS:
            raise SolveError(
                f"more than {MOST_STEPS:.0e} steps are needed and the run is at t = {self.time():.4g} s of "
                f"{self.until:.4g} s; shorten the run or ask for a lower accuracy"
            )
        if len(self.plan.offset) == 0:
            self._thin()

    def _thin(self) -> None:
        while sum(part[5].nbytes for part in self.kept) > PROFILE_BYTES:
            self.profile_every *= 2
            for i, part in enumerate(self.kept):
                keep = part[4] % self.profile_every == 0
                self.kept[i] = (*part[:4], part[4][keep], part[5][keep])

    def time(self) -> float:
        return float(self.inputs.starts[self.cursor[0, 0]] + self.state[3, 0] + self.state[0, 0])

    def complaint(self) -> str:
        if self.status[0] == kernel.BEYOND:
            return (
                f"at t = {self.time():.6g} s a body's speed leaves its force-speed curve, which refuses speeds beyond "
                "its ends; extend the curve or let it hold its end values"
            )
        what = (
            "a velocity is no longer a finite number"
            if self.status[0] == kernel.BROKEN
            else "the step has shrunk to nothing"
        )
        bad = np.flatnonzero(~np.isfinite(self.velocity))
        where = self.system.grid.radius[self.system.first + (bad[0] if len(bad) else 0)]
        return (
            f"the march stopped at t = {self.time():.6g} s near r = {where:.4g} m: {what}; "
            "likely cause: inputs so large or so small that they leave the range of numbers"
        )

    def trace(self) -> Trace:
        parts = [np.concatenate(column) for column in zip(*self.kept, strict=True)]
        final = self.velocity, self.wall[:, :, 0], self.mode[:, 0]
        return Trace(self.system, *parts, self.profile_every, self.solves, *final)


def halved(trace: Trace, times: int = 1) -> Plan:
    """The steps of ``trace`` (recorded at every step), each cut into 2^times equal parts."""
    same = trace.piece[1:] == trace.piece[:-1]
    low, high = trace.offset[:-1][same], trace.offset[1:][same]
    parts = 2**times
    share = np.arange(1, parts + 1) / parts
    offset = low[:, None] + (high - low)[:, None] * share
    offset[:, -1] = high
    lands = np.zeros(offset.shape, bool)
    last = np.flatnonzero(np.append(~same, True))  # rows that end a piece
    position = np.cumsum(same) - 1  # step that ends in row i + 1
    lands[position[last - 1], -1] = True
    return Plan(offset.ravel(), lands.ravel(), parts)


def finer(resolution: Resolution, times: int = 1) -> Resolution:
    """The same layers with 2^times the cells."""
    return replace(resolution, cells=resolution.cells * 2**times)
