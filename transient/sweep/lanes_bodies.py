"""A body that carries a wall, for many rows at once: a heavier last cell, loaded and braked.

In lane units the wall's node stores ``inertia`` (its own over that of the gap's liquid), gains ``scale`` x load and
loses ``drag`` x speed; the stress on it is what the liquid's last cell passes on.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.problem import Problem
from transient.march import lanes_layout as layout
from transient.march.lanes_grid import grid_table
from transient.march.lanes_round import round_tables
from transient.march.regime import COARSE_CELLS

LIGHTEST = 0.02  # inertia below which a body is left to the march of single cases
Level = tuple[np.ndarray, np.ndarray]


@dataclass(frozen=True, eq=False)
class Bodies:
    """The rows' bodies on the wall ``side``; (n,) each."""

    side: int
    inertia: np.ndarray
    drag: np.ndarray
    scale: np.ndarray

    def taken(self, rows: np.ndarray) -> Bodies:
        """Those of some rows."""
        return Bodies(self.side, self.inertia[rows], self.drag[rows], self.scale[rows])


def bodies_of(
    problem: Problem, side: int, mass: np.ndarray, damping: np.ndarray, grip: np.ndarray, gap: np.ndarray,
    radius: np.ndarray, density: np.ndarray, viscosity: np.ndarray,
) -> Bodies:  # fmt: skip
    """Bodies from SI numbers (n,); ``grip`` as in ``gap.problem.Body``, ``radius`` the wall's as a share of the gap."""
    power = min(problem.metric, 2)
    lever = radius**power if power else np.ones_like(gap)
    inertia = mass * lever / (grip * density * (gap**2 if problem.rotating else gap))
    scale = lever / (grip * viscosity) * (1.0 if problem.rotating else gap)
    return Bodies(side, inertia, damping * scale, scale)


def loaded(level: Level, of: np.ndarray, bodies: Bodies) -> Level:
    """A level's tables of gaps between held walls as those of rows whose wall carries a body, [n, ...]."""
    table, ends = level[0][of].copy(), level[1][of].copy()
    side, other = bodies.side, 1 - bodies.side
    cell = ends[:, layout.CELL, side]
    storage = cell + bodies.inertia
    table[:, layout.STORAGE, 0, side] = storage
    ends[:, layout.HELD, side] = 0.0
    ends[:, layout.END, side] = bodies.drag
    ends[:, layout.DRIVE, side] = ends[:, layout.BODY, side] = 1.0
    ends[:, layout.FLUID, side] = cell / storage
    steady = table[:, layout.STEADY :].copy()
    # what the liquid gives the wall per unit of each wall's speed and of the push
    given = ends[:, layout.FLUX, side, None] * (steady[:, :, 1, side] - steady[:, :, 0, side])
    given[:, 2] += cell
    speed = np.zeros((len(of), 3))  # the wall's steady speed per unit of load, other wall's speed, push
    speed[:, side] = 1.0
    speed[:, other], speed[:, 2] = given[:, other], given[:, 2]
    speed /= (bodies.drag - given[:, side])[:, None]
    own = steady[:, side].copy()
    steady[:, side] = 0.0
    table[:, layout.STEADY :] = steady + speed[:, :, None, None] * own[:, None]
    return table, ends


def slowest(unit: Problem, inner: np.ndarray, alike: bool, bodies: Bodies) -> np.ndarray:
    """Slowest time constants (n,) in diffusion times, of liquid and body together, on the grid of ``march.regime``."""
    out = np.empty(len(inner))
    near = 0.5 * inner if unit.metric else np.ones(len(inner))
    wide = near < 1.0  # annuli whose curvature needs finer cells, each its own
    if not wide.all():
        rest = np.flatnonzero(~wide)
        out[rest] = _slowest(unit, inner[rest], alike, bodies.taken(rest), 1.0)
    for row in np.flatnonzero(wide):
        one = np.array([row])
        out[row] = _slowest(unit, inner[one], alike, bodies.taken(one), float(near[row]))[0]
    return out


def _slowest(unit: Problem, inner: np.ndarray, alike: bool, bodies: Bodies, near: float) -> np.ndarray:
    if alike:
        level, of = round_tables(unit, inner, COARSE_CELLS, (near, 1.0)), np.arange(len(inner))
    else:
        table, ends = grid_table(unit, COARSE_CELLS, (near, 1.0))
        level, of = (table[None], ends[None]), np.zeros(len(inner), int)
    table, ends = loaded(level, of, bodies)
    half = table.shape[2] - 1
    storage = np.concatenate([table[:, layout.STORAGE, :, 0], table[:, layout.STORAGE, half - 1 :: -1, 1]], axis=1)
    storage[:, half] *= 2.0
    between = np.concatenate(
        [table[:, layout.CONDUCTANCE, :half, 0], table[:, layout.CONDUCTANCE, half - 1 :: -1, 1]], axis=1
    )
    diagonal = np.zeros_like(storage)
    diagonal[:, :-1] += between
    diagonal[:, 1:] += between
    end = 0 if bodies.side == 0 else -1
    diagonal[:, end] += bodies.drag
    keep = slice(0, -1) if bodies.side == 0 else slice(1, None)  # the other wall is held
    storage, diagonal = storage[:, keep], diagonal[:, keep]
    off = between[:, : len(between[0]) - 1] if bodies.side == 0 else between[:, 1:]
    root = np.sqrt(storage)
    n = storage.shape[1]
    matrix = np.zeros((len(inner), n, n))
    here = np.arange(n)
    matrix[:, here, here] = diagonal / storage
    matrix[:, here[1:], here[:-1]] = matrix[:, here[:-1], here[1:]] = -off / (root[:, 1:] * root[:, :-1])
    return 1.0 / np.linalg.eigvalsh(matrix)[:, 0]
