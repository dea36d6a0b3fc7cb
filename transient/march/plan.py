"""How fine: grid, first steps and tolerances from the drive's features and the accuracy asked for.

After a break of a wall's speed or of the pressure the wall stress grows like a power of sqrt(t):
a change of acceleration ``a`` gives ``2 density a sqrt(nu t / pi)``, a jump of speed the infinite
``sqrt(density viscosity / (pi t))`` (Stokes 1851; formulas from memory).  The first step and the first cell must be
too small for that growth to matter at the stated accuracy; from there both grow geometrically, so their number
follows the number of features and the logarithm of the scales, not the ratio of scales.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from transient.gap.problem import LOWER, PRESSURE, UPPER, Inputs, Problem
from transient.march.sizes import LIGHT, levers, sizes

# Cells grow by this share of their distance from the wall, and the local error allowed per step, at accuracy 1e-3
# and in proportion to its fourth root and its 3/4 power: with the extrapolation of two levels the error left is then
# of the order of the accuracy.  Both from trials over all shapes and drives.
GROWTH = 0.32
TOLERANCE = 2.5e-3
# Rows after a jump of speed start at this share of the shortest time that follows it.
FIRST_ROW = 1e-6
THINNEST = 1e-9  # of the gap: below this, round-off of the nodes' velocities would show in the stress
FEWEST_CELLS = 12
MOST_CELLS = 20_000
SETS_OUT = 0.5  # over the accuracy's root and the fastest rate: the first step of a wave
ECHO = 0.5  # of the accuracy that an answer to an earlier break may be misread by within a first step
ECHOES = 4  # breaks back, whose answers bound a first step
SLOWED = 0.14  # of its speed per root of (time over that in which the film stops it), twice what a first step misses
MISSED = 0.015  # of a root-like growth within a first step, by computation


@dataclass(frozen=True, eq=False)
class Features:
    """What the drive does to the two walls, in the units of the stress there.

    ``jump``, ``kink``, ``bend``, ``twist`` (P, 2): changes at each piece's start of the wall's surface speed (m/s), of
    the acceleration of wall against fluid (m/s^2), of its rate (m/s^3), and of that one's (m/s^4).  ``stress`` (2,)
    Pa: a cautious (low) guess of each wall's peak.  ``speed`` m/s: the largest speed about.  ``length`` (P,) s of the
    pieces.
    ``fastest`` (3,) 1/s: the largest rate of the inputs' exponential terms.
    """

    jump: np.ndarray
    kink: np.ndarray
    bend: np.ndarray
    twist: np.ndarray
    stress: np.ndarray
    speed: float
    length: np.ndarray
    fastest: np.ndarray


@dataclass(frozen=True, eq=False)
class Resolution:
    """Numbers for one base level.

    ``cells``, the walls' ``layers`` (share of the gap), step ``tolerance``; of each piece (P,) in s: its first step,
    its longest step while the flow settles, and the offset from which longer ones may follow; the step with which its
    own curved course can be read between rows, and the offset until which that course lasts.
    """

    cells: int
    layers: tuple[float, float]
    tolerance: float
    first_step: np.ndarray
    longest_step: np.ndarray
    calm_after: np.ndarray
    swift_step: np.ndarray
    swift_until: np.ndarray
    growth: float
    event_step: float = np.inf


def on_one_grid(resolutions: list[Resolution]) -> list[Resolution]:
    """The same with one grid fine enough for all, so that states can pass from one march to another."""
    layers = tuple(min(r.layers[end] for r in resolutions) for end in (0, 1))
    cells = _cells(layers, min(r.growth for r in resolutions))
    return [replace(r, layers=layers, cells=cells) for r in resolutions]


def tightened(resolution: Resolution, times: int) -> Resolution:
    """The same layers with 2^times the cells, and steps so many times shorter by themselves."""
    by = 2.0**times
    return replace(
        resolution,
        cells=resolution.cells * 2**times,
        tolerance=resolution.tolerance / by**3,
        first_step=resolution.first_step / by,
        longest_step=resolution.longest_step / by,
        swift_step=resolution.swift_step / by,
        event_step=resolution.event_step / by,
    )


def _cells(layers: tuple[float, ...], growth: float) -> int:
    along = np.log1p(1.0 / layers[0]) + np.log1p(1.0 / layers[1])
    return int(np.clip(np.ceil(along / growth), FEWEST_CELLS, MOST_CELLS))


def features(problem: Problem, inputs: Inputs, until: float, first: np.ndarray | None = None) -> Features:
    """Read the inputs' breaks and sizes off their pieces.

    ``first`` (3, 4): changes of the inputs' value, slope, bend and twist at t = 0, default those against a constant
    past.
    """
    rows = [inputs.row(index) for index in (LOWER, UPPER, PRESSURE)]
    lever = levers(problem)
    length = np.diff(np.append(inputs.starts, until))
    jumps = np.abs([[row.jumps(order) for order in range(4)] for row in rows])  # (3, 4, P)
    if first is not None:
        jumps[:, :, 0] = np.abs(first)
    walls = np.stack([_wall_breaks(problem, end, jumps[end], lever[end]) for end in (0, 1)], axis=2)  # (4, P, 2)
    core = jumps[PRESSURE]
    if problem.flow is not None:
        # the fluid is moved as a whole: felt at both walls like a motion of the wall; and what a wall does is answered
        # by the pressure, which the other wall feels
        walls = walls + core[:, :, None]
        walls = np.maximum(walls, walls[:, :, ::-1])
    else:
        walls[1:] += core[:3, :, None] / problem.density
    for end, wall in enumerate(problem.walls):
        if wall.kind != "moving":
            walls[:, :, end] = 0.0
    jump, kink, bend, twist = walls
    stress, speed = sizes(problem, rows, lever, length, jump)
    fastest = np.array([np.abs(row.rate[np.abs(row.coeff) > 0]).max(initial=0.0) for row in rows])
    return Features(jump, kink, bend, twist, stress, speed, length, fastest)


def _wall_breaks(problem: Problem, end: int, jumps: np.ndarray, lever: float) -> np.ndarray:
    """Jumps (4, P) of a wall's surface speed and its first three rates, from those of its input's value, slope ...

    A load changes a body's acceleration; a body lighter than a thin layer of its liquid is as heavy as that layer.
    """
    body = problem.walls[end].body
    if body is None:
        return jumps * lever
    least = body.grip * problem.density * LIGHT * problem.gap * lever
    inertia = body.mass + least
    out = np.zeros_like(jumps)
    out[1:] = jumps[:3] * lever / inertia
    outside = (abs(body.stiffness * body.initial_displacement) + max(map(abs, body.curve[1]), default=0.0)) / inertia
    if problem.start == "rest":
        out[0, 0] += abs(body.initial_speed or 0.0) * lever
        out[1, 0] += outside * lever
    elif body.initial_speed is not None:  # what held it until t = 0 lets go
        film = body.grip * problem.viscosity / problem.gap * lever
        held = (film + body.damping) * abs(body.initial_speed) + abs(body.load.before)
        out[1, 0] += (held / inertia + outside) * lever
    out[1] += body.breakaway * lever / inertia
    return out


def resolve(
    problem: Problem,
    inputs: Inputs,
    found: Features,
    accuracy: float,
    slowest: float,
    least: float,
    refine: float = 1.0,
) -> Resolution:
    """The base level for ``accuracy``; ``refine`` > 1 divides the expected error by its square.

    ``slowest`` s: time constant with which the flow settles after the last break, followed until what is left is
    the share ``least``; infinite where that is no question of this march.
    """
    growth = GROWTH * (accuracy / 1e-3) ** 0.25 / refine**0.5
    tolerance = TOLERANCE * (accuracy / 1e-3) ** 0.75 / refine**1.5
    share = min(accuracy, 0.02) / refine
    layers = tuple(_layer(problem, found, end, growth, share) for end in (0, 1))
    cells = _cells(layers, growth)
    first = _first_steps(problem, found, growth, share, layers, refine)
    first = np.min([first, *(_accelerating(problem, found, end, share) for end in (0, 1))], axis=0)
    first = np.minimum(first, _echoes(problem, found, ECHO * share / refine))
    longest, calm = _settling(inputs, found, growth * slowest, np.log(1.0 / least) * slowest)
    swift, lasts = _courses(inputs, found, accuracy, refine)
    first = np.minimum(first, swift)
    event = _event_step(problem, found, share)
    return Resolution(cells, layers, tolerance, first, longest, calm, swift, lasts, growth, event)


def _settling(inputs: Inputs, found: Features, step: float, lasts: float) -> tuple[np.ndarray, np.ndarray]:
    """(longest step, from which offset on longer ones may follow) of each piece (P,): ``step`` over the time ``lasts``
    after the last break at which anything changes."""
    changes = (found.jump + found.kink + found.bend + found.twist).sum(axis=1) > 0.0
    last = int(np.flatnonzero(changes)[-1]) if changes.any() else 0
    longest, calm = np.full(len(changes), np.inf), np.zeros(len(changes))
    if np.isfinite(step):
        longest[last:] = step
        calm[last:] = np.maximum(lasts - (inputs.starts[last:] - inputs.starts[last]), 0.0)
    return longest, calm


def _courses(inputs: Inputs, found: Features, accuracy: float, refine: float) -> tuple[np.ndarray, np.ndarray]:
    """(longest step, until which offset) of each piece (P,) that follow the drive's own course.

    A film thin enough follows its drive at once: no local error then bounds the step, yet a cubic between rows must
    still follow it.  Its error is ``(step rate)^4 / 384`` of an exponential term; a bent polynomial gets eight rows.
    """
    share = (40.0 * min(accuracy, 0.02)) ** 0.25 / refine**0.5
    alive = np.abs(inputs.coeff) > 0.0
    rate = np.where(alive, inputs.rate, 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        step = share / np.abs(rate).max(axis=(1, 2), initial=0.0)
        decay = np.where(alive & (rate.real < 0.0), np.log(100.0 / accuracy) / -rate.real, np.inf)
    until = np.where(alive, decay, 0.0).max(axis=(1, 2), initial=0.0)
    length = found.length[:, None]
    bent = (np.abs(inputs.poly[:, :, 2]) * length**2 + np.abs(inputs.poly[:, :, 3]) * length**3) / 8.0
    size = np.abs(inputs.poly[:, :, 0]).max(axis=0, initial=0.0)
    size = size + np.abs(inputs.coeff).sum(axis=2).max(axis=0, initial=0.0)
    curved = (bent > accuracy * np.where(size > 0.0, size, np.inf)).any(axis=1)
    step = np.where(curved, np.minimum(step, found.length / (8.0 * refine**0.5)), step)
    return step, np.where(curved, np.inf, until)


def _layer(problem: Problem, found: Features, end: int, growth: float, share: float) -> float:
    """Thickness of a wall's fine zone, as a share of the gap: first cell = growth x layer."""
    nu = problem.viscosity / problem.density
    gap = problem.gap
    layer = 1.0
    radius = (problem.inner, problem.outer)[end]
    if problem.metric and problem.walls[end].kind != "axis":
        layer = min(layer, 0.5 * radius / gap)
    rate = max(found.fastest[end], found.fastest[PRESSURE])
    if problem.walls[end].kind != "moving":
        return float(max(layer, THINNEST))
    if rate > 0.0:
        layer = min(layer, 0.7 * np.sqrt(nu / rate) / gap)
    cell = np.inf
    kink = found.kink[:, end].max(initial=0.0)
    if kink > 0.0:
        grown = found.stress[end] / (problem.density * kink)  # the depth reached when the stress is at its guess
        cell = min(cell, share * grown)
        layer = min(layer, 0.5 * grown / gap)
    bend = found.bend[:, end].max(initial=0.0)
    if bend > 0.0:
        cell = min(cell, (share * found.stress[end] * nu / (problem.density * bend)) ** (1.0 / 3.0))
    twist = found.twist[:, end].max(initial=0.0)
    if twist > 0.0:
        cell = min(cell, (share * found.stress[end] * nu**2 / (problem.density * twist)) ** 0.2)
    followed = _accelerating(problem, found, end, share).min(initial=np.inf)
    if followed < np.inf:
        cell = min(cell, growth * np.sqrt(nu * followed))
    shortest = _after_jumps(problem, found, end)
    if shortest < np.inf:
        # the wall's half cell takes the new speed at once: the mean velocity is off by that share of the jump
        cell = min(cell, growth * np.sqrt(nu * FIRST_ROW * shortest), 0.5 * share * gap)
    layer = min(layer, cell / gap / growth)
    return float(max(layer, THINNEST / growth))


def _after_jumps(problem: Problem, found: Features, end: int) -> float:
    """The shortest time that follows a jump of the wall's speed, at most the diffusion time; inf without jumps."""
    jumped = found.jump[:, end] > 0.0
    if not jumped.any():
        return np.inf
    return float(min(found.length[jumped].min(), problem.diffusion_time))


def _first_steps(
    problem: Problem, found: Features, growth: float, share: float, layers: tuple[float, float], refine: float
) -> np.ndarray:
    """Longest first step of each piece (P,): what the break at its start adds to the stress is below the accuracy.

    A wave or lag sets out like the square of time, which a first step read as a parabola in the root of time misses by
    0.17 (rate x step)^2.
    """
    nu = problem.viscosity / problem.density
    first = np.full(len(found.length), np.inf)
    for end in (0, 1):
        allowed = share * found.stress[end]
        cell = growth * layers[end] * problem.gap
        with np.errstate(divide="ignore", over="ignore"):
            rho = problem.density
            kinked = (allowed / (rho * found.kink[:, end])) ** 2 / nu
            bent = (allowed / (rho * found.bend[:, end] * np.sqrt(nu))) ** (2.0 / 3.0)
            twisted = (allowed / (rho * found.twist[:, end] * np.sqrt(nu))) ** 0.4
            jumped = np.where(found.jump[:, end] > 0.0, 0.2 * cell**2 / nu, np.inf)
        first = np.minimum.reduce([first, kinked, bent, twisted, jumped])
    swiftest = found.fastest.max(initial=0.0)
    if swiftest > 0.0:
        first = np.minimum(first, SETS_OUT * np.sqrt(share / refine) / swiftest)
    return np.minimum(first, found.length / 4.0)


def _echoes(problem: Problem, found: Features, share: float) -> np.ndarray:
    """Longest first step of each piece (P,) that still follows the answers to the breaks before it.

    The first step of a piece is read as a parabola in the root of its time, since what its own break makes grows so.
    The answer to an earlier break, ``age`` ago, runs smoothly on: of its bend the parabola misses 0.34 of what half the
    second derivative makes over the step (the largest of s^4 + 2 s - 3 s^2).
    """
    nu, rho = problem.viscosity / problem.density, problem.density
    ends = np.cumsum(found.length)
    first = np.full(len(found.length), np.inf)
    for back in range(1, min(ECHOES, len(first) - 1) + 1):
        age = ends[back - 1 : -1] - np.append(0.0, ends)[: len(first) - back]
        with np.errstate(divide="ignore", over="ignore"):
            for end in (0, 1):
                kinked = 0.25 * rho * found.kink[:-back, end] * np.sqrt(nu * age / np.pi)
                jumped = 0.375 * rho * found.jump[:-back, end] * np.sqrt(nu / (np.pi * age))
                follows = age * np.sqrt(share * found.stress[end] / (0.34 * (kinked + jumped)))
                first[back:] = np.minimum(first[back:], follows)
    return first


def _accelerating(problem: Problem, found: Features, end: int, share: float) -> np.ndarray:
    """Longest first step of each piece (P,) after which the acceleration of a wall's body is right to the accuracy.

    The film answers a load like the root of time: within the time in which it stops the body's own mass, or, where that
    is no more than the liquid's, within the piece or the diffusion time.  A first step misses ``MISSED`` of that.
    """
    body = problem.walls[end].body
    if body is None:
        return np.full(len(found.length), np.inf)
    lever = (problem.inner, problem.outer)[end] if problem.rotating else 1.0
    ratio = body.mass / (body.grip * problem.density * problem.gap * lever)
    time = np.minimum(found.length, problem.diffusion_time)
    stopped = ratio**2 * problem.diffusion_time
    pushed = time if ratio == 0.0 else np.minimum(time, stopped) if ratio < 1.0 else np.full(len(time), stopped)
    bent = time if ratio < 1.0 else ratio**2 * time
    bound = np.where(found.kink[:, end] > 0.0, pushed, np.where(found.bend[:, end] > 0.0, bent, np.inf))
    bound *= (share / MISSED) ** 2
    if problem.start == "rest" and body.initial_speed:
        # its film stops it like the root of time from the first instant on
        bound[0] = min(bound[0], (share / SLOWED) ** 2 * stopped)
    return bound


def _event_step(problem: Problem, found: Features, share: float) -> float:
    """First step after a body has stopped or broken away: as after a kink of the size of its dry friction."""
    nu = problem.viscosity / problem.density
    out = np.inf
    for end, wall in enumerate(problem.walls):
        if wall.body is None or wall.body.breakaway == 0.0:
            continue
        lever = levers(problem)[end]
        inertia = wall.body.mass + wall.body.grip * problem.density * LIGHT * problem.gap * lever
        kink = (wall.body.breakaway + wall.body.sliding) * lever / inertia
        out = min(out, (share * found.stress[end] / (problem.density * kink)) ** 2 / nu)
    return float(out)
