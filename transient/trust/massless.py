"""The hand formula for bodies: a film that follows the body's speed at once, with and without its share of inertia.

Without its own inertia the film resists like the steady flow of each instant, so a block on a film approaches its
terminal speed with the time constant m h / (mu A).  To first order the film's inertia adds to the body what its
steady profile carries: rho A h / 3 with a linear profile (from the film's kinetic energy; common practice, no source).
Loads, walls and flow are the case's own; where everything is linear the equation is solved in closed form.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.problem import LOWER, PRESSURE, UPPER, Body, Inputs, Problem
from transient.trust.forced import Linear, forced
from transient.trust.quasi_steady import (
    lever,
    mean_weights,
    profiles,
    quasi_steady_mean,
    quasi_steady_stress,
    section_measure,
)

TOLERANCE = 1e-6  # of the integration where curves or friction leave no closed form
# Dry friction rises over this share of the largest speed that the film alone would allow; common practice, no source.
SLIDING = 1e-4


@dataclass(frozen=True, eq=False)
class Film:
    """Steady loads: ``resistance`` (2, 2) on each wall's body per speed of each wall, ``push`` (2,) per unit of
    the pressure row (its drop per length, or the mean velocity of a prescribed flow); ``pressure`` (2,) drop per
    length per speed, and ``pressure_push`` per unit of that row; ``inertia`` (2, 2) kg or kg m^2."""

    resistance: np.ndarray
    push: np.ndarray
    pressure: np.ndarray
    pressure_push: float
    inertia: np.ndarray


def film_of(problem: Problem) -> Film:
    """The film as a resistance and, to first order, an inertia."""
    unit, still = np.eye(2), np.zeros((1, 2))
    stress = quasi_steady_stress(problem, unit, np.zeros(2)).T
    pressed = quasi_steady_stress(problem, still, np.ones(1))[0]
    bodies = [wall.body for wall in problem.walls]
    grip = np.array([0.0 if body is None else body.grip for body in bodies])
    swept = np.array([0.0 if body is None else body.displaced for body in bodies])
    through = (problem.section or 0.0) * problem.count
    pressure, pressure_push = np.zeros(2), 1.0
    if problem.flow is not None:
        ease = float(quasi_steady_mean(problem, still, np.ones(1))[0])
        dragged = quasi_steady_mean(problem, unit, np.zeros(2))
        pressure = -(dragged + (swept / through if through else 0.0)) / ease
        pressure_push = 1.0 / ease
    face = grip * pressed + (problem.length or 0.0) * swept
    depth, measure = _measure(problem)
    shape = profiles(problem, unit, pressure, depth)
    carried = problem.density * (shape * measure) @ shape.T
    reach = np.array(lever(problem))
    factor = np.divide(grip, reach, out=np.zeros(2), where=reach > 0.0)
    return Film(
        grip[:, None] * stress + face[:, None] * pressure,
        face * pressure_push,
        pressure,
        pressure_push,
        factor[:, None] * carried,
    )


def _measure(problem: Problem) -> tuple[np.ndarray, np.ndarray]:
    """(depth (k,), weight (k,)) of the integral of r^m dr over the gap."""
    depth, weight = mean_weights(problem)
    if problem.rotating:
        return depth, problem.gap * weight * (problem.inner + depth) ** 2
    return depth, section_measure(problem) * weight


@dataclass(frozen=True, eq=False)
class Motion:
    """The hand formula's ``speed``, ``acceleration`` (n, 2) and ``gradient`` (n,) at the instants asked for;
    ``time_constant`` s of the slowest mode at the end of the run (None: nothing holds it back), ``frequency`` Hz of
    its swing, 0 without."""

    speed: np.ndarray
    acceleration: np.ndarray
    gradient: np.ndarray
    time_constant: float | None
    frequency: float


def hand_motion(
    problem: Problem, inputs: Inputs, piece: np.ndarray, offset: np.ndarray,
    start: tuple[np.ndarray, np.ndarray], film: Film, inertia: float,
) -> Motion | None:  # fmt: skip
    """Motion at ``offset`` (n,) s into ``piece`` (n,) of ``inputs``, rising in time.

    ``start``: speed and place (2,) of the walls at t = 0; ``inertia`` 0 without, 1 with the film's own.
    None where the body has no mass and the film is given none: the speed follows at once then.
    """
    ends = [end for end, wall in enumerate(problem.walls) if wall.body is not None]
    bodies: list[Body] = [wall.body for wall in problem.walls if wall.body is not None]
    mass = np.diag([body.mass for body in bodies]) + inertia * film.inertia[np.ix_(ends, ends)]
    if np.any(np.diag(mass) <= 0.0):
        return None
    system = _linear(film, ends, bodies, mass)
    state = np.concatenate([start[0][ends], start[1][[e for e, b in zip(ends, bodies, strict=True) if b.stiffness]]])
    if problem.linear:
        values, rates = forced(system, inputs, piece, offset, state)
    else:
        values, rates = _integrated(system, mass, bodies, inputs, piece, offset, state)
    speed = np.stack([inputs.row(row).at(piece, offset) for row in (LOWER, UPPER)], axis=1)
    acceleration = np.stack([inputs.row(row).at(piece, offset, 1) for row in (LOWER, UPPER)], axis=1)
    speed[:, ends], acceleration[:, ends] = values[:, : len(ends)], rates[:, : len(ends)]
    given = inputs.row(PRESSURE).at(piece, offset)
    gradient = speed @ film.pressure + film.pressure_push * given
    modes = np.linalg.eigvals(_settled(system, mass, bodies, values[-1]))
    slowest = modes[np.argmax(modes.real)]
    held = slowest.real < -1e-12 * np.abs(modes).max()
    return Motion(
        speed, acceleration, gradient,
        float(-1.0 / slowest.real) if held else None, float(abs(slowest.imag)) / (2.0 * np.pi),
    )  # fmt: skip


def _linear(film: Film, ends: list[int], bodies: list[Body], mass: np.ndarray) -> Linear:
    """dz/dt = matrix z + source u of the state z = [speeds, places of sprung bodies]; u the inputs' three rows."""
    count = len(ends)
    sprung = [i for i, body in enumerate(bodies) if body.stiffness > 0.0]
    size = count + len(sprung)
    loads, source = np.zeros((count, size)), np.zeros((count, 3))
    loads[:, :count] = film.resistance[np.ix_(ends, ends)] - np.diag([body.damping for body in bodies])
    for place, i in enumerate(sprung):
        loads[i, count + place] = -bodies[i].stiffness
    for i, end in enumerate(ends):
        source[i, end] = 1.0
        for other in (LOWER, UPPER):
            if other not in ends:
                source[i, other] = film.resistance[end, other]
        source[i, PRESSURE] = film.push[end]
    matrix = np.zeros((size, size))
    matrix[:count] = np.linalg.solve(mass, loads)
    for place, i in enumerate(sprung):
        matrix[count + place, i] = 1.0
    whole = np.zeros((size, 3))
    whole[:count] = np.linalg.solve(mass, source)
    return Linear(matrix, whole)


def _settled(system: Linear, mass: np.ndarray, bodies: list[Body], state: np.ndarray) -> np.ndarray:
    """The system's matrix with the slopes of the curves at the run's last speeds."""
    slopes = np.zeros(len(bodies))
    for i, body in enumerate(bodies):
        at, value = (np.array(column) for column in body.curve)
        piece = int(np.searchsorted(at, state[i], side="right"))
        if 0 < piece < len(at):
            slopes[i] = (value[piece] - value[piece - 1]) / (at[piece] - at[piece - 1])
    matrix = system.matrix.copy()
    matrix[: len(bodies), : len(bodies)] += np.linalg.solve(mass, np.diag(slopes))
    return matrix


def _integrated(
    system: Linear, mass: np.ndarray, bodies: list[Body], inputs: Inputs,
    piece: np.ndarray, offset: np.ndarray, state: np.ndarray,
) -> tuple[np.ndarray, np.ndarray]:  # fmt: skip
    """State and rates (n, N) with curves and dry friction, by SciPy's LSODA piece by piece."""
    from scipy.integrate import solve_ivp

    count = len(bodies)
    slow = SLIDING * _scale(system, inputs, bodies, mass)
    ease = np.linalg.inv(mass)
    plain = not inputs.coeff.any()

    def rate(z: np.ndarray, given: np.ndarray) -> np.ndarray:
        out = system.matrix @ z + system.source @ given
        for i, body in enumerate(bodies):
            load = np.interp(z[i], *body.curve) if body.curve[0] else 0.0
            if body.sliding:
                load = load - body.sliding * np.tanh(z[i] / slow)
            out[:count] += np.multiply.outer(ease[:, i], load)
        return out

    def inputs_at(x: float, number: int) -> np.ndarray:
        if plain:
            c = inputs.poly[number].T
            return c[0] + x * (c[1] + x * (c[2] + x * c[3]))
        at = np.array([number]), np.array([x])
        return np.array([inputs.row(row).at(*at)[0] for row in range(3)])

    values = np.zeros((len(piece), len(state)))
    for number in np.unique(piece):
        own = np.flatnonzero(piece == number)
        times, back = np.unique(offset[own], return_inverse=True)
        found = state[:, None].repeat(len(times), axis=1)
        if times[-1] > 0.0:
            size = 1e-7 * max(float(np.abs(state).max()), slow / SLIDING)
            found = solve_ivp(
                lambda x, z, n=number: rate(z, inputs_at(x, n)), (0.0, times[-1]), state, "LSODA", times,
                rtol=TOLERANCE, atol=size,
            ).y  # fmt: skip
        state = found[:, -1]
        values[own] = found.T[back]
    given = np.stack([inputs.row(row).at(piece, offset) for row in range(3)])
    return values, rate(values.T, given).T


def _scale(system: Linear, inputs: Inputs, bodies: list[Body], mass: np.ndarray) -> float:
    """The largest speed that loads could drive against the film alone, m/s or rad/s."""
    load = np.abs(inputs.poly[:, :, 0]).max(axis=0) @ np.abs(system.source).T[:, : len(bodies)]
    curves = [max((abs(v) for v in body.curve[1]), default=0.0) for body in bodies]
    most = float(load.max() + np.abs(np.linalg.solve(mass, np.array(curves))).max())
    holds = float(np.abs(np.diag(system.matrix)[: len(bodies)]).max())
    return most / holds if holds > 0.0 and most > 0.0 else 1.0
