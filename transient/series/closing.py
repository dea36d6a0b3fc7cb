"""Bodies and prescribed flow in Laplace space: at every s a system of at most three equations closes the gap.

Unknown are the two walls' speeds and the pressure drop per length, in the units of ``GapShape``.  A body of mass M,
damping C and stiffness K, all over what the film resists to one unit of speed, obeys

    (M s + C + K/s) U = load + stress(U_lower, U_upper, G) + face G,

a prescribed flow ``mean(U_lower, U_upper, G) + sweep U = mean velocity``; stress and mean are the gap's own transfer
functions.  Whatever is prescribed is one trivial row.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.problem import PRESSURE, Problem
from transient.series.gapshape import GapShape, SeriesError
from transient.series.slow import wall_response
from transient.series.steady import steady_flow

_ENDS = (0, 1)
# A determinant below this share of its terms' product says that there is no equilibrium.
_SINGULAR = 1e-13


@dataclass(frozen=True, eq=False)
class Closing:
    """``body`` (2,) whether a wall carries one; ``mass``, ``damping``, ``stiffness``, ``face``, ``sweep`` (2,).

    ``flow``: whether the mean velocity is prescribed.  ``unit`` (3,): what an input is divided by where it is a load
    (and what a pressure drop per length and a mean velocity are).
    """

    shape: GapShape
    body: np.ndarray
    mass: np.ndarray
    damping: np.ndarray
    stiffness: np.ndarray
    face: np.ndarray
    sweep: np.ndarray
    flow: bool
    unit: np.ndarray

    @classmethod
    def of(cls, problem: Problem, shape: GapShape) -> Closing:
        """The closing of a problem.  Raises ``SeriesError`` where it is not linear."""
        if not problem.linear:
            raise SeriesError("a force-speed curve or dry friction has no series solution")
        mass, damping, stiffness, face, sweep = np.zeros((5, 2))
        body = np.zeros(2, bool)
        pressure = problem.viscosity / problem.gap**2
        unit = np.array([1.0, 1.0, 1.0 if problem.flow is not None else pressure])
        film = problem.viscosity / (1.0 if problem.rotating else problem.gap)
        for end, wall in enumerate(problem.walls):
            carried = wall.body
            if carried is None:
                continue
            body[end] = True
            unit[end] = resistance = carried.grip * film
            mass[end] = carried.mass / problem.diffusion_time / resistance
            damping[end] = carried.damping / resistance
            stiffness[end] = carried.stiffness * problem.diffusion_time / resistance
            if carried.displaced:
                face[end] = carried.displaced * (problem.length or 0.0) * pressure / resistance
                sweep[end] = carried.displaced / ((problem.section or 0.0) * problem.count)
        return cls(shape, body, mass, damping, stiffness, face, sweep, problem.flow is not None, unit)

    def unknowns(self, s: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """((S, 3, 3) inputs by unknowns, (S, 3, 3) causes by wall answers, (S,) how much round-off grows) at ``s``."""
        walls = wall_response(self.shape, s)
        matrix, size = self.matrix(s, walls)
        inverse = np.linalg.inv(matrix)
        grown = np.einsum("sij,sjk->sik", np.abs(inverse), size)
        weight = np.abs(inverse).max(axis=2)
        worst = (grown @ np.abs(inverse)) / np.where(weight > 0.0, weight, 1.0)[:, :, None]
        return np.moveaxis(inverse, 1, 2), walls, worst.max(axis=(1, 2))

    def matrix(self, s: np.ndarray, walls: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(S, 3, 3) rows: lower wall, upper wall, pressure; and the sums of magnitudes of each entry's terms."""
        out = np.zeros((len(s), 3, 3), complex)
        size = np.zeros((len(s), 3, 3))
        for end in _ENDS:
            if not self.body[end]:
                out[:, end, end] = size[:, end, end] = 1.0
                continue
            pulls = walls[:, :, end]
            out[:, end] -= pulls
            size[:, end] += np.abs(pulls)
            out[:, end, PRESSURE] -= self.face[end]
            size[:, end, PRESSURE] += self.face[end]
            own = self.mass[end] * s + self.damping[end] + self.stiffness[end] / s
            out[:, end, end] += own
            size[:, end, end] += np.abs(self.mass[end] * s) + self.damping[end] + np.abs(self.stiffness[end] / s)
        if not self.flow:
            out[:, PRESSURE, PRESSURE] = size[:, PRESSURE, PRESSURE] = 1.0
            return out, size
        out[:, PRESSURE] = walls[:, :, 2]
        size[:, PRESSURE] = np.abs(walls[:, :, 2])
        out[:, PRESSURE, :2] += self.sweep
        size[:, PRESSURE, :2] += self.sweep
        return out, size

    def settled(self, values: np.ndarray, held: dict[int, float]) -> np.ndarray | None:
        """Unknowns (3,) of the steady state under inputs ``values`` (3,), None where there is none.

        ``held``: bodies kept at given speeds; a sprung body stands still.
        """
        if self.shape.unrestrained:
            return None
        steady = steady_flow(self.shape)
        stress, mean = steady.stress(), steady.mean()
        matrix, right = np.eye(3), np.asarray(values, dtype=float).copy()
        for end in _ENDS:
            if not self.body[end]:
                continue
            if end in held or self.stiffness[end] > 0.0:
                right[end] = held.get(end, 0.0)
                continue
            matrix[end] = -stress[:, end]
            matrix[end, end] += self.damping[end]
            matrix[end, PRESSURE] -= self.face[end]
        if self.flow:
            matrix[PRESSURE] = mean
            matrix[PRESSURE, :2] += self.sweep
        scale = np.abs(matrix).max(axis=1)
        if not (scale > 0.0).all() or abs(np.linalg.det(matrix / scale[:, None])) < _SINGULAR:
            return None
        return np.linalg.solve(matrix / scale[:, None], right / scale)

    def load_on(self, unknown: np.ndarray, end: int) -> float:
        """Load that keeps an unsprung body in the steady state ``unknown`` (3,)."""
        steady = steady_flow(self.shape)
        film = float(unknown @ steady.stress()[:, end])
        return float(self.damping[end] * unknown[end] - film - self.face[end] * unknown[PRESSURE])
