"""The gap on a grid as the arrays that the march works on, and its steady states."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.grid import Grid, build
from transient.gap.problem import Problem, Wall


@dataclass(frozen=True, eq=False)
class System:
    """``storage_i dw_i/dt = sum of conductance x difference + volume_i G`` for the n unknown nodes.

    A no-slip wall is not an unknown: its speed enters through ``end_conductance`` and it keeps the half cell
    ``end_volume``.  A slipping wall is a conductance to an unknown fluid node with a half cell of its own; a
    shear-free wall or an axis has none.  ``first`` is the node number of the first unknown.
    """

    grid: Grid
    density: float
    first: int
    storage: np.ndarray
    conductance: np.ndarray
    volume: np.ndarray
    end_conductance: np.ndarray
    end_volume: np.ndarray

    @property
    def unknowns(self) -> int:
        """Number of unknown nodes n."""
        return len(self.storage)

    def nodes(self, unknown: np.ndarray, ends: np.ndarray) -> np.ndarray:
        """Values at all nodes (..., N+1) from the unknowns (..., n) and the walls' speeds (..., 2)."""
        parts = [unknown]
        if self.first == 1:
            parts.insert(0, ends[..., :1])
        if self.first + self.unknowns < len(self.grid.radius):
            parts.append(ends[..., 1:])
        return np.concatenate(parts, axis=-1)


def assemble(problem: Problem, cells: int, layers: tuple[float, float]) -> System:
    """The system of ``problem`` on ``cells`` intervals."""
    grid = build(problem.metric, problem.inner, problem.outer, cells, layers)
    conductance = problem.viscosity * grid.conductance
    first, below = _end(problem, problem.walls[0], conductance[0], grid.radius[0])
    last, above = _end(problem, problem.walls[1], conductance[-1], grid.radius[-1])
    stop = len(grid.radius) - last
    volume = grid.volume[first:stop]
    end_volume = np.array([grid.volume[0] if first else 0.0, grid.volume[-1] if last else 0.0])
    return System(
        grid,
        problem.density,
        first,
        problem.density * volume,
        conductance[first : stop - 1],
        volume,
        np.array([below, above]),
        end_volume,
    )


def _end(problem: Problem, wall: Wall, conductance: float, radius: float) -> tuple[int, float]:
    """(1 where the wall's node is no unknown, conductance between the wall and the first unknown)."""
    if wall.kind in ("shear_free", "axis"):
        return 0, 0.0
    if wall.slip_length > 0.0:
        return 0, problem.viscosity * radius**problem.metric / wall.slip_length
    return 1, float(conductance)


def steady(system: System, speeds: np.ndarray, gradient: float) -> np.ndarray:
    """Steady velocity at the unknowns (n,) for the walls' ``speeds`` (2,) and the pressure drop per length.

    Fluxes follow from the balance, differences from fluxes: no matrix, hence exact to round-off however thin the
    cells.  Raises ``ValueError`` where no wall holds the fluid.
    """
    below, above = system.end_conductance
    if below == 0.0 and above == 0.0:
        raise ValueError("no wall holds the fluid: there is no steady state")
    pushed = gradient * np.concatenate([[0.0], np.cumsum(system.volume)])
    with np.errstate(divide="ignore"):
        resistance = 1.0 / np.concatenate([[below], system.conductance, [above]])
    # flux_i = start - pushed_i through interval i (0: lower wall); a wall without conductance passes none
    if below == 0.0:
        start = 0.0
    elif above == 0.0:
        start = pushed[-1]
    else:
        start = (speeds[1] - speeds[0] + pushed @ resistance) / resistance.sum()
    drop = (start - pushed)[:-1] * np.where(np.isfinite(resistance[:-1]), resistance[:-1], 0.0)
    rise = (start - pushed)[1:] * np.where(np.isfinite(resistance[1:]), resistance[1:], 0.0)
    upward = speeds[0] + np.cumsum(drop)
    downward = speeds[1] - np.cumsum(rise[::-1])[::-1]
    if below == 0.0:
        return downward
    if above == 0.0:
        return upward
    # near each wall from that wall, so that small differences to its speed keep their digits
    half = system.unknowns // 2
    return np.concatenate([upward[:half], downward[half:]])
