"""One problem on a ladder of levels (cells and steps doubled each time), and what they extrapolate to."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np

from transient.gap.problem import PRESSURE, Inputs, Problem
from transient.gap.system import System, steady
from transient.march import kernel
from transient.march.coupled import dense, periodic_start, settled_state
from transient.march.events import divided, eventful, resampled
from transient.march.march import NO_PLAN, State, Trace, finer, halved, initial_state, march
from transient.march.plan import Features, Resolution, features, on_one_grid, resolve, tightened
from transient.march.readings import before_start, extrapolate, history, steady_stress, with_rates, without_first_steps
from transient.march.regime import (
    Outlook,
    deviation_breaks,
    deviation_inputs,
    periodic_inputs,
    periodic_state,
    rates_of,
)
from transient.result.history import History

EVENT_LEVELS = 3


@dataclass(frozen=True, eq=False)
class Histories:
    """Histories that belong together: the flow, its deviation from what it ends in (or None), and one period of
    that regime where it is periodic."""

    flow: History
    deviation: History | None
    orbit: History | None
    steady_velocity: np.ndarray | None
    steady_mean: float
    steady_stress: np.ndarray
    steady_speeds: np.ndarray = field(default_factory=lambda: np.zeros(2))
    steady_gradient: float = 0.0


@dataclass(frozen=True, eq=False)
class Ladder:
    """``best`` the extrapolation of the two finest levels, ``others`` what its rival is made of; cells and steps of
    the finest level, solves of all."""

    best: Histories
    others: tuple[Histories, ...]
    inputs: Inputs
    speed_before: np.ndarray
    layers: tuple[float, float]
    cells: int
    steps: int
    solves: int

    @cached_property
    def next_best(self) -> Histories:
        """What the best is compared with where there is no series: the extrapolation before it, or a single level."""
        return _rated(self.others[0]) if len(self.others) == 1 else _mix(*self.others)


class _Climb:
    """Marches of one kind (flow, period, deviation) level by level: the first adaptive, later ones by its steps."""

    found: Features
    resolution: Resolution

    def __init__(self, problem: Problem, inputs: Inputs, until: float, first: np.ndarray | None = None):
        self.problem, self.inputs, self.until, self.first = problem, inputs, until, first
        self.base: Trace | None = None
        self.steps = self.solves = 0

    def level(self, number: int, start: State | None = None) -> Trace:
        """The trace of a level on the base level's rows."""
        plan, every = NO_PLAN, 1
        if number:
            assert self.base is not None
            plan, every = halved(self.base, number), self.base.profile_every
        trace = march(
            self.problem, self.inputs, self.until, self.found, finer(self.resolution, number),
            plan=plan, profile_every=every, start=start,
        )  # fmt: skip
        if number == 0:
            self.base = trace
        self.steps = trace.steps * plan.record_every
        self.solves += trace.solves
        return trace

def climb(problem: Problem, ahead: Outlook, accuracy: float, refine: float, levels: int) -> Ladder:
    """Solve on ``levels`` (2 or 3) levels.  Raises ``SolveError``."""
    if eventful(problem):
        return _climb_by_events(problem, ahead, accuracy, refine)
    inputs = problem.inputs(ahead.until)
    runs = [_Climb(problem, inputs, ahead.until)]
    if ahead.kind == "periodic":
        assert ahead.period is not None
        once = periodic_inputs(ahead)
        away = deviation_inputs(problem, ahead, ahead.until)
        runs += [
            _Climb(problem, once, ahead.period),
            _Climb(problem, once, ahead.period),
            _Climb(problem, away, ahead.until, deviation_breaks(inputs, once, ahead.period)),
        ]
    _prepare(problem, runs, ahead, accuracy, refine)
    flow = runs[0]
    answers = []
    for number in range(levels):
        trace = flow.level(number)
        before = before_start(problem, trace.system, inputs, initial_state(problem, trace.system, inputs))
        main = history(problem, inputs, trace, before, 2**number)
        if ahead.kind == "periodic":
            answers.append(_periodic_answer(problem, runs, number, trace, main))
        elif ahead.kind == "steady":
            answers.append(_steady_answer(problem, ahead, trace, main, 2**number))
        else:
            answers.append(Histories(main, None, None, None, 0.0, np.zeros(2)))
    best = _mix(answers[-2], answers[-1])
    others = (answers[-1],) if levels == 2 else (answers[-3], answers[-2])
    cells = flow.resolution.cells * 2 ** (levels - 1)
    solves = sum(run.solves for run in runs)
    return Ladder(best, others, inputs, before.speed, flow.resolution.layers, cells, flow.steps, solves)


def _climb_by_events(problem: Problem, ahead: Outlook, accuracy: float, refine: float) -> Ladder:
    """Levels that each find their own stops and breakings-away: compared, but not extrapolated."""
    inputs = problem.inputs(ahead.until)
    base = _Climb(problem, inputs, ahead.until)
    _prepare(problem, [base], ahead, accuracy, refine)
    answers = []
    for number in range(EVENT_LEVELS):
        run = _Climb(problem, inputs, ahead.until)
        run.found = base.found
        run.resolution = tightened(base.resolution, number)
        trace = run.level(0)
        base.solves += trace.solves
        own, parted = divided(inputs, trace)
        before = before_start(problem, trace.system, inputs, initial_state(problem, trace.system, inputs))
        main = history(problem, own, parted, before, 2**number)
        if ahead.kind == "steady":
            answers.append(_steady_answer(problem, ahead, parted, main, 2**number))
        else:
            answers.append(Histories(main, None, None, None, 0.0, np.zeros(2)))
    best, other = _rated(answers[-1]), _rated(answers[-2])
    again = resampled(other.flow, best.flow)
    away = None
    if best.deviation is not None and other.deviation is not None:
        away = resampled(other.deviation, best.deviation)
    other = replace(other, flow=again, deviation=away)
    layers, cells = base.resolution.layers, run.resolution.cells
    return Ladder(best, (other,), own, before.speed, layers, cells, run.steps, base.solves)


def _prepare(problem: Problem, runs: list[_Climb], ahead: Outlook, accuracy: float, refine: float) -> None:
    """Features and resolutions of all marches of a problem: one grid, one measure of what is large."""
    least = 0.1 * min(problem.settle_within, 0.001, accuracy)
    found = [features(problem, run.inputs, run.until, run.first) for run in runs]
    stress = np.max([f.stress for f in found], axis=0)
    speed = max(f.speed for f in found)
    resolutions = []
    for run, own in zip(runs, found, strict=True):
        run.found = replace(own, stress=own.stress if run is runs[0] else stress, speed=speed)
        # with a periodic end it is the last march, the deviation's, that settling is read from
        slowest = ahead.slowest if run is runs[-1] else np.inf
        resolutions.append(resolve(problem, run.inputs, run.found, accuracy, slowest, least, refine))
    for run, resolution in zip(runs, on_one_grid(resolutions), strict=True):
        run.resolution = resolution


def _rated(answer: Histories) -> Histories:
    """A level as it is, its stresses with rates."""
    away = None if answer.deviation is None else with_rates(answer.deviation)
    return replace(answer, flow=with_rates(answer.flow), deviation=away)


def _mix(coarse: Histories, fine: Histories) -> Histories:
    def pair(name: str) -> History | None:
        low, high = getattr(coarse, name), getattr(fine, name)
        return None if low is None else extrapolate(low, high)

    flow = pair("flow")
    assert flow is not None
    # a steady end is the same on every grid, but for round-off
    away = pair("deviation") if fine.steady_velocity is None else _less_steady(flow, fine)
    return replace(fine, flow=flow, deviation=away, orbit=pair("orbit"))


def _less_steady(flow: History, end: Histories) -> History:
    """A flow less the steady state that it ends in."""
    return replace(
        flow, stress=flow.stress - end.steady_stress, mean=flow.mean - end.steady_mean,
        profile=flow.profile - end.steady_velocity, speed=flow.speed - end.steady_speeds,
        gradient=flow.gradient - end.steady_gradient,
    )  # fmt: skip


def _steady_answer(problem: Problem, ahead: Outlook, trace: Trace, main: History, every: int) -> Histories:
    """The deviation from a steady end: the flow minus a state that is exact on this grid."""
    assert ahead.drives is not None
    system = trace.system
    values = np.array([float(drive.pieces(1.0).value(np.zeros(1))[0]) for drive in ahead.drives])
    if problem.closed:
        found = settled_state(problem, system, values, trace.final_mode)
        if found is None:
            return Histories(main, None, None, None, 0.0, np.zeros(2))
        unknown, speeds, gradient = found.velocity, found.speeds, found.gradient
    else:
        unknown, speeds, gradient = steady(system, values[:2], values[PRESSURE]), values[:2], float(values[PRESSURE])
    velocity = system.nodes(unknown, speeds)
    mean = float(system.grid.mean_weight @ velocity)
    stress = steady_stress(system, unknown, speeds, gradient)
    shown = velocity[::every]
    answer = Histories(main, None, None, shown, mean, stress, speeds, gradient)
    return replace(answer, deviation=_less_steady(main, answer))


def _periodic_answer(problem: Problem, runs: list[_Climb], number: int, trace: Trace, main: History) -> Histories:
    """The deviation from a periodic end, and one period of that end.

    One period out of rest gives the periodic state (the rest is the gap's own modes); the difference to it is then
    marched by itself: without forcing once the drive is periodic, so its cost does not grow with the periods.
    """
    _, first, around, away = runs
    system, every = trace.system, 2**number
    rest = _at_rest(problem, system, first.inputs)
    after = first.level(number, State(rest, rates_of(system, rest, first.inputs)))
    state = _periodic_state(problem, system, rest, after, first.until, around.inputs)
    orbit = around.level(number, state)
    begin = trace.profiles[0, 0] - orbit.profiles[0, 0]
    walls = kernel.WALLS
    moved = trace.fields[0, walls : walls + 6].reshape(3, 2) - orbit.fields[0, walls : walls + 6].reshape(3, 2)
    gone = away.level(number, State(begin, rates_of(system, begin, away.inputs), moved[0], moved[2]))
    apart = history(problem, away.inputs, gone, None, every)
    # where the flow begins with an infinite stress, so does its deviation
    apart.stress[0, np.isnan(main.stress[0])] = np.nan
    if problem.flow is not None and np.isnan(main.gradient[0]):
        apart.gradient[0] = np.nan
        apart = without_first_steps(apart, problem.accuracy)
    return Histories(
        main,
        apart,
        history(problem, around.inputs, orbit, None, every),
        None,
        0.0,
        np.zeros(2),
    )


def _at_rest(problem: Problem, system: System, inputs: Inputs) -> np.ndarray:
    """Velocities (n,) before the first of some periods: none, or where the flow is prescribed the same everywhere."""
    if problem.flow is None:
        return np.zeros(system.unknowns)
    whole = dense(problem, system)
    missing = inputs.before[PRESSURE] - whole.row_wall @ inputs.before[:2]
    return np.full(system.unknowns, missing / whole.row[: system.unknowns].sum())


def _periodic_state(
    problem: Problem, system: System, rest: np.ndarray, after: Trace, period: float, once: Inputs
) -> State:
    """The state with which the periodic regime begins, from what one period makes out of ``rest`` (n,)."""
    if not problem.closed:
        velocity = periodic_state(system, after.final, period)
        return State(velocity, rates_of(system, velocity, once))
    whole = dense(problem, system)
    parts = [after.final, *(after.final_walls[[0, 2], end] for end in whole.ends)]
    begin = np.concatenate([rest, np.zeros(2 * len(whole.ends))])
    state = periodic_start(whole, begin, np.concatenate(parts), period)
    speed, place = np.zeros(2), np.zeros(2)
    for end in whole.ends:
        speed[end], place[end] = state[whole.speed(end) : whole.speed(end) + 2]
    velocity = state[: system.unknowns]
    return State(velocity, np.zeros_like(velocity), speed, place)
