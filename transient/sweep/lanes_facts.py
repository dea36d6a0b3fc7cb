"""What rows end in, from the grids' own steady states: exact on any grid."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.march import lanes_layout as layout
from transient.sweep import lanes_headline as headline
from transient.sweep.lanes_batch import Batch, Grids


@dataclass(frozen=True, eq=False)
class Facts:
    """What rows end in, exact on any grid: ``ends`` [n, FACTS]; ``calm`` [n, 3, 3] steady stresses of both walls and
    mean per unit of wall speeds and push, ``final`` [n, 3] those in the end; ``reach`` [n, 2] of a wall's stress times
    speed in the work per volume; ``middle`` (n,) what a mean speed is divided by to compare it with wall speeds."""

    ends: np.ndarray
    calm: np.ndarray
    final: np.ndarray
    reach: np.ndarray
    middle: np.ndarray


def facts_of(batch: Batch, rows: np.ndarray, grids: Grids) -> Facts:
    """The facts of some rows."""
    table, ends = grids.held
    unit, inner = batch.units[0], batch.inner[rows]
    final = _speeds(batch, rows, grids)
    facts = np.zeros((len(rows), headline.FACTS))
    facts[:, headline.LEVEL] = batch.within[rows]
    facts[:, headline.CALM_SPEED] = _largest(final, table, grids.held_of)
    power = 2 if unit.rotating else unit.metric
    volume = inner + 0.5 if unit.metric else np.ones(len(rows))
    reach = np.stack([inner**power, (inner + 1.0) ** power], axis=1) / volume[:, None]
    middle = inner + 0.5 if unit.rotating else np.ones(len(rows))
    return Facts(facts, _calm(table, ends)[grids.held_of], final, reach, middle)


def _speeds(batch: Batch, rows: np.ndarray, grids: Grids) -> np.ndarray:
    """Wall speeds and push in the end, [n, 3]: a body's follows from its load."""
    final = batch.final[rows]
    if batch.flowing:
        calm = _calm(*grids.held)[grids.held_of][:, 2]  # mean per unit of each
        out = final.copy()
        out[:, 2] = (final[:, 2] - calm[:, 0] * final[:, 0] - calm[:, 1] * final[:, 1]) / calm[:, 2]
        return out
    if batch.bodies is None:
        return final
    side = batch.bodies.side
    per_unit = grids.levels[-1][0][:, layout.STEADY :, 0, side]
    out = final.copy()
    out[:, side] = (final * per_unit).sum(axis=1)
    return out


def _calm(table: np.ndarray, ends: np.ndarray) -> np.ndarray:
    """Steady stresses of both walls, and the mean, that one unit of each input makes, [G, 3, 3]."""
    steady = table[:, layout.STEADY :]  # [G, 3, node, side]
    out = np.zeros((len(table), 3, 3))
    for side in (0, 1):
        held, flux = ends[0, layout.HELD, side] > 0.5, ends[:, layout.FLUX, side]
        balance = flux[:, None] * (steady[:, :, 1 if held else 0, side] - (flux[:, None] != 0.0) * np.eye(3)[side])
        balance[:, 2] += ends[:, layout.CELL, side]
        out[:, side] = balance * ends[:, layout.RADIUS, side, None]
    out[:, 2] = (steady * table[:, layout.WEIGHT, None]).sum(axis=(2, 3))
    return out


def _largest(final: np.ndarray, table: np.ndarray, of: np.ndarray) -> np.ndarray:
    """Largest |w| (n,) over the gap of the steady ends, by the parabola around the largest node."""
    half = table.shape[2] - 1
    across = np.concatenate([table[..., 0], table[:, :, half - 1 :: -1, 1]], axis=2)  # [G, field, node]
    basis = across[:, layout.STEADY :] * across[:, layout.LEVER, None]
    step = np.concatenate([table[0, layout.BEFORE, 1:, 0], table[0, layout.BEFORE, :0:-1, 1]])
    if len(basis) == 1:
        basis = np.broadcast_to(basis, (len(final), *basis.shape[1:]))
    else:
        basis = basis[of]
    profile = final[:, 0, None] * basis[:, 0] + final[:, 1, None] * basis[:, 1] + final[:, 2, None] * basis[:, 2]
    profile = np.abs(profile)
    top = profile.argmax(axis=1)
    row = np.arange(len(top))
    inner = np.clip(top, 1, profile.shape[1] - 2)
    here = profile[row, inner]
    low, high = step[inner - 1], step[inner]
    rise, fall = (here - profile[row, inner - 1]) / low, (here - profile[row, inner + 1]) / high
    slope = (rise * high - fall * low) / (low + high)
    bend = rise + fall
    inside = (top == inner) & (rise >= 0.0) & (fall >= 0.0) & (bend > 0.0)
    more = np.where(inside, slope**2 * (low + high) / (4.0 * np.where(bend > 0.0, bend, 1.0)), 0.0)
    return profile[row, top] + more
