"""Do momentum and energy close, and do the stored stresses belong to the stored profiles?

Everything here starts from stored rows and profiles and shares nothing with the solver's own balance: profiles are
integrated as cubics through their nodes, histories as cubics through values and rates over the square root of the
time since the last break (stresses behave like powers of that root, so the integrand is smooth even where the stress
is infinite).  Functions on plain arrays; the wrappers at the end take a case.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from weakref import WeakKeyDictionary

import numpy as np

from transient.gap.problem import LOWER, UPPER, Problem
from transient.result.history import History, between
from transient.trust.check import Check, judge
from transient.trust.nodes import (
    ROUNDING,
    STENCIL,
    distinct,
    forms,
    quadratic,
    resolution_time,
    wall_flux,
    wall_values_before,
)
from transient.trust.quasi_steady import lever, quasi_steady_stress, section_measure, steady_drop

SOURCE = "the accuracy asked for"
FINER = 4  # parts into which the intervals between nodes are cut for an integral over the gap
HARDLY_FLOWS = 1e-3  # of the largest speed: a mean velocity below it is judged beside it


def increments(piece: np.ndarray, offset: np.ndarray, value: np.ndarray, rate: np.ndarray) -> np.ndarray:
    """Integral of a history over each interval between rows, (n - 1,); ``value``, ``rate`` (n,) and its time ``rate``.

    Rows of different pieces share their time: 0.  A NaN at a piece's start is an infinite value ~ 1/sqrt(time).
    """
    s = np.sqrt(offset)
    f = 2.0 * s * value
    with np.errstate(invalid="ignore"):
        df = 2.0 * value + np.where(offset > 0.0, 4.0 * offset * rate, 0.0)
    h = np.diff(s)
    inside = 0.5 * h * (f[:-1] + f[1:]) + h * h / 12.0 * (df[:-1] - df[1:])
    after = h * f[1:] - 0.5 * h * h * df[1:]
    out = np.where(np.isnan(value[:-1]), after, inside)
    return np.where(piece[1:] == piece[:-1], out, 0.0)


def running(parts: np.ndarray, rows: np.ndarray) -> np.ndarray:
    """Running integral at ``rows`` (k,) from increments between all rows."""
    return np.concatenate([[0.0], np.cumsum(parts)])[rows]


def after_infinite(piece: np.ndarray, offset: np.ndarray, stress: np.ndarray) -> np.ndarray:
    """Whether each row's piece begins with an infinite stress, wall by wall, (n, 2)."""
    begins = offset == 0.0
    return np.stack([np.isin(piece, piece[begins & np.isnan(wall)]) for wall in stress.T], axis=1)


@dataclass(frozen=True)
class Closure:
    """``residual`` and ``resolution`` as shares of the gross amount that went in and out over the run.

    ``resolution`` is how well the kept rows and profiles allow to judge.
    """

    residual: float
    resolution: float


def young_rows(problem: Problem, history: History) -> np.ndarray:
    """Rows (n,) so soon after an infinite stress that the nodes cannot follow its layer."""
    position = history.position[distinct(history.position)]
    wait = resolution_time(position, problem.viscosity / problem.density, problem.accuracy)
    infinite = after_infinite(history.piece, history.offset, history.stress)
    return (infinite & (history.offset[:, None] < wait)).any(axis=1) & (history.offset > 0.0)


def judged(problem: Problem, history: History) -> History:
    """The rows and profiles that balances are drawn up from, worked out once for all of them: see ``_judged``."""
    if history not in _KNOWN:
        _KNOWN[history] = (problem, _judged(problem, history))
    owner, found = _KNOWN[history]
    return found if owner is problem else _judged(problem, history)


_KNOWN: WeakKeyDictionary[History, tuple[Problem, History]] = WeakKeyDictionary()


def _judged(problem: Problem, history: History) -> History:
    """The rows and profiles that balances are drawn up from.

    Rows so soon after an infinite stress that the nodes cannot follow its layer are left out: what went in until then
    follows from the law ~ 1/sqrt(time) of the rows after them.  Nodes closer than round-off are left out too.
    """
    nodes = distinct(history.position)
    position = history.position[nodes]
    young = young_rows(problem, history)
    row, at = np.unique(history.profile_row, return_index=True)
    at = at[~young[row]]
    number = np.cumsum(~young) - 1
    columns = ("time", "piece", "offset", "stress", "stress_rate", "speed", "acceleration", "mean", "mean_rate")
    rows = {name: getattr(history, name)[~young] for name in (*columns, "gradient", "gradient_rate", "place")}
    profiles = {name: getattr(history, name)[at][:, nodes] for name in ("profile", "profile_rate", "travel")}
    profile_row = number[history.profile_row[at]]
    unknown = np.isnan(rows["stress"][profile_row])
    profiles["profile"] = wall_values_before(position, profiles["profile"], unknown)
    return History(**rows, **profiles, position=position, profile_row=profile_row)


def _across(history: History, profile: np.ndarray, metric: int) -> np.ndarray:
    """Integral over the gap (k,) of profiles (k, N) times r^m: as cubics between values added along the node's number,
    in which a profile on graded nodes is smooth; a thin layer is too bent for cubics through the nodes alone."""
    plain = np.zeros(len(profile), bool)
    position = between(history.position[None, :], FINER, plain[:1])[0]
    return between(profile, FINER, plain) @ forms(position, metric).weight


def momentum_balance(problem: Problem, history: History) -> Closure:
    """Change of momentum of the stored profiles against the impulse of stored stresses and pressure.

    Largest residual over the kept profiles, relative to the gross impulse of the run.
    """
    history = judged(problem, history)
    momentum = problem.density * _across(history, history.profile, problem.metric)
    reach, section = lever(problem), section_measure(problem)
    parts = [
        -reach[end] * increments(history.piece, history.offset, history.stress[:, end], history.stress_rate[:, end])
        for end in (LOWER, UPPER)
    ]
    parts.append(section * increments(history.piece, history.offset, history.gradient, history.gradient_rate))
    gross = float(sum(np.abs(part).sum() for part in parts))
    impulse = running(sum(parts), history.profile_row)
    if len(momentum) < 2:
        return Closure(0.0, math.inf)
    if gross == 0.0:
        return Closure(0.0, 0.0)
    residual = (momentum - momentum[0]) - (impulse - impulse[0])
    # Round-off of the first momentum and of near-wall coordinates stays below this.
    floor = ROUNDING * float(np.abs(momentum).max()) * (1.0 + problem.outer / problem.gap)
    return Closure(float(np.abs(residual).max()) / gross, floor / gross)


def power(problem: Problem, history: History) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Increments between rows of the work of walls and pressure, of the loss by slip, and of gross work."""
    reach, section = lever(problem), section_measure(problem)
    piece, offset = history.piece, history.offset
    parts, lost = [], np.zeros(len(piece) - 1)
    for end, wall in enumerate(problem.walls):
        if wall.kind != "moving":
            continue
        stress, stress_rate = history.stress[:, end], history.stress_rate[:, end]
        speed, acceleration = history.speed[:, end], history.acceleration[:, end]
        power_rate = stress_rate * speed + stress * acceleration
        parts.append(-reach[end] * increments(piece, offset, stress * speed, power_rate))
        if wall.slip_length > 0.0:
            radius = (problem.inner, problem.outer)[end]
            factor = wall.slip_length * reach[end] ** 2 / (problem.viscosity * radius**problem.metric)
            lost = lost + factor * increments(piece, offset, stress**2, 2.0 * stress * stress_rate)
    flow_rate = history.gradient_rate * history.mean + history.gradient * history.mean_rate
    parts.append(section * increments(piece, offset, history.gradient * history.mean, flow_rate))
    return sum(parts), lost, sum(np.abs(part) for part in parts)


def energy_balance(problem: Problem, history: History) -> Closure:
    """Work of walls and pressure against change of kinetic energy and dissipation, from the stored profiles.

    Relative to the gross work, or to the largest change of kinetic energy where that is more.
    Intervals between kept profiles that hide an infinite stress cannot be judged and are left out.
    ``resolution`` compares the dissipation with that from every second profile.
    """
    history = judged(problem, history)
    row, w = history.profile_row, history.profile
    if len(row) < 3:
        return Closure(0.0, math.inf)
    shapes = forms(history.position, problem.metric)
    kinetic = 0.5 * problem.density * quadratic(shapes.mass, w, w)
    infinite = np.isnan(history.stress[row]).any(axis=1)
    heat = np.where(infinite, np.nan, problem.viscosity * quadratic(shapes.stiffness, w, w))
    heat_rate = 2.0 * problem.viscosity * quadratic(shapes.stiffness, w, history.profile_rate)
    work, lost, gross = power(problem, history)
    net = running(work - lost, row)
    piece, offset = history.piece[row], history.offset[row]
    warmed = np.concatenate([[0.0], np.cumsum(increments(piece, offset, heat, heat_rate))])
    hidden = _hidden(history, row)
    residual = np.where(hidden, 0.0, np.diff(kinetic) - np.diff(net) + np.diff(warmed))
    # A flow that only dies away takes no work: what it loses is the measure then.
    total = max(float(gross.sum()), float(np.abs(kinetic - kinetic[0]).max()))
    if total == 0.0:
        return Closure(0.0, 0.0)
    half = np.arange(0, len(piece), 2)
    coarse = increments(piece[half], offset[half], heat[half], heat_rate[half])
    same = (piece[half][1:] == piece[half][:-1]) & ~np.isnan(coarse)
    # Cubics on twice the spacing err 16 times as much.
    off = np.where(same, np.abs(coarse - np.diff(warmed[half])), 0.0).sum() / 15.0
    return Closure(float(np.abs(np.cumsum(residual)).max()) / total, float(off) / total)


def _hidden(history: History, row: np.ndarray) -> np.ndarray:
    """Intervals between kept profiles (k - 1,) across which a break passes without a profile on both its sides."""
    piece, time = history.piece[row], history.time[row]
    return (np.diff(piece) != 0) & (np.diff(time) > 0.0)


def stress_difference(problem: Problem, history: History) -> Closure:
    """Stored wall stresses against a one-sided difference of the stored profiles: the worst over kept rows and walls.

    Relative to the wall's peak; where an infinite stress has been, to the local value (at least the hand formula's
    peak and the stress of all velocity differences spread over the gap).  Rows so soon after a break that the nodes
    cannot follow the layer are left out.  ``resolution``: what one or two nodes less make of the difference, and
    round-off; infinite where no row was left.
    """
    nodes = distinct(history.position)
    position = history.position[nodes]
    wait = resolution_time(position, problem.viscosity / problem.density, problem.accuracy)
    hand = np.abs(quasi_steady_stress(problem, history.speed, steady_drop(problem, history))).max(axis=0)
    radii = (problem.inner, problem.outer) if problem.rotating else (1.0, 1.0)
    calm = problem.viscosity * float(np.ptp(history.profile)) / problem.gap
    worst, resolution, rows = 0.0, 0.0, 0
    for end, wall in enumerate(problem.walls):
        use = history.offset[history.profile_row] >= wait[end]
        if wall.kind != "moving" or not use.any():
            continue
        rows += int(use.sum())
        stored = history.stress[history.profile_row[use], end]
        scale = np.full(len(stored), np.nanmax(np.abs(history.stress[:, end]), initial=0.0))
        if np.isnan(history.stress[:, end]).any():
            scale = np.maximum(np.abs(stored), max(hand[end], calm * radii[end]))
        if not scale.any():
            continue
        profile = history.profile[use][:, nodes]
        factor = (1.0, -1.0)[end] * problem.viscosity / lever(problem)[end]
        stress, *fewer = (
            factor * wall_flux(position, profile, problem.metric, end, n) for n in range(STENCIL, STENCIL - 3, -1)
        )
        worst = max(worst, float((np.abs(stress - stored) / scale).max()))
        first = position[1] - position[0] if end == LOWER else position[-1] - position[-2]
        noise = ROUNDING * np.abs(profile).max() * radii[end] * problem.viscosity / first / scale.min()
        missing = max(float((np.abs(stress - other) / scale).max()) for other in fewer)
        resolution = max(resolution, float(noise), ROUNDING * problem.outer / first, missing)
    return Closure(worst, resolution if rows else math.inf)


def flow_difference(problem: Problem, history: History) -> Closure:
    """Stored mean velocity against the mean of the stored profiles, relative to the largest mean velocity."""
    history = judged(problem, history)
    known = ~np.isnan(history.stress[history.profile_row]).any(axis=1)
    row = history.profile_row[known]
    speeds = np.abs(history.profile if history.lever is None else history.profile * history.lever)
    # a prescribed flow is what it is to round-off: how well the profiles carry it counts beside the speeds
    share = HARDLY_FLOWS if problem.flow is None else 1.0
    largest = float(max(np.abs(history.mean).max(), share * speeds.max(initial=0.0)))
    if len(row) < 2:
        return Closure(0.0, math.inf)
    if largest == 0.0:
        return Closure(0.0, 0.0)
    over, area = (1, problem.gap) if problem.rotating else (problem.metric, section_measure(problem))
    mean = _across(history, history.profile[known], over) / area
    return Closure(float(np.abs(mean - history.mean[row]).max()) / largest, ROUNDING * problem.outer / problem.gap)


def _check(name: str, closure: Closure, accuracy: float, said: str) -> Check:
    limit = max(accuracy, closure.resolution)
    status = judge(closure.residual, limit, limit)
    note = f"{said} to {closure.residual:.1e}"
    if math.isinf(closure.resolution):
        note = "the run is too short for its nodes to judge by"
    elif closure.resolution > accuracy:
        note += f"; what was kept allows to judge to {closure.resolution:.1e} only"
    return Check(name, "numerics", status, closure.residual, limit, SOURCE, note)


def momentum_check(problem: Problem, history: History) -> Check:
    """Momentum balance as a check against the accuracy asked for."""
    closure = momentum_balance(problem, history)
    return _check("momentum balance", closure, problem.accuracy, "the momentum of the profiles closes with the impulse")


def energy_check(problem: Problem, history: History) -> Check:
    """Work-energy balance as a check against the accuracy asked for."""
    closure = energy_balance(problem, history)
    return _check("work and energy", closure, problem.accuracy, "work closes with kinetic energy and dissipation")


def stress_check(problem: Problem, history: History) -> Check:
    """Stored stresses against stored profiles as a check against the accuracy asked for."""
    closure = stress_difference(problem, history)
    return _check("stress against profile", closure, problem.accuracy, "stored stresses agree with the stored profiles")


def flow_check(problem: Problem, history: History) -> Check:
    """Stored mean velocity against stored profiles as a check against the accuracy asked for.

    Judged beside the speeds where hardly anything flows, as in a sealed gap.
    """
    closure = flow_difference(problem, history)
    return _check("flow against profile", closure, problem.accuracy, "mean velocity and profiles agree")


BALANCES = (momentum_check, energy_check, stress_check, flow_check)
