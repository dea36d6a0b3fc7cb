"""How large stresses and speeds are likely to get: cautious guesses, before anything is solved."""

from __future__ import annotations

from math import erfc

import numpy as np

from transient.drive.pieces import Pieces
from transient.gap.problem import PRESSURE, Problem

LIGHT = 0.05  # of the gap: a body lighter than so much of its liquid is resolved as if it had that mass


def levers(problem: Problem) -> np.ndarray:
    """What turns a wall's speed into its surface speed: the radius where speeds are angular."""
    return np.array([problem.inner, problem.outer]) if problem.rotating else np.ones(2)


def sizes(
    problem: Problem, rows: list, lever: np.ndarray, length: np.ndarray, jump: np.ndarray
) -> tuple[np.ndarray, float]:
    """(guess of each wall's peak stress, largest speed): quasi-steady values sampled along the pieces, and what a
    steady acceleration makes of the stress for as long as the piece or the diffusion lasts."""
    nu = problem.viscosity / problem.density
    diffusion = problem.diffusion_time
    everywhere = np.arange(len(length))
    samples = [np.concatenate([row.at(everywhere, share * length) for share in (0, 0.3, 0.7, 1)]) for row in rows]
    surface = [_surface_speed(problem, end, samples[end], lever[end], float(length.sum())) for end in (0, 1)]
    largest = np.abs(samples[PRESSURE]).max(initial=0.0)
    push = 0.0 if problem.flow is not None else largest
    mean = largest if problem.flow is not None else 0.0
    total = float(length.sum())
    slip = _slips(problem, rows, surface, total)
    calm = problem.viscosity * (slip + 6.0 * mean) / problem.gap
    if problem.flow is None:
        calm = calm + _pushed(problem, rows[PRESSURE], length)
    last = np.minimum(length, diffusion)[:, None]
    swift = np.array([_quickest(rows[end], rows[PRESSURE]) for end in (0, 1)]).T
    held = np.array([wall.body is None for wall in problem.walls])  # a body gives way before the stress has grown
    depth = np.sqrt(nu * np.minimum(last, swift) / np.pi)
    grown = (2.0 * problem.density * _accelerations(problem, rows, lever, length) * depth).max(axis=0, initial=0.0)
    grown = grown * held
    fallen = (problem.density * jump * np.sqrt(nu / (np.pi * last))).max(axis=0, initial=0.0)
    stress = np.maximum(np.maximum(grown, fallen), calm)
    # a wall that the motion reaches late or never is judged beside the other one
    stress = np.maximum(stress, 1e-6 * stress.max())
    driven = push * problem.gap**2 / (8.0 * problem.viscosity) * min(1.0, 8.0 * total / diffusion)
    before = [abs(row.before) * lever[end] for end, row in enumerate(rows[:2]) if problem.walls[end].body is None]
    speed = max(np.abs(surface).max(initial=0.0), driven, 1.5 * mean, *before, 0.0)
    tiny = np.finfo(float).tiny
    return np.where(stress > 0, stress, tiny), speed if speed > 0 else tiny


def _accelerations(problem: Problem, rows: list, lever: np.ndarray, length: np.ndarray) -> np.ndarray:
    """Least acceleration (P, 2) of each wall against the fluid at both ends of every piece, m/s^2."""
    piece = np.arange(len(length))
    out = np.empty((len(length), 2))
    for end in (0, 1):
        at = [rows[end].at(piece, share * length, 1) * lever[end] for share in (0.0, 1.0)]
        if problem.flow is not None:
            at = [a - rows[PRESSURE].at(piece, share * length, 1) for a, share in zip(at, (0.0, 1.0), strict=True)]
        else:
            at = [a - rows[PRESSURE].at(piece, share * length) / problem.density
                  for a, share in zip(at, (0.0, 1.0), strict=True)]  # fmt: skip
        out[:, end] = np.minimum(np.abs(at[0]), np.abs(at[1]))
    return out


def _surface_speed(problem: Problem, end: int, sample: np.ndarray, lever: float, duration: float) -> np.ndarray:
    """Surface speeds (m,) of a wall at the sampled instants; of a body one cautious guess of its largest.

    The least of what the film, the inertia over the run, a damper and a spring would allow under its largest load.
    """
    body = problem.walls[end].body
    if body is None:
        return sample * lever
    load = np.abs(sample).max(initial=0.0) + max(map(abs, body.curve[1]), default=0.0)
    load += body.stiffness * abs(body.initial_displacement)
    film = body.grip * problem.viscosity / problem.gap * lever
    inertia = body.mass + body.grip * problem.density * lever * LIGHT * problem.gap
    bounds = [load / (film + body.damping), load * duration / inertia]
    if body.stiffness > 0.0:
        bounds.append(load / np.sqrt(body.stiffness * inertia))
    return np.full(len(sample), (min(bounds) + abs(body.initial_speed or 0.0)) * lever)


def _quickest(*rows: Pieces) -> np.ndarray:
    """Time (P,) of the quickest exponential term of each piece, s; infinite without one."""
    out = np.full(len(rows[0].starts), np.inf)
    with np.errstate(divide="ignore"):
        for row in rows:
            rate = np.where(np.abs(row.coeff) > 0.0, np.abs(row.rate), 0.0).max(axis=1, initial=0.0)
            out = np.minimum(out, 1.0 / rate)
    return out


def _pushed(problem: Problem, row: Pieces, length: np.ndarray) -> float:
    """Wall stress that the pressure makes, Pa: a quarter of the gap's share where it lasts, else what it grows to like
    the root of time, and of a wave what its layer holds.  What comes back with the same sign adds up over the run."""
    nu, most = problem.viscosity / problem.density, 0.25 * problem.gap
    piece = np.arange(len(length))
    plain = Pieces(row.starts, row.poly, row.coeff[:, :0], row.rate[:, :0], row.before)
    held = np.abs([plain.at(piece, share * length) for share in (0.0, 0.3, 0.7, 1.0)]).max(axis=0)
    depth = np.minimum(most, 2.0 * np.sqrt(nu * length / np.pi))
    rate = np.abs(row.rate)
    with np.errstate(divide="ignore"):
        layer = np.minimum(most, np.sqrt(nu / rate))
    waves = (np.abs(row.coeff) * np.minimum(layer, depth[:, None])).max(axis=1, initial=0.0)
    total = float(length.sum())
    mean = abs(float(row.integral(np.array([total]))[0])) / total
    lasting = min(most, 2.0 * float(np.sqrt(nu * total / np.pi)))
    return max(float(np.maximum(held * depth, waves).max(initial=0.0)), lasting * mean)


def _slips(problem: Problem, rows: list[Pieces], surface: list[np.ndarray], total: float) -> np.ndarray:
    """Speed difference across the gap that each wall (2,) feels, m/s: its own, and of the other wall's what diffusion
    brings across within the run, or within a wave."""
    together = float(np.abs(surface[0] - surface[1]).max(initial=0.0))
    arrives = erfc(0.5 * float(np.sqrt(problem.diffusion_time / total)))
    out = np.zeros(2)
    for end in (0, 1):
        other, row = surface[1 - end], rows[1 - end]
        share = arrives
        if not row.poly[:, 1:].any() and not row.poly[:, 0].any() and row.coeff.shape[1]:
            rate = np.where(np.abs(row.coeff) > 0.0, np.abs(row.rate), np.inf).min()
            share = min(share, float(np.exp(-np.sqrt(0.5 * rate * problem.diffusion_time))))
        own = float(np.abs(surface[end]).max(initial=0.0))
        out[end] = min(together, own + share * float(np.abs(other).max(initial=0.0)))
    return out
