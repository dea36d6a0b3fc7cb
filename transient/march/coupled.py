"""Fluid, bodies and flow condition as one small dense system: steady states, decay rates, periodic states.

The state is ``z = [w (n unknown nodes), U, x of each body]``; ``dz/dt = B z + r`` with the pressure of a prescribed
flow eliminated.  Dense, since n is tens to hundreds and this is needed a few times per case, not per step.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.problem import PRESSURE, Problem
from transient.gap.system import System
from transient.march import closure
from transient.march.links import Links, links

MOST_ITERATIONS = 60
LEAST_CONDITION = 1e-15  # reciprocal: a steady state of systems worse than this is none


@dataclass(frozen=True, eq=False)
class Dense:
    """Rates of the state as ``matrix @ z + push G + wall @ speeds + load @ loads``.

    ``matrix`` (N, N), ``push`` (N,), ``wall``, ``load`` (N, 2); the mean velocity is ``row @ z + row_wall @ speeds``
    with ``row`` (N,), ``row_wall`` (2,); ``ends`` that carry bodies; ``flow``: whether the mean velocity is prescribed.
    """

    matrix: np.ndarray
    push: np.ndarray
    wall: np.ndarray
    load: np.ndarray
    row: np.ndarray
    row_wall: np.ndarray
    ends: tuple[int, ...]
    coupling: Links
    flow: bool
    unknowns: int

    def speed(self, end: int) -> int:
        """Place of a body's speed in the state."""
        return self.unknowns + 2 * self.ends.index(end)


def dense(problem: Problem, system: System, slopes: tuple[float, float] = (0.0, 0.0)) -> Dense:
    """The dense system; ``slopes``: of the bodies' force-speed curves where they are linearised."""
    coupling = links(problem, system)
    ends = tuple(end for end in (0, 1) if problem.walls[end].body is not None)
    n = system.unknowns
    size = n + 2 * len(ends)
    matrix = np.zeros((size, size))
    conductance = system.conductance
    at = np.arange(n - 1)
    matrix[at, at + 1] = conductance
    matrix[at + 1, at] = conductance
    matrix[at, at] -= conductance
    matrix[at + 1, at + 1] -= conductance
    near = (0, n - 1)
    wall, load, push = np.zeros((size, 2)), np.zeros((size, 2)), np.zeros(size)
    push[:n] = system.volume
    row, row_wall = np.zeros(size), np.zeros(2)
    row[:n] = system.grid.mean_weight[system.first : system.first + n]
    inertia = np.ones(size)
    inertia[:n] = system.storage
    for end in (0, 1):
        pull = system.end_conductance[end]
        matrix[near[end], near[end]] -= pull
        link = coupling.link[end, 0]
        share = coupling.end_weight[end, 0] + link[closure.SWEEP]
        if end not in ends:
            wall[near[end], end] = pull
            row_wall[end] = share
            continue
        u = n + 2 * ends.index(end)
        x = u + 1
        matrix[near[end], u] += pull
        matrix[u, near[end]] = link[closure.GRIP] * pull
        matrix[u, u] = -link[closure.GRIP] * pull - link[closure.DAMPING] + slopes[end]
        matrix[u, x] = -link[closure.STIFFNESS]
        matrix[x, u] = 1.0
        inertia[u] = link[closure.MASS]
        push[u] = link[closure.PUSH]
        load[u, end] = 1.0
        row[u] = share
    return Dense(
        matrix / inertia[:, None], push / inertia, wall / inertia[:, None], load / inertia[:, None],
        row, row_wall, ends, coupling, problem.flow is not None, n,
    )  # fmt: skip


def operator(system: Dense, stiff_only: bool = True) -> np.ndarray:
    """B: the rates' matrix with the pressure of a prescribed flow eliminated; displacements that no spring answers to
    are left out."""
    matrix = system.matrix
    if system.flow:
        through = system.row @ system.push
        matrix = matrix - np.outer(system.push, system.row @ matrix) / through
    return matrix[np.ix_(kept(system), kept(system))] if stiff_only else matrix


def kept(system: Dense) -> np.ndarray:
    """Indices of the state without displacements that no spring answers to."""
    out = list(range(system.unknowns))
    for end in system.ends:
        u = system.speed(end)
        out.append(u)
        if system.coupling.link[end, 0, closure.STIFFNESS] > 0.0:
            out.append(u + 1)
    return np.array(out)


def slowest(system: Dense) -> float:
    """Time constant of the slowest mode, s; infinite where something is not held back."""
    rates = -np.linalg.eigvals(operator(system)).real
    if system.flow:
        rates = np.sort(rates)[1:]  # the flow condition itself is one mode that does not move
    least, largest = rates.min(), rates.max()
    return float(1.0 / least) if least > 1e-12 * largest else np.inf


@dataclass(frozen=True, eq=False)
class Equilibrium:
    """Steady ``velocity`` (n,), wall ``speeds`` (2,), ``place`` (2,) of sprung bodies, and ``gradient``."""

    velocity: np.ndarray
    speeds: np.ndarray
    place: np.ndarray
    gradient: float


def equilibrium(
    problem: Problem, system: System, values: np.ndarray, held: dict[int, float] | None = None,
    friction: tuple[float, float] = (0.0, 0.0),
) -> Equilibrium | None:  # fmt: skip
    """The steady state of constant inputs ``values`` (3,), None where there is none.

    ``held``: bodies kept at a given speed; ``friction``: constant extra force on each body (dry friction in its mode).
    Of several crossings of a force-speed curve with its loads the one is found that a start from standstill meets.
    """
    held = held or {}
    guess = np.zeros(2)
    curved = [end for end, wall in enumerate(problem.walls) if wall.body is not None and wall.body.curve[0]]
    free = [end for end in curved if end not in held]
    if len(free) == 1:
        guess[free[0]] = _first_crossing(problem, system, values, free[0], held, np.asarray(friction))
    for _ in range(MOST_ITERATIONS):
        loads, slopes = _curves(problem, guess)
        found = _linear_equilibrium(problem, system, values, held, loads + np.asarray(friction), slopes)
        if found is None:
            return None
        if np.allclose(found.speeds, guess, rtol=1e-13, atol=1e-300) or not any(
            wall.body is not None and wall.body.curve[0] for wall in problem.walls
        ):
            return found
        guess = found.speeds
    return None


def _first_crossing(
    problem: Problem, system: System, values: np.ndarray, end: int, held: dict[int, float], friction: np.ndarray
) -> float:
    """Speed at which the net load on a body with a force-speed curve first vanishes on the way from standstill.

    Film and damper are linear in the speed and the curve is straight between its points, so the root is exact.
    """
    body = problem.walls[end].body
    assert body is not None
    link = links(problem, system).link[end, 0]
    at, load = (np.array(part) for part in body.curve)

    def short_of_curve(speed: float) -> float:
        found = _linear_equilibrium(problem, system, values, {**held, end: speed}, np.zeros(2), np.zeros(2))
        if found is None:
            return np.nan
        film = link[closure.GRIP] * system.end_conductance[end] * (found.velocity[-1 if end else 0] - speed)
        return float(values[end] + friction[end] - body.damping * speed + film + link[closure.PUSH] * found.gradient)

    unit = max(float(np.abs(at).max()), 1e-300)
    still = short_of_curve(0.0)
    slope = (short_of_curve(unit) - still) / unit
    if not np.isfinite(slope) or body.stiffness > 0.0:
        return 0.0
    way = np.sign(still + np.interp(0.0, at, load))
    if way == 0.0:
        return 0.0
    beyond = np.sort(at[way * at > 0.0] * way) * way
    corners = np.concatenate([[0.0], beyond])
    net = still + slope * corners + np.interp(corners, at, load)
    for low, high, first, last in zip(corners[:-1], corners[1:], net[:-1], net[1:], strict=True):
        if way * last <= 0.0:
            return float(low + (high - low) * first / (first - last))
    return float(corners[-1] - net[-1] / slope) if slope < 0.0 else 0.0


def settled_state(problem: Problem, system: System, values: np.ndarray, mode: np.ndarray) -> Equilibrium | None:
    """The steady state that a run ends in: bodies in the mode of dry friction (2,) that they end in."""
    held: dict[int, float] = {}
    friction = [0.0, 0.0]
    for end, wall in enumerate(problem.walls):
        if wall.body is None:
            continue
        if mode[end] == closure.STUCK:
            held[end] = 0.0
        elif mode[end] == closure.FORWARD:
            friction[end] = -wall.body.sliding
        elif mode[end] == closure.BACKWARD:
            friction[end] = wall.body.sliding
    return equilibrium(problem, system, values, held, (friction[0], friction[1]))


def settled_slopes(problem: Problem, system: System) -> tuple[float, float]:
    """Slopes of the bodies' force-speed curves at the speeds that the eventual loads lead to (at 0 where unknown)."""
    if all(wall.body is None or not wall.body.curve[0] for wall in problem.walls):
        return 0.0, 0.0
    ends = [drive.eventual.drive for drive in problem.drives]
    values = np.array([0.0 if drive is None else float(drive.pieces(1.0).value(np.zeros(1))[0]) for drive in ends])
    found = equilibrium(problem, system, values)
    low, high = _curves(problem, np.zeros(2) if found is None else found.speeds)[1]
    return float(low), float(high)


def _curves(problem: Problem, speeds: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Loads (2,) at zero speed of the curves' tangents at ``speeds``, and their slopes (2,)."""
    loads, slopes = np.zeros(2), np.zeros(2)
    out = np.zeros(2)
    for end, wall in enumerate(problem.walls):
        if wall.body is None or not wall.body.curve[0]:
            continue
        at, values = (np.array(part) for part in wall.body.curve)
        closure.curve_load.py_func(at, values, 0, len(at), float(speeds[end]), out)  # a part has no door of its own
        slopes[end] = out[1]
        loads[end] = out[0] - out[1] * speeds[end]
    return loads, slopes


def _linear_equilibrium(
    problem: Problem, system: System, values: np.ndarray, held: dict[int, float], extra: np.ndarray, slopes: np.ndarray
) -> Equilibrium | None:
    rows = dense(problem, system, (float(slopes[0]), float(slopes[1])))
    index = kept(rows)
    speeds = np.zeros(2)
    right = np.zeros(len(rows.push))
    for end in (0, 1):
        if end in rows.ends:
            right -= rows.load[:, end] * (values[end] + extra[end])
        else:
            speeds[end] = values[end]
            right -= rows.wall[:, end] * values[end]
    matrix = rows.matrix.copy()
    for end, speed in held.items():
        u = rows.speed(end)
        matrix[u] = 0.0
        matrix[u, u] = 1.0
        right[u] = speed
        if u + 1 in index:  # a held body's spring rests where it is
            index = index[index != u + 1]
    matrix, right = matrix[np.ix_(index, index)], right[index]
    push = rows.push.copy()
    for end in held:
        push[rows.speed(end)] = 0.0
    push = push[index]
    size = len(index)
    if rows.flow:
        matrix = np.block([[matrix, push[:, None]], [rows.row[index][None, :], np.zeros((1, 1))]])
        right = np.append(right, values[PRESSURE] - rows.row_wall @ speeds)
    else:
        right = right - push * values[PRESSURE]
    state = _solved(matrix, right)
    if state is None:
        return None
    whole = np.zeros(len(rows.push))
    whole[index] = state[:size]
    place = np.zeros(2)
    for end in rows.ends:
        u = rows.speed(end)
        speeds[end] = whole[u]
        place[end] = whole[u + 1]
    gradient = float(state[size]) if rows.flow else float(values[PRESSURE])
    return Equilibrium(whole[: rows.unknowns], speeds, place, gradient)


def _solved(matrix: np.ndarray, right: np.ndarray) -> np.ndarray | None:
    """Solution of a linear system, None where it is singular to round-off."""
    from scipy.linalg import lapack  # its import takes a while

    scale = np.abs(matrix).max(axis=1)
    if not (scale > 0.0).all():
        return None
    scaled = matrix / scale[:, None]
    factors, pivots, failed = lapack.dgetrf(scaled)
    if failed or lapack.dgecon(factors, np.abs(scaled).sum(axis=0).max())[0] < LEAST_CONDITION:
        return None
    state, _ = lapack.dgetrs(factors, pivots, right / scale)
    return state if np.isfinite(state).all() else None


def periodic_start(system: Dense, begin: np.ndarray, after_one: np.ndarray, period: float) -> np.ndarray:
    """State at t = 0 of the periodic regime, from the state ``after_one`` period from ``begin``.

    z = z_0 + (1 - exp(B period))^-1 (z_1 - z_0); a prescribed flow leaves no freedom along its own condition.
    """
    from scipy.linalg import expm

    index = kept(system)
    missing = np.eye(len(index)) - expm(operator(system) * period)
    if system.flow:
        row, push = system.row[index], system.push[index]
        missing += np.outer(push, row) / (row @ push)
    out = begin.copy()
    out[index] += np.linalg.solve(missing, (after_one - begin)[index])
    return out
